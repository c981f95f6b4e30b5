#include "tests/harness/input/fixtures.h"

#include <Eigen/LU>
#include <catch2/catch.hpp>
#include <fmt/format.h>

#include <cstdint>
#include <limits>
#include <utility>

namespace {

using Catch::Contains;
using Eigen::Matrix4d;
using Pairs = std::vector<std::pair<model::Index, double>>;

const std::string kIdentity = "[1,0,0,0, 0,1,0,0, 0,0,1,0, 0,0,0,1]";
const std::string kMoved = "[1,0,0,5, 0,1,0,6, 0,0,1,7, 0,0,0,1]";

std::string joint(const std::string& name, const std::string& parent,
                  const std::string& bind = kIdentity) {
  return fmt::format(R"({{"name": "{}", "parent": {}, "bind": {}}})", name,
                     parent.empty() ? "null" : "\"" + parent + "\"", bind);
}

std::string binding(const std::string& joints,
                    const std::string& influences = "[[[0, 1]], [[0, 1]], [[0, 1]]]") {
  return fmt::format("{{\"skinfold\": \"binding 1\",\n\"joints\": [{}],\n\"influences\": {}}}",
                     joints, influences);
}

// A triangle bound by the text, in a folder that holds the further files too.
model::Rig read(const std::string& text,
                const std::vector<std::pair<std::string, std::string>>& files = {}) {
  const tests::TemporaryFolder folder;
  for (const auto& [name, bytes] : files) folder.write(name, bytes);
  model::Rig rig;
  rig.file = "mesh.obj";
  rig.positions = {{0, 0, 0}, {1, 0, 0}, {0, 1, 0}};
  rig.faces = {{0, 1, 2}};
  input::read_binding(folder.write("rigs/arm.json", text), "rigs/arm.json", folder.path(), rig);
  return rig;
}

std::string complaint(const std::string& text,
                      const std::vector<std::pair<std::string, std::string>>& files = {}) {
  return tests::complaint([&] { read(text, files); });
}

Pairs influences_of(const model::Rig& rig, std::size_t vertex) {
  Pairs pairs;
  for (model::Index i = rig.influences.first[vertex]; i < rig.influences.first[vertex + 1]; ++i) {
    pairs.emplace_back(rig.influences.joint[i], rig.influences.weight[i]);
  }
  return pairs;
}

double largest(const Matrix4d& M) {
  return M.cwiseAbs().maxCoeff();
}

}  // namespace

// Catches joints in another order than the file's, parents that are lost because they come later,
// and a walk that reaches a child before its parent.
TEST_CASE("joints keep their order and find their parents by name") {
  const model::Rig rig =
      read(binding(joint("hand", "arm") + "," + joint("arm", "root") + "," + joint("root", "")));
  REQUIRE(rig.nodes.size() == 3);
  REQUIRE(rig.nodes[0].name == "hand");
  REQUIRE(rig.nodes[0].parent == 1);
  REQUIRE(rig.nodes[1].parent == 2);
  REQUIRE(rig.nodes[2].parent == -1);
  REQUIRE(rig.walk == std::vector<int>{2, 1, 0});
  REQUIRE(rig.skins.size() == 1);
  REQUIRE(rig.skins[0].name == "arm");
  REQUIRE(rig.skins[0].joint_count == 3);
  REQUIRE(rig.vertex_skin == std::vector<model::Index>{0, 0, 0});
  for (std::size_t i = 0; i < 3; ++i) REQUIRE(rig.joints[i].node == static_cast<int>(i));
}

// Catches a bind that is read column by column, an inverse of another matrix, and local transforms
// that do not lead back to the bind. The chain is turned, scaled and moved; a product with its
// inverse is the identity (elementary).
TEST_CASE("the rest pose is the bind") {
  const std::string turned = "[0,-2,0,1, 2,0,0,2, 0,0,2,3, 0,0,0,1]";
  const std::string mirrored = "[-1,0,0,4, 0,0,-3,5, 0,0.5,0,6, 0,0,0,1]";
  const model::Rig rig =
      read(binding(joint("root", "", turned) + "," + joint("tip", "root", mirrored)));
  const std::vector<Matrix4d> rest = model::rest_pose(rig);
  Matrix4d first;
  first << 0, -2, 0, 1, 2, 0, 0, 2, 0, 0, 2, 3, 0, 0, 0, 1;
  Matrix4d second;
  second << -1, 0, 0, 4, 0, 0, -3, 5, 0, 0.5, 0, 6, 0, 0, 0, 1;
  REQUIRE(largest(rest[0] - first) < 1e-14);
  REQUIRE(largest(rest[1] - second) < 1e-14);
  REQUIRE_FALSE(rig.nodes[0].matrix.has_value());
  REQUIRE_FALSE(rig.nodes[1].matrix.has_value());
  REQUIRE(largest(rig.joints[0].inverse_bind * first - Matrix4d::Identity()) < 1e-14);
  REQUIRE(largest(rig.joints[1].inverse_bind * second - Matrix4d::Identity()) < 1e-14);
  REQUIRE(rig.joints[1].inverse_bind.row(3) == Eigen::RowVector4d(0, 0, 0, 1));
}

// Catches a shear that is lost in translation, rotation and scale.
TEST_CASE("a sheared bind is kept as a matrix") {
  const model::Rig rig = read(binding(joint("root", "", "[1,0.5,0,1, 0,1,0,2, 0,0,1,3, 0,0,0,1]")));
  Matrix4d expected;
  expected << 1, 0.5, 0, 1, 0, 1, 0, 2, 0, 0, 1, 3, 0, 0, 0, 1;
  REQUIRE(rig.nodes[0].matrix.has_value());
  REQUIRE(model::rest_pose(rig)[0] == expected);
}

// Catches influences that go to another vertex or joint, that are merged, or that are lost because
// their joint is written the other way; zeros are left out.
TEST_CASE("influences name joints by index or by name") {
  const model::Rig rig =
      read(binding(joint("a", "") + "," + joint("b", "a"),
                   R"([[["b", 0.25], [0, 0.75]], [], [[1, 0], [1, -0.5], [1, 1.5]]])"));
  REQUIRE(influences_of(rig, 0) == Pairs{{1, 0.25}, {0, 0.75}});
  REQUIRE(influences_of(rig, 1).empty());
  REQUIRE(influences_of(rig, 2) == Pairs{{1, -0.5}, {1, 1.5}});
  REQUIRE(rig.influences.first == std::vector<model::Index>{0, 2, 2, 4});
}

// Catches arrays read column by column, and paths that start from somewhere else than the file.
TEST_CASE("influences may stand in two arrays") {
  using tests::bytes_of;
  const model::Rig rig = read(
      binding(joint("a", "") + "," + joint("b", "a"),
              R"({"joints": "j.npy", "weights": "../w.npy"})"),
      {{"rigs/j.npy", tests::npy("<u2", "(3, 2)", bytes_of<std::uint16_t>({0, 1, 1, 0, 0, 0}))},
       {"w.npy", tests::npy("<f4", "(3, 2)", bytes_of<float>({0.5F, 0.25F, 1, 0, 0, 0}))}});
  REQUIRE(influences_of(rig, 0) == Pairs{{0, 0.5}, {1, 0.25}});
  REQUIRE(influences_of(rig, 1) == Pairs{{1, 1}});
  REQUIRE(influences_of(rig, 2).empty());
}

// Catches arrays that do not fit the mesh, each other or the joints, and numbers that are none.
TEST_CASE("arrays that do not fit are refused") {
  using tests::bytes_of;
  const std::string text = binding(joint("a", ""), R"({"joints": "j.npy", "weights": "w.npy"})");
  const auto with = [&](const std::string& joints, const std::string& weights) {
    return complaint(text, {{"rigs/j.npy", joints}, {"rigs/w.npy", weights}});
  };
  const std::string joints = tests::npy("<i4", "(3, 1)", bytes_of<std::int32_t>({0, 0, 0}));
  const std::string weights = tests::npy("<f8", "(3, 1)", bytes_of<double>({1, 1, 1}));
  REQUIRE(with(joints, weights).empty());
  REQUIRE_THAT(with(tests::npy("<i4", "(2, 1)", bytes_of<std::int32_t>({0, 0})), weights),
               Contains("rigs/j.npy: has shape (2, 1); expected (vertices, influences per vertex), "
                        "and the mesh mesh.obj has 3 vertices"));
  REQUIRE_THAT(with(joints, tests::npy("<f8", "(3,)", bytes_of<double>({1, 1, 1}))),
               Contains("rigs/w.npy: has shape (3,); expected"));
  REQUIRE_THAT(with(joints, tests::npy("<f8", "(3, 2)", bytes_of<double>({1, 0, 1, 0, 1, 0}))),
               Contains("rigs/w.npy: has shape (3, 2), but rigs/j.npy has (3, 1)"));
  REQUIRE_THAT(
      with(tests::npy("<i4", "(3, 1)", bytes_of<std::int32_t>({0, 1, 0})), weights),
      Contains("rigs/j.npy: vertex 1, influence 0: joint 1; expected an index from 0 to 0"));
  REQUIRE_THAT(with(tests::npy("<i4", "(3, 1)", bytes_of<std::int32_t>({0, 0, -1})), weights),
               Contains("vertex 2, influence 0: joint -1"));
  const double nan = std::numeric_limits<double>::quiet_NaN();
  REQUIRE_THAT(with(joints, tests::npy("<f8", "(3, 1)", bytes_of<double>({1, nan, 1}))),
               Contains("rigs/w.npy: vertex 1, influence 0: weight nan is no finite number"));
  REQUIRE_THAT(with(weights, weights), Contains("rigs/j.npy: holds items of type '<f8'"));
  REQUIRE_THAT(complaint(text), Contains("rigs/j.npy: no such file"));
  REQUIRE_THAT(complaint(binding(joint("a", ""), R"({"joints": "../../j.npy", "weights": "w"})")),
               Contains("rigs/arm.json:3:26") && Contains("leaves the root") &&
                   Contains("(/influences/joints)"));
  REQUIRE_THAT(complaint(binding(joint("a", ""), R"({"joints": "j.npy"})")),
               Contains("the key 'weights' is missing"));
}

// Catches skeletons that cannot be: each is named with its place, and all wrong parents at once.
TEST_CASE("broken skeletons are refused with their place") {
  REQUIRE_THAT(complaint(binding(joint("arm", "rot") + "," + joint("root", ""))),
               Contains("rigs/arm.json:2:") && Contains("no joint is named 'rot'; did you mean "
                                                        "'root'? (/joints/0/parent)"));
  const std::string both = complaint(binding(joint("a", "x") + "," + joint("b", "y")));
  REQUIRE_THAT(both, Contains("/joints/0/parent") && Contains("/joints/1/parent"));
  REQUIRE_THAT(complaint(binding(joint("a", "b") + "," + joint("b", "a"))),
               Contains("is its own ancestor"));
  REQUIRE_THAT(complaint(binding(joint("a", "a"))), Contains("'a' is its own ancestor"));
  // The message names one on the circle, not one that hangs from it.
  REQUIRE_THAT(complaint(binding(joint("tail", "ring") + "," + joint("ring", "ring"))),
               Contains("'ring' is its own ancestor"));
  REQUIRE_THAT(complaint(binding(joint("a", "") + "," + joint("a", ""))),
               Contains("the joints 0 and 1 are both named 'a'") && Contains("(/joints)"));
  REQUIRE_THAT(complaint(binding(joint("", ""))), Contains("(/joints/0/name)"));
  REQUIRE_THAT(complaint(binding("")), Contains("at least one joint was expected"));
  REQUIRE_THAT(complaint(binding(R"({"name": "a", "bind": )" + kIdentity + "}")),
               Contains("the key 'parent' is missing"));
  REQUIRE_THAT(complaint(binding(R"({"name": "a", "parent": 3, "bind": )" + kIdentity + "}")),
               Contains("the name of a joint, or null, was expected (/joints/0/parent)"));
  REQUIRE_THAT(
      complaint(binding(R"({"name": "a", "parent": null, "bnd": 1, "bind": )" + kIdentity + "}")),
      Contains("unknown key 'bnd'; did you mean 'bind'?"));
}

// Catches matrices that cannot be inverted, are written column by column, or lack numbers.
TEST_CASE("broken bind matrices are refused with their place") {
  const auto bind = [](const std::string& numbers) {
    return complaint(binding(joint("root", "") + "," + joint("a", "root", numbers)));
  };
  REQUIRE(bind(kMoved).empty());
  REQUIRE_THAT(bind("[1,0,0,0, 0,1,0,0, 0,0,1,0, 5,6,7,1]"),
               Contains("the last row is not 0 0 0 1") && Contains("(/joints/1/bind)"));
  REQUIRE_THAT(bind("[1,0,0,0, 0,0,0,0, 0,0,1,0, 0,0,0,1]"), Contains("has no inverse"));
  REQUIRE_THAT(bind("[1,2,0,0, 1,2,0,0, 0,0,1,0, 0,0,0,1]"), Contains("has no inverse"));
  REQUIRE_THAT(bind("[1,0,0,0]"), Contains("16 numbers were expected, not 4"));
  REQUIRE_THAT(bind("3"), Contains("an array was expected, not a number"));
  REQUIRE_THAT(complaint(binding(R"({"name": "a", "parent": null})")),
               Contains("the key 'bind' is missing"));
  // A small joint is not a flat one.
  REQUIRE(bind("[1e-5,0,0,0, 0,1e-5,0,0, 0,0,1e-5,0, 0,0,0,1]").empty());
}

// Catches influences that are dropped or shifted where the list is wrong.
TEST_CASE("broken influences are refused with their place") {
  const auto influences = [](const std::string& list) {
    return complaint(binding(joint("root", "") + "," + joint("arm", "root"), list));
  };
  REQUIRE_THAT(influences("[[], []]"),
               Contains("rigs/arm.json:3:15: 2 entries, but the mesh mesh.obj has 3 vertices"));
  REQUIRE_THAT(influences("[[[2, 1]], [], []]"),
               Contains("an index from 0 to 1 (/influences/0/0)"));
  REQUIRE_THAT(influences("[[], [[-1, 1]], []]"), Contains("(/influences/1/0)"));
  REQUIRE_THAT(influences("[[], [[0.5, 1]], []]"), Contains("(/influences/1/0)"));
  REQUIRE_THAT(influences("[[], [], [[0, 1], [\"arn\", 1]]]"),
               Contains("no joint is named 'arn'; did you mean 'arm'? (/influences/2/1)"));
  REQUIRE_THAT(influences("[[], [], [[0]]]"), Contains("a pair [joint, weight] was expected"));
  REQUIRE_THAT(influences("[[], [], [0, 1]]"), Contains("a pair [joint, weight] was expected"));
  REQUIRE_THAT(influences("[[], [], 7]"),
               Contains("a list of [joint, weight] pairs was expected (/influences/2)"));
  REQUIRE_THAT(influences("7"), Contains("an object was expected, not a number"));
}

// Catches files of another kind or version, and keys that nobody reads.
TEST_CASE("other files are no bindings") {
  REQUIRE_THAT(complaint(R"({"skinfold": "binding 2", "joints": [], "influences": []})"),
               Contains("'binding 2' is not read here; expected \"binding 1\""));
  REQUIRE_THAT(complaint(R"({"joints": [], "influences": []})"),
               Contains("the key 'skinfold' is missing"));
  REQUIRE_THAT(complaint(R"({"skinfold": "binding 1", "joints": []})"),
               Contains("the key 'influences' is missing"));
  REQUIRE_THAT(
      complaint(R"({"skinfold": "binding 1", "joints": [], "influences": [], "wieghts": 1})"),
      Contains("unknown key 'wieghts'"));
  REQUIRE_THAT(complaint("[]"), Contains("an object was expected, not an array"));
  REQUIRE_THAT(complaint("{"), Contains("rigs/arm.json:1:"));
}

// Catches a small file that would fill the memory: each value takes two bytes in the file and some
// hundred once read.
TEST_CASE("a file of too many values is refused before it is parsed") {
  std::string text = "[";
  for (int i = 0; i < 23; ++i) text += text;
  REQUIRE_THAT(complaint(text + ","), Contains("more than the 8388608 that are read as JSON"));
}
