#include "harness/base/file.h"
#include "harness/input/formats.h"

#include <fmt/format.h>
#include <tiny_obj_loader.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <cstdint>
#include <limits>
#include <sstream>
#include <string_view>
#include <utility>

namespace input {

namespace {

constexpr std::string_view kSpace = " \t";
// Single precision is what engines hold; beyond it nothing can be compared with them.
constexpr double kLargest = static_cast<double>(std::numeric_limits<float>::max());

[[noreturn]] void fail(const std::string& shown, int line, std::string message) {
  throw base::InputError(base::Problem{std::move(message), shown, line, 0, {}});
}

// What the text says of each `v` and `f` line, before tinyobjloader sees it: that one reads any
// garbage as a number, rounds coordinates by up to 4 units in the last place, and gives no lines.
struct Scan {
  struct FaceLine {
    int line = 0;
    std::size_t vertices_before = 0;  // negative indices count back from here
  };
  model::Points positions;
  std::vector<FaceLine> faces;
};

class Words {
 public:
  explicit Words(std::string_view line) : rest_(line) {}

  // The next word; empty at the end of the line.
  std::string_view next() {
    const std::size_t begin = rest_.find_first_not_of(kSpace);
    if (begin == std::string_view::npos) return {};
    const std::size_t end = std::min(rest_.find_first_of(kSpace, begin), rest_.size());
    const std::string_view word = rest_.substr(begin, end - begin);
    rest_.remove_prefix(end);
    return word;
  }

 private:
  std::string_view rest_;
};

model::Point vertex(Words words, const std::string& shown, int line) {
  model::Point point = model::Point::Zero();
  double weight = 1;
  Eigen::Index count = 0;
  for (std::string_view word = words.next(); !word.empty(); word = words.next(), ++count) {
    const std::string_view digits = word.starts_with('+') ? word.substr(1) : word;
    double value = 0;
    const auto [stop, error] = std::from_chars(digits.data(), digits.data() + digits.size(), value);
    if (error != std::errc{} || stop != digits.data() + digits.size() ||
        !(std::abs(value) <= kLargest))
      fail(shown, line,
           fmt::format("'{}' is no finite number that single precision can hold", word));
    if (count < 3) point[count] = value;
    if (count == 3) weight = value;
  }
  // x y z, then a weight, a colour, or both.
  if (count != 3 && count != 4 && count != 6 && count != 7)
    fail(shown, line, fmt::format("a vertex has {} numbers; expected three: v x y z", count));
  if ((count == 4 || count == 7) && weight != 1)
    fail(shown, line, "a vertex has a weight other than 1; rational vertices are not read");
  return point;
}

bool is_integer(std::string_view text) {
  int value = 0;
  const auto [stop, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  return error == std::errc{} && stop == text.data() + text.size();
}

// A corner is v, v/vt, v//vn or v/vt/vn.
bool is_corner(std::string_view word) {
  const std::size_t first = word.find('/');
  if (!is_integer(word.substr(0, first))) return false;
  if (first == std::string_view::npos) return true;
  const std::string_view rest = word.substr(first + 1);
  const std::size_t second = rest.find('/');
  if (second == std::string_view::npos) return is_integer(rest);
  return (second == 0 || is_integer(rest.substr(0, second))) && is_integer(rest.substr(second + 1));
}

void check_face(Words words, const std::string& shown, int line) {
  std::size_t corners = 0;
  for (std::string_view word = words.next(); !word.empty(); word = words.next(), ++corners) {
    if (!is_corner(word))
      fail(shown, line,
           fmt::format("'{}' is no corner of a face; expected vertex numbers, as in f 1 2 3 or "
                       "f 1/1/1 2/2/2 3/3/3",
                       word));
  }
  if (corners < 3)
    fail(shown, line, fmt::format("a face has {} corners; at least 3 are needed", corners));
}

Scan scan(std::string_view text, const std::string& shown) {
  Scan scan;
  int number = 0;
  while (!text.empty()) {
    ++number;
    const std::size_t end = std::min(text.find_first_of("\r\n"), text.size());
    const std::string_view line = text.substr(0, end);
    text.remove_prefix(text.substr(end).starts_with("\r\n") ? end + 2
                                                            : std::min(end + 1, text.size()));
    if (line.find('\0') != std::string_view::npos)
      fail(shown, number, "a zero byte; this is no OBJ text file");
    Words words(line);
    const std::string_view keyword = words.next();
    if (keyword != "v" && keyword != "f") continue;
    if (line.ends_with('\\'))
      fail(shown, number, "a line continued by '\\' is not read; write it as one line");
    if (keyword == "v") {
      scan.positions.push_back(vertex(words, shown, number));
    } else {
      check_face(words, shown, number);
      scan.faces.push_back({number, scan.positions.size()});
    }
  }
  return scan;
}

struct Builder {
  const Scan& scan;
  const std::string& shown;
  model::Rig& rig;
  std::size_t faces_read = 0;
};

// Index of a corner from 0; OBJ counts from 1, and negative numbers back from the line.
model::Index resolved(const Builder& builder, int index, const Scan::FaceLine& face) {
  const auto count = static_cast<std::int64_t>(builder.scan.positions.size());
  const std::int64_t at =
      index > 0 ? std::int64_t{index} - 1
                : static_cast<std::int64_t>(face.vertices_before) + std::int64_t{index};
  if (index == 0 || at < 0 || at >= count)
    fail(builder.shown, face.line,
         fmt::format("a face names vertex {}; the file has {} vertices, counted from 1", index,
                     count));
  return static_cast<model::Index>(at);
}

void add_polygon(void* user, tinyobj::index_t* corners, int count) {
  Builder& builder = *static_cast<Builder*>(user);
  const Scan::FaceLine& face = builder.scan.faces.at(builder.faces_read++);
  std::vector<model::Index> polygon(static_cast<std::size_t>(count));
  for (std::size_t i = 0; i < polygon.size(); ++i) {
    polygon[i] = resolved(builder, corners[i].vertex_index, face);
  }
  for (std::size_t i = 2; i < polygon.size(); ++i) {
    builder.rig.faces.push_back({polygon[0], polygon[i - 1], polygon[i]});
    if (i + 1 < polygon.size()) builder.rig.diagonals.push_back({polygon[0], polygon[i]});
  }
}

}  // namespace

model::Rig read_obj(const std::filesystem::path& path, const std::string& shown) {
  std::string text = base::read_file(path, shown);
  Scan scanned = scan(text, shown);
  if (scanned.positions.empty()) fail(shown, 0, "holds no vertex (no line v x y z)");
  if (scanned.faces.empty()) fail(shown, 0, "holds no face (no line f 1 2 3)");

  model::Rig rig;
  rig.file = shown;
  Builder builder{scanned, shown, rig};
  tinyobj::callback_t callback;
  callback.index_cb = add_polygon;
  std::istringstream stream(std::move(text));
  std::string warnings;
  std::string errors;
  const bool good =
      tinyobj::LoadObjWithCallback(stream, callback, &builder, nullptr, &warnings, &errors);
  if (!good || builder.faces_read != scanned.faces.size())
    fail(shown, 0, "cannot be read as an OBJ file: " + (errors.empty() ? warnings : errors));
  rig.positions = std::move(scanned.positions);
  return rig;
}

Format obj_format() {
  return {.name = "obj",
          .extensions = ".obj",
          .holds = "a mesh: v and f; polygons are fanned from their first corner",
          .limits =
              "no curves and surfaces, no continued lines; normals, materials and groups are "
              "left out",
          .source = "Wavefront Advanced Visualizer, appendix B1: object files"};
}

}  // namespace input
