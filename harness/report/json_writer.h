#pragma once

#include "metrics/surface.h"

#include <cstddef>
#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

namespace report {

/// Writes JSON text made to be compared line by line: two spaces a level, keys in the order
/// written, numbers shortest round-trip with -0 as 0, arrays of numbers in rows. `key` is ignored
/// inside a list. What is no finite number, or absent, is null.
class JsonWriter {
 public:
  void open_object(std::string_view key = {}) { open(key, '}'); }
  void open_list(std::string_view key = {}) { open(key, ']'); }
  void close();

  void text(std::string_view key, std::string_view value);
  void number(std::string_view key, std::optional<double> value);
  void count(std::string_view key, std::optional<std::size_t> value);
  void null(std::string_view key);
  void numbers(std::string_view key, std::span<const double> values);
  void indices(std::string_view key, std::span<const metrics::Index> values);
  void texts(std::string_view key, std::span<const std::string> values);

  /// The text of the closed document, ending with a line feed.
  std::string finish() &&;

 private:
  struct Level {
    char close;
    bool empty = true;
  };
  void open(std::string_view key, char close);
  void item(std::string_view key);
  void rows(std::span<const std::string> values);

  std::string out_;
  std::vector<Level> levels_;
};

}  // namespace report
