#pragma once

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace report {

/// Columns of a terminal that UTF-8 text takes: 2 for the wide blocks of Unicode's UAX 11, 0 for
/// combining marks. Limits: the common blocks only; no control characters (see base::visible).
std::size_t display_width(std::string_view text);

enum class Align { Left, Right };
/// `text` filled with blanks to `width` columns.
std::string padded(std::string_view text, std::size_t width, Align align = Align::Left);

/// `text` cut in the middle ("chara…arm.L") to at most `width` columns.
std::string shortened(std::string_view text, std::size_t width);

struct Column {
  std::string title;
  Align align = Align::Left;
  int spare = 0;  ///< where the table is too wide, the column with the largest goes; 0 never goes
};
using Row = std::vector<std::string>;  ///< one cell per column; empty cells are shown as "-"

/// Lines of a table at most `width` columns wide if leaving out spare columns does it. Columns
/// without any content are left out.
std::vector<std::string> table(std::vector<Column> columns, std::vector<Row> rows,
                               std::size_t width);

/// A number with `digits` significant digits, e.g. "0.031", "2e-5".
std::string number_text(double value, int digits = 4);

/// "1 frame", "14 frames".
std::string counted(std::size_t count, std::string_view noun);

}  // namespace report
