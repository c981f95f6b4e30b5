#include "harness/report/json_writer.h"

#include "harness/base/error.h"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <cassert>
#include <charconv>
#include <cmath>

namespace report {
namespace {

// Numbers in a row: the frames that changed can be told from the line of a diff.
constexpr std::size_t kRow = 20;

std::string number_text(double value) {
  if (!std::isfinite(value)) return "null";
  char buffer[32];
  const auto end = std::to_chars(buffer, buffer + sizeof buffer, value == 0 ? 0.0 : value).ptr;
  std::string text(buffer, end);
  if (text.find_first_of(".e") == std::string::npos)
    text += ".0";  // stays a fraction for readers that tell integers apart
  return text;
}

// A JSON string. Characters that change how the text around them looks are escaped, all others stay
// readable; what is no UTF-8 becomes U+FFFD.
std::string quoted(std::string_view text) {
  using nlohmann::json;
  const std::string plain = json(text).dump(-1, ' ', false, json::error_handler_t::replace);
  std::string out;
  for (std::size_t at = 0; at < plain.size();) {
    std::size_t end = at + 1;
    while (end < plain.size() && (static_cast<unsigned char>(plain[end]) & 0xC0) == 0x80) ++end;
    const std::string character = plain.substr(at, end - at);
    if (base::visible(character) == character) {
      out += character;
    } else {
      const std::string escaped = json(character).dump(-1, ' ', true);
      out.append(escaped, 1, escaped.size() - 2);
    }
    at = end;
  }
  return out;
}

}  // namespace

void JsonWriter::item(std::string_view key) {
  if (levels_.empty()) return;
  out_ += levels_.back().empty ? "\n" : ",\n";
  out_.append(2 * levels_.size(), ' ');
  levels_.back().empty = false;
  if (levels_.back().close == '}') out_ += quoted(key) + ": ";
}

void JsonWriter::open(std::string_view key, char close) {
  item(key);
  out_ += close == '}' ? '{' : '[';
  levels_.push_back({close});
}

void JsonWriter::close() {
  assert(!levels_.empty());
  const Level level = levels_.back();
  levels_.pop_back();
  if (!level.empty) {
    out_ += '\n';
    out_.append(2 * levels_.size(), ' ');
  }
  out_ += level.close;
}

void JsonWriter::text(std::string_view key, std::string_view value) {
  item(key);
  out_ += quoted(value);
}

void JsonWriter::number(std::string_view key, std::optional<double> value) {
  item(key);
  out_ += value ? number_text(*value) : "null";
}

void JsonWriter::count(std::string_view key, std::optional<std::size_t> value) {
  item(key);
  out_ += value ? std::to_string(*value) : "null";
}

void JsonWriter::null(std::string_view key) {
  item(key);
  out_ += "null";
}

void JsonWriter::rows(std::span<const std::string> values) {
  const bool one_row = values.size() <= kRow;
  const std::string indent(2 * levels_.size() + 2, ' ');
  out_ += '[';
  for (std::size_t i = 0; i < values.size(); ++i) {
    const bool starts_row = !one_row && i % kRow == 0;
    out_ += i == 0 ? "" : starts_row ? "," : ", ";
    out_ += starts_row ? "\n" + indent : "";
    out_ += values[i];
  }
  out_ += one_row ? "]" : "\n" + indent.substr(2) + "]";
}

void JsonWriter::numbers(std::string_view key, std::span<const double> values) {
  item(key);
  std::vector<std::string> texts;
  texts.reserve(values.size());
  for (const double value : values) texts.push_back(number_text(value));
  rows(texts);
}

void JsonWriter::indices(std::string_view key, std::span<const metrics::Index> values) {
  item(key);
  std::vector<std::string> texts;
  texts.reserve(values.size());
  for (const metrics::Index value : values) texts.push_back(std::to_string(value));
  rows(texts);
}

void JsonWriter::texts(std::string_view key, std::span<const std::string> values) {
  open_list(key);
  for (const std::string& value : values) text({}, value);
  close();
}

std::string JsonWriter::finish() && {
  assert(levels_.empty());
  out_ += '\n';
  return std::move(out_);
}

}  // namespace report
