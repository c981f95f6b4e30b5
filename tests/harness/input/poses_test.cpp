#include "tests/harness/input/fixtures.h"

#include <Eigen/Core>
#include <catch2/catch.hpp>

#include <cmath>
#include <limits>

namespace {

using Catch::Contains;
using model::PoseList;

PoseList read(const std::string& text) {
  const tests::TemporaryFolder folder;
  return input::read_poses(folder.write("p.json", text), "p.json", tests::legs());
}

std::string frames(const std::string& list) {
  return "{\"skinfold\": \"poses 1\",\n\"frames\": [" + list + "]}";
}

std::string complaint(const std::string& text) {
  return tests::complaint([&] { read(text); });
}

// 2 frames x 5 joints of 4 x 4 numbers: the identity, with the number of the matrix at (0, 3).
std::vector<double> matrices() {
  std::vector<double> numbers(160, 0);
  for (std::size_t m = 0; m < 10; ++m) {
    for (std::size_t i = 0; i < 4; ++i) numbers[m * 16 + i * 5] = 1;
    numbers[m * 16 + 3] = static_cast<double>(m);
  }
  return numbers;
}

model::MatrixList read_matrices(const std::string& bytes, const model::Rig& rig = tests::legs()) {
  const tests::TemporaryFolder folder;
  return input::read_matrices(folder.write("m.npy", bytes), "m.npy", rig);
}

std::string matrix_complaint(const std::vector<double>& numbers,
                             const std::string& shape = "(2, 5, 4, 4)") {
  return tests::complaint(
      [&] { read_matrices(tests::npy("<f8", shape, tests::bytes_of(numbers))); });
}

}  // namespace

// Catches frames or joints mixed up, parts that are lost, and parts made up where none is written.
TEST_CASE("poses hold what each frame writes") {
  const PoseList poses = read(frames(
      R"({"hip": {"move": [1, 2, 3]}, "leg.L/foot": {"scale": [2, 1, 0], "rotate": [0, 0, 3, 4]}},
         {}, {"#3": {}})"));
  REQUIRE(poses.frames.size() == 3);
  REQUIRE(poses.frames[0].size() == 2);
  const PoseList::Change& hip = poses.frames[0][0];
  REQUIRE(hip.node == 0);
  REQUIRE(*hip.move == Eigen::Vector3d(1, 2, 3));
  REQUIRE_FALSE(hip.rotate.has_value());
  REQUIRE_FALSE(hip.scale.has_value());
  const PoseList::Change& foot = poses.frames[0][1];
  REQUIRE(foot.node == 2);
  REQUIRE(*foot.scale == Eigen::Vector3d(2, 1, 0));
  // 3-4-5 triangle.
  REQUIRE((*foot.rotate - Eigen::Vector4d(0, 0, 0.6, 0.8)).norm() < 1e-15);
  REQUIRE(poses.frames[1].empty());
  REQUIRE(poses.frames[2][0].node == 3);
}

// Catches a length whose square leaves the range of double, and a unit quaternion that changes.
TEST_CASE("quaternions of any length are normalized") {
  const PoseList poses = read(frames(R"({"hip": {"rotate": [3e200, 0, 0, 4e200]}},
      {"hip": {"rotate": [3e-200, 0, 0, 4e-200]}}, {"hip": {"rotate": [0, 0, 0, -7]}})"));
  for (const std::size_t frame : {0U, 1U}) {
    const Eigen::Vector4d q = *poses.frames[frame][0].rotate;
    REQUIRE((q - Eigen::Vector4d(0.6, 0, 0, 0.8)).norm() < 1e-15);
  }
  REQUIRE(*poses.frames[2][0].rotate == Eigen::Vector4d(0, 0, 0, -1));
}

// Catches poses that are silently ignored; each message has the place and what was meant.
TEST_CASE("broken poses are refused with their place") {
  REQUIRE_THAT(complaint(frames(R"({"hipp": {}})")),
               Contains("p.json:2:21: no joint is named 'hipp' in legs.glb; did you mean 'hip'? "
                        "(/frames/0/hipp)"));
  REQUIRE_THAT(complaint(frames(R"({}, {"foot": {}})")),
               Contains("'foot' occurs 2 times in legs.glb: hip/leg.L/foot (#2), hip/leg.R/foot "
                        "(#4)") &&
                   Contains("(/frames/1/foot)"));
  REQUIRE_THAT(complaint(frames(R"({"hip": {"rotate": [0, 0, 0, 0]}})")),
               Contains("a quaternion [x, y, z, w] other than zero was expected "
                        "(/frames/0/hip/rotate)"));
  REQUIRE_THAT(complaint(frames(R"({"hip": {"rotate": [0, 0, 1]}})")),
               Contains("4 numbers were expected, not 3"));
  REQUIRE_THAT(complaint(frames(R"({"hip": {"move": [0, 0]}})")),
               Contains("3 numbers were expected, not 2"));
  REQUIRE_THAT(complaint(frames(R"({"hip": {"rotat": [0, 0, 0, 1]}})")),
               Contains("unknown key 'rotat'; did you mean 'rotate'?"));
  REQUIRE_THAT(complaint(frames(R"({"hip": {}, "#0": {}})")),
               Contains("the joint hip occurs twice in this frame (/frames/0/#0)"));
  REQUIRE_THAT(complaint(frames(R"({"hip": [0, 0, 0, 1]})")),
               Contains("an object was expected, not an array (/frames/0/hip)"));
  REQUIRE_THAT(complaint(frames("7")), Contains("an object was expected, not a number"));
  REQUIRE_THAT(complaint(frames("")), Contains("at least one frame was expected (/frames)"));
  REQUIRE_THAT(complaint(R"({"skinfold": "binding 1", "frames": [{}]})"),
               Contains("expected \"poses 1\""));
  REQUIRE_THAT(complaint(R"({"skinfold": "poses 1", "frames": [{}], "rate": 24})"),
               Contains("unknown key 'rate'"));
}

// Catches matrices read column by column, joints and frames exchanged, and a last row that is left
// as rounded: 1e-7 off counts as 0 0 0 1 and becomes exactly that.
TEST_CASE("matrices are read row by row in the order of the joints") {
  std::vector<double> numbers = matrices();
  numbers[12] = 1e-7;
  numbers[15] = 1 - 1e-7;
  numbers[1] = 0.5;
  const model::MatrixList list =
      read_matrices(tests::npy("<f8", "(2, 5, 4, 4)", tests::bytes_of(numbers)));
  REQUIRE(list.frames.size() == 2);
  REQUIRE(list.frames[0].size() == 5);
  for (std::size_t m = 0; m < 10; ++m) {
    REQUIRE(list.frames[m / 5][m % 5](0, 3) == static_cast<double>(m));
    REQUIRE(list.frames[m / 5][m % 5].row(3) == Eigen::RowVector4d(0, 0, 0, 1));
  }
  REQUIRE(list.frames[0][0](0, 1) == 0.5);
  REQUIRE(list.frames[0][0](1, 0) == 0);
}

// Catches matrices that are transposed, projective, not finite, or of another number of joints.
TEST_CASE("broken matrices are refused") {
  std::vector<double> numbers = matrices();
  numbers[6 * 16 + 12] = 2e-6;
  REQUIRE_THAT(
      matrix_complaint(numbers),
      Contains("m.npy: frame 1, joint 1 (hip/leg.L), row 3, column 0: 2e-06 where the last "
               "row of a matrix is 0 0 0 1"));
  numbers = matrices();
  numbers[15] = 0;
  REQUIRE_THAT(matrix_complaint(numbers), Contains("row 3, column 3: 0 where the last row"));
  numbers = matrices();
  numbers[16] = std::numeric_limits<double>::infinity();
  REQUIRE_THAT(matrix_complaint(numbers),
               Contains("frame 0, joint 1 (hip/leg.L), row 0, column 0: inf is no finite number"));
  REQUIRE_THAT(matrix_complaint(matrices(), "(1, 10, 4, 4)"),
               Contains("has shape (1, 10, 4, 4); expected (frames, 5, 4, 4), one matrix for each "
                        "of the 5 joints of legs.glb"));
  REQUIRE_THAT(matrix_complaint(matrices(), "(2, 5, 16)"), Contains("expected (frames, 5, 4, 4)"));
  REQUIRE_THAT(matrix_complaint({}, "(0, 5, 4, 4)"), Contains("expected (frames, 5, 4, 4)"));
  const std::vector<float> single(160, 0);
  REQUIRE_THAT(tests::complaint([&] {
                 read_matrices(tests::npy("<f4", "(2, 5, 4, 4)", tests::bytes_of(single)));
               }),
               Contains("'<f4'; expected '<f8'"));
  REQUIRE_THAT(
      tests::complaint([&] { read_matrices(tests::npy("<f8", "(2, 0, 4, 4)", ""), model::Rig{}); }),
      Contains("the rig has no joints to pose"));
}
