#include "harness/base/error.h"

#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <cstdint>
#include <iterator>

namespace base {

namespace {

// A name of any length may stand in a message; a message must stay readable.
std::string shortened(std::string text) {
  constexpr std::size_t kLongest = 600, kHead = 350, kTail = 200;
  if (text.size() <= kLongest) return text;
  const auto inside = [&](std::size_t at) {
    return (static_cast<unsigned char>(text[at]) & 0xC0) == 0x80;
  };
  std::size_t head = kHead, tail = text.size() - kTail;
  while (inside(head)) --head;
  while (tail < text.size() && inside(tail)) ++tail;
  return text.substr(0, head) + " … " + text.substr(tail);
}

std::string joined(const std::vector<Problem>& problems) {
  std::string text;
  for (const Problem& problem : problems) {
    if (!text.empty()) text += '\n';
    text += describe(problem);
  }
  return text;
}

// Length of the UTF-8 sequence at `text[at]` and its code point; 0 when it is not valid.
std::size_t decode(std::string_view text, std::size_t at, std::uint32_t& code) {
  const auto byte = [&](std::size_t i) { return static_cast<unsigned char>(text[i]); };
  const unsigned char lead = byte(at);
  const std::size_t length = lead < 0x80                   ? 1
                             : lead >= 0xC2 && lead < 0xE0 ? 2
                             : lead >= 0xE0 && lead < 0xF0 ? 3
                             : lead >= 0xF0 && lead < 0xF5 ? 4
                                                           : 0;
  if (length == 0 || at + length > text.size()) return 0;
  code = length == 1 ? lead : lead & (0x7Fu >> length);
  for (std::size_t i = 1; i < length; ++i) {
    if ((byte(at + i) & 0xC0) != 0x80) return 0;
    code = (code << 6) | (byte(at + i) & 0x3Fu);
  }
  const bool overlong = (length == 3 && code < 0x800) || (length == 4 && code < 0x10000);
  const bool surrogate = code >= 0xD800 && code < 0xE000;
  return overlong || surrogate || code > 0x10FFFF ? 0 : length;
}

// Characters that change how the text around them looks, or that cannot be seen.
bool is_treacherous(std::uint32_t code) {
  return code < 0x20 || (code >= 0x7F && code < 0xA0) || code == 0xAD || code == 0x61C ||
         (code >= 0x200B && code <= 0x200F) || (code >= 0x2028 && code <= 0x202E) ||
         (code >= 0x2060 && code <= 0x206F) || code == 0xFEFF ||
         (code >= 0xFFF9 && code <= 0xFFFB) || (code >= 0xE0000 && code <= 0xE007F);
}

// Levenshtein distance, case ignored.
std::size_t distance(std::string_view a, std::string_view b) {
  const auto lower = [](char c) { return std::tolower(static_cast<unsigned char>(c)); };
  std::vector<std::size_t> row(b.size() + 1);
  for (std::size_t j = 0; j <= b.size(); ++j) row[j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i) {
    std::size_t diagonal = row[0];
    row[0] = i;
    for (std::size_t j = 1; j <= b.size(); ++j) {
      const std::size_t change = diagonal + (lower(a[i - 1]) == lower(b[j - 1]) ? 0 : 1);
      diagonal = row[j];
      row[j] = std::min({change, row[j] + 1, row[j - 1] + 1});
    }
  }
  return row[b.size()];
}

}  // namespace

std::string describe(const Problem& problem) {
  std::string text;
  if (!problem.file.empty()) {
    text = visible(problem.file);
    if (problem.line > 0) text += fmt::format(":{}", problem.line);
    if (problem.line > 0 && problem.column > 0) text += fmt::format(":{}", problem.column);
    text += ": ";
  }
  text += shortened(visible(problem.message));
  if (!problem.pointer.empty()) text += fmt::format(" ({})", shortened(visible(problem.pointer)));
  return text;
}

InputError::InputError(std::vector<Problem> problems)
    : problems_(std::move(problems)), text_(joined(problems_)) {}

InputError::InputError(Problem problem) : InputError(std::vector<Problem>{std::move(problem)}) {}

InputError::InputError(std::string message, std::string file)
    : InputError(Problem{std::move(message), std::move(file), 0, 0, {}}) {}

std::string visible(std::string_view text) {
  std::string out;
  for (std::size_t at = 0; at < text.size();) {
    std::uint32_t code = 0;
    const std::size_t length = decode(text, at, code);
    if (length == 0) {
      out += fmt::format("\\x{{{:02X}}}", static_cast<unsigned char>(text[at++]));
    } else if (is_treacherous(code)) {
      out += fmt::format("\\u{{{:04X}}}", code);
      at += length;
    } else {
      out.append(text.substr(at, length));
      at += length;
    }
  }
  return out;
}

std::string nearest_name(std::string_view name, std::span<const std::string> known) {
  constexpr std::size_t kLongest = 128;  // a hostile name must not cost a quadratic comparison
  if (name.size() > kLongest) return {};
  std::string best;
  std::size_t least = std::max<std::size_t>(2, name.size() / 3) + 1;
  for (const std::string& candidate : known) {
    if (candidate.size() > kLongest) continue;
    const std::size_t d = distance(name, candidate);
    if (d < least && d < std::max(name.size(), candidate.size())) {
      least = d;
      best = candidate;
    }
  }
  return best;
}

std::string hint(std::string_view name, std::span<const std::string> known) {
  constexpr std::size_t kMost = 12;
  if (known.empty()) return {};
  if (const std::string near = nearest_name(name, known); !near.empty())
    return fmt::format("; did you mean '{}'?", near);
  std::string list;
  for (std::size_t i = 0; i < std::min(known.size(), kMost); ++i)
    list += (i == 0 ? "" : ", ") + known[i];
  if (known.size() > kMost) list += fmt::format(" and {} more", known.size() - kMost);
  return "; known: " + list;
}

}  // namespace base
