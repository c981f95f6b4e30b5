#include "tests/harness/input/fixtures.h"

#include <catch2/catch.hpp>
#include <fmt/format.h>

namespace {

using Catch::Contains;
using model::Face;
using Diagonals = std::vector<std::array<model::Index, 2>>;

model::Rig read(const std::string& text) {
  const tests::TemporaryFolder folder;
  return input::read_obj(folder.write("a.obj", text), "a.obj");
}

std::string complaint(const std::string& text) {
  return tests::complaint([&] { read(text); });
}

const std::string kCorners = "v 0 0 0\nv 1 0 0\nv 1 1 0\nv 0 1 0\nv -1 0.5 0\n";

}  // namespace

// Catches vertices in another order than that of their lines, or merged because they are equal.
TEST_CASE("vertices come in the order of their lines") {
  const model::Rig rig = read("v 3 0 0\nf 1 2 3\nv 1 0 0\nv 3 0 0\n");
  REQUIRE(rig.positions == model::Points{{3, 0, 0}, {1, 0, 0}, {3, 0, 0}});
  REQUIRE(rig.faces == std::vector<Face>{{0, 1, 2}});
  REQUIRE(rig.file == "a.obj");
  REQUIRE_FALSE(rig.has_skin());
}

// Catches a polygon split from another corner, and diagonals that are lost or that include the
// polygon's own edges. A pentagon fans into 3 triangles with 2 diagonals (elementary).
TEST_CASE("polygons are fanned from their first corner") {
  const model::Rig rig = read(kCorners + "f 2 3 4 5 1\nf 1 2 3\nf 1 2 3 4\n");
  REQUIRE(rig.faces ==
          std::vector<Face>{{1, 2, 3}, {1, 3, 4}, {1, 4, 0}, {0, 1, 2}, {0, 1, 2}, {0, 2, 3}});
  REQUIRE(rig.diagonals == Diagonals{{1, 3}, {1, 4}, {0, 2}});
}

// Catches corner counts kept in 8 bits: n corners make n - 2 triangles.
TEST_CASE("a polygon of 300 corners keeps them all") {
  std::string text;
  std::string face = "f";
  for (int i = 0; i < 300; ++i) {
    text += fmt::format("v {} {} 0\n", i, i * i);
    face += fmt::format(" {}", i + 1);
  }
  const model::Rig rig = read(text + face + "\n");
  REQUIRE(rig.faces.size() == 298);
  REQUIRE(rig.faces.back() == Face{0, 298, 299});
  REQUIRE(rig.diagonals.size() == 297);
}

// Catches coordinates that are rounded on the way: the nearest double of each decimal is what the
// compiler makes of the same digits.
TEST_CASE("coordinates are the nearest doubles") {
  const model::Rig rig = read(
      "v 0.1 -1.7976931348623157e+30 2.2250738585072014e-308\n"
      "v 1.1754943508222875e-38 +9007199254740993.25 0.30000000000000004\n"
      "v 5e-324 123456.78901234567 -0.82390350794850921\nf 1 2 3\n");
  REQUIRE(rig.positions ==
          model::Points{{0.1, -1.7976931348623157e+30, 2.2250738585072014e-308},
                        {1.1754943508222875e-38, 9007199254740993.25, 0.30000000000000004},
                        {5e-324, 123456.78901234567, -0.82390350794850921}});
}

// Catches dialects: corners with texture and normal, counts back from the line, colours, blanks,
// other line ends, comments, and lines that say nothing about shape.
TEST_CASE("the usual dialects are read") {
  const model::Rig rig = read(
      "# comment\r\nmtllib none.mtl\r\no thing\r\n\tv  0 0 0  \r\nv 1 0 0 1\r\nv 0 1 0 0.5 0.5 "
      "1\r\n"
      "vt 0 0\r\nvn 0 0 1\r\ng a b\r\nusemtl none\r\ns 1\r\n f 1/1/1  2/1 3//1 \r\nf -3 -2 -1\r\n"
      "v 5 5 5\rv 6 6 6 0.1 0.2 0.3\rf -1 -2 1\rl 1 2\rp 1");
  REQUIRE(rig.positions == model::Points{{0, 0, 0}, {1, 0, 0}, {0, 1, 0}, {5, 5, 5}, {6, 6, 6}});
  REQUIRE(rig.faces == std::vector<Face>{{0, 1, 2}, {0, 1, 2}, {4, 3, 0}});
}

// Catches garbage that passes for a number, and a message without the line to mend.
TEST_CASE("malformed vertices are refused with their line") {
  const auto third = [](const std::string& line) {
    return complaint("v 0 0 0\nv 0 0 0\n" + line + "\nf 1 2 3\n");
  };
  REQUIRE_THAT(third("v 0 zero 0"), Contains("a.obj:3: 'zero' is no finite number"));
  REQUIRE_THAT(third("v 0 1,5 0"), Contains("a.obj:3: '1,5' is no"));
  REQUIRE_THAT(third("v 0 nan 0"), Contains("a.obj:3: 'nan' is no finite"));
  REQUIRE_THAT(third("v 0 -inf 0"), Contains("'-inf' is no finite"));
  REQUIRE_THAT(third("v 0 1e39 0"), Contains("'1e39' is no finite"));
  REQUIRE_THAT(third("v 0 1e999 0"), Contains("'1e999' is no finite"));
  REQUIRE_THAT(third("v 0 0x10 0"), Contains("'0x10' is no"));
  REQUIRE_THAT(third("v 0 + 0"), Contains("'+' is no"));
  REQUIRE_THAT(third("v 0 0"), Contains("a.obj:3: a vertex has 2 numbers; expected three"));
  REQUIRE_THAT(third("v"), Contains("a vertex has 0 numbers"));
  REQUIRE_THAT(third("v 0 0 0 1 1"), Contains("a vertex has 5 numbers"));
  REQUIRE_THAT(third("v 0 0 0 2"), Contains("a.obj:3: a vertex has a weight other than 1"));
  REQUIRE_THAT(third("v 0 0 \\"), Contains("a.obj:3: a line continued by '\\'"));
  REQUIRE_THAT(third(std::string("v 0 0 0\0", 8)), Contains("a.obj:3: a zero byte"));
}

// Catches faces that are dropped or bent into something else, and a message without the line.
TEST_CASE("malformed faces are refused with their line") {
  const auto sixth = [](const std::string& line) { return complaint(kCorners + line + "\n"); };
  REQUIRE_THAT(sixth("f 1 2"), Contains("a.obj:6: a face has 2 corners; at least 3"));
  REQUIRE_THAT(sixth("f"), Contains("a face has 0 corners"));
  REQUIRE_THAT(sixth("f 1 2 6"), Contains("a.obj:6: a face names vertex 6; the file has 5"));
  REQUIRE_THAT(sixth("f 1 2 0"), Contains("a.obj:6: a face names vertex 0"));
  REQUIRE_THAT(sixth("f 1 2 -6"), Contains("a.obj:6: a face names vertex -6"));
  REQUIRE_THAT(sixth("f 1 2 99999999999"), Contains("'99999999999' is no corner"));
  REQUIRE_THAT(sixth("f 1 2 three"), Contains("a.obj:6: 'three' is no corner of a face"));
  REQUIRE_THAT(sixth("f 1 2 3.5"), Contains("'3.5' is no corner"));
  REQUIRE_THAT(sixth("f 1 2 3/"), Contains("'3/' is no corner"));
  REQUIRE_THAT(sixth("f 1 2 3//"), Contains("'3//' is no corner"));
  REQUIRE_THAT(sixth("f 1 2 3/1/1/1"), Contains("'3/1/1/1' is no corner"));
  REQUIRE_THAT(sixth("f 1 2 3 # why"), Contains("'#' is no corner"));
  // Counting back goes by the vertices before the line, not by all of the file.
  REQUIRE_THAT(complaint("v 0 0 0\nf -1 -2 -3\nv 0 0 0\nv 0 0 0\n"),
               Contains("a.obj:2: a face names vertex -2"));
}

// Catches an empty mesh that goes on as a rig.
TEST_CASE("a file without vertices or faces is refused") {
  REQUIRE_THAT(complaint(""), Contains("a.obj: holds no vertex"));
  REQUIRE_THAT(complaint("hello\n"), Contains("holds no vertex"));
  REQUIRE_THAT(complaint(kCorners), Contains("a.obj: holds no face"));
}
