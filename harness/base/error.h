#pragma once

#include <exception>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace base {

/// One thing wrong with an input, written for the person who must mend it.
struct Problem {
  std::string message;  ///< what is wrong, what was expected, what to do
  std::string file;     ///< as the user would name it; empty when no file is to blame
  int line = 0;         ///< from 1; 0 unknown
  int column = 0;       ///< from 1, in bytes; 0 unknown
  std::string pointer;  ///< JSON pointer (RFC 6901) into `file`; empty: none, or the root
};

/// "file:12:20: message (/pointer)", parts that are unknown left out, names made visible.
std::string describe(const Problem& problem);

/// The one exception for input that is wrong; holds at least one problem.
class InputError : public std::exception {
 public:
  explicit InputError(std::vector<Problem> problems);
  explicit InputError(Problem problem);
  InputError(std::string message, std::string file);

  const std::vector<Problem>& problems() const { return problems_; }
  const char* what() const noexcept override { return text_.c_str(); }

 private:
  std::vector<Problem> problems_;
  std::string text_;
};

/// Results that could not be written: exit code 4.
class OutputError : public std::exception {
 public:
  explicit OutputError(std::string message) : text_(std::move(message)) {}
  const char* what() const noexcept override { return text_.c_str(); }

 private:
  std::string text_;
};

/// `text` with control and bidirectional characters and invalid UTF-8 written as \u{XXXX} or
/// \x{XX}.
std::string visible(std::string_view text);

/// The known name nearest to `name` by edit distance, or empty when none is near.
std::string nearest_name(std::string_view name, std::span<const std::string> known);

/// "; did you mean 'x'?" for the nearest known name, else "; known: a, b, c", else empty.
std::string hint(std::string_view name, std::span<const std::string> known);

}  // namespace base
