#include "harness/report/text.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cstdint>

namespace report {
namespace {

constexpr std::size_t kGap = 2;  // blanks between columns

struct Block {
  std::uint32_t first, last;
};
// Source: Unicode Standard Annex 11 (wide) and the General Category Mn (combining), common blocks.
constexpr std::array<Block, 14> kWide{{{0x1100, 0x115F},
                                       {0x2E80, 0x303E},
                                       {0x3041, 0x33FF},
                                       {0x3400, 0x4DBF},
                                       {0x4E00, 0x9FFF},
                                       {0xA000, 0xA4CF},
                                       {0xAC00, 0xD7A3},
                                       {0xF900, 0xFAFF},
                                       {0xFE30, 0xFE6F},
                                       {0xFF00, 0xFF60},
                                       {0xFFE0, 0xFFE6},
                                       {0x1F300, 0x1F64F},
                                       {0x1F900, 0x1F9FF},
                                       {0x20000, 0x3FFFD}}};
constexpr std::array<Block, 8> kCombining{{{0x0300, 0x036F},
                                           {0x0483, 0x0489},
                                           {0x0591, 0x05BD},
                                           {0x064B, 0x065F},
                                           {0x1AB0, 0x1AFF},
                                           {0x1DC0, 0x1DFF},
                                           {0x20D0, 0x20FF},
                                           {0xFE00, 0xFE0F}}};

template <std::size_t N>
bool is_in(const std::array<Block, N>& blocks, std::uint32_t code) {
  return std::any_of(blocks.begin(), blocks.end(),
                     [&](const Block& block) { return code >= block.first && code <= block.last; });
}

struct Character {
  std::string_view bytes;
  std::size_t width = 1;
};

// Characters of valid UTF-8; in anything else every stray byte counts as one.
std::vector<Character> characters(std::string_view text) {
  std::vector<Character> out;
  for (std::size_t at = 0; at < text.size();) {
    const auto lead = static_cast<unsigned char>(text[at]);
    std::uint32_t code = lead < 0xE0 ? lead & 0x1F : lead < 0xF0 ? lead & 0x0F : lead & 0x07;
    std::size_t end = at + 1;
    for (; end < text.size() && (static_cast<unsigned char>(text[end]) & 0xC0) == 0x80; ++end)
      code = code << 6 | (static_cast<unsigned char>(text[end]) & 0x3Fu);
    if (lead < 0x80) code = lead;
    const std::size_t width = is_in(kCombining, code) ? 0 : is_in(kWide, code) ? 2 : 1;
    out.push_back({text.substr(at, end - at), width});
    at = end;
  }
  return out;
}

void remove_column(std::vector<Column>& columns, std::vector<Row>& rows, std::size_t i) {
  const auto at = static_cast<std::ptrdiff_t>(i);
  columns.erase(columns.begin() + at);
  for (Row& row : rows) row.erase(row.begin() + at);
}

std::vector<std::size_t> widths_of(const std::vector<Column>& columns,
                                   const std::vector<Row>& rows) {
  std::vector<std::size_t> widths;
  widths.reserve(columns.size());
  for (std::size_t i = 0; i < columns.size(); ++i) {
    std::size_t width = display_width(columns[i].title);
    for (const Row& row : rows) width = std::max(width, display_width(row[i]));
    widths.push_back(width);
  }
  return widths;
}

std::size_t total(const std::vector<std::size_t>& widths) {
  std::size_t sum = 0;
  for (const std::size_t width : widths) sum += width + kGap;
  return sum - kGap;
}

std::string line_of(const Row& row, const std::vector<Column>& columns,
                    const std::vector<std::size_t>& widths) {
  std::string line;
  for (std::size_t i = 0; i < columns.size(); ++i) {
    if (i > 0) line.append(kGap, ' ');
    line += padded(row[i].empty() ? "-" : row[i], widths[i], columns[i].align);
  }
  line.erase(line.find_last_not_of(' ') + 1);
  return line;
}

}  // namespace

std::size_t display_width(std::string_view text) {
  std::size_t width = 0;
  for (const Character& character : characters(text)) width += character.width;
  return width;
}

std::string padded(std::string_view text, std::size_t width, Align align) {
  const std::size_t taken = display_width(text);
  const std::string blanks(width > taken ? width - taken : 0, ' ');
  return align == Align::Left ? std::string(text) + blanks : blanks + std::string(text);
}

std::string shortened(std::string_view text, std::size_t width) {
  if (width == 0) return "";
  if (display_width(text) <= width) return std::string(text);
  const std::vector<Character> all = characters(text);
  const std::size_t tail_width = (width - 1) / 2;
  std::string head, tail;
  std::size_t used = 0;
  for (std::size_t i = all.size(); i-- > 0 && used + all[i].width <= tail_width;) {
    tail.insert(0, all[i].bytes);
    used += all[i].width;
  }
  for (std::size_t i = 0; used + all[i].width <= width - 1; ++i) {
    head += all[i].bytes;
    used += all[i].width;
  }
  return head + "…" + tail;
}

std::vector<std::string> table(std::vector<Column> columns, std::vector<Row> rows,
                               std::size_t width) {
  for (std::size_t i = columns.size(); i-- > 0;)
    if (std::all_of(rows.begin(), rows.end(), [&](const Row& row) { return row[i].empty(); }))
      remove_column(columns, rows, i);
  std::vector<std::size_t> widths = widths_of(columns, rows);
  while (!columns.empty() && total(widths) > width) {
    const auto sparest =
        std::max_element(columns.begin(), columns.end(),
                         [](const Column& a, const Column& b) { return a.spare < b.spare; });
    if (sparest->spare == 0) break;
    remove_column(columns, rows, static_cast<std::size_t>(sparest - columns.begin()));
    widths = widths_of(columns, rows);
  }

  Row titles;
  titles.reserve(columns.size());
  for (const Column& column : columns) titles.push_back(column.title);
  std::vector<std::string> lines = {line_of(titles, columns, widths)};
  lines.reserve(rows.size() + 1);
  for (const Row& row : rows) lines.push_back(line_of(row, columns, widths));
  return lines;
}

std::string number_text(double value, int digits) {
  std::string text = fmt::format("{:.{}g}", value == 0 ? 0.0 : value, digits);
  const std::size_t exponent = text.find('e');
  if (exponent == std::string::npos) return text;
  // e-05 and e+05 as e-5 and e5
  std::size_t digit = exponent + 2;
  while (digit + 1 < text.size() && text[digit] == '0') ++digit;
  return text.substr(0, exponent + 1) + (text[exponent + 1] == '-' ? "-" : "") + text.substr(digit);
}

std::string counted(std::size_t count, std::string_view noun) {
  return fmt::format("{} {}{}", count, noun, count == 1 ? "" : "s");
}

}  // namespace report
