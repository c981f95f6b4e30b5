#include "harness/model/rig.h"

#include "harness/model/result.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

namespace {

using Eigen::Matrix3d;
using Eigen::Matrix4d;
using Eigen::Vector3d;
using Eigen::Vector4d;

model::Node node(const std::string& name, int parent, const Vector3d& translation) {
  model::Node made;
  made.name = name;
  made.parent = parent;
  made.local.translation = translation;
  return made;
}

// hip with the two legs of a body, both feet of one name; the parents come after their children.
model::Rig body() {
  model::Rig rig;
  rig.nodes = {node("foot", 1, {0, -1, 0}), node("leg.L", 4, {1, 0, 0}),
               node("foot", 3, {0, -1, 0}), node("leg.R", 4, {-1, 0, 0}),
               node("hip", -1, {0, 2, 0})};
  rig.walk = {4, 1, 3, 0, 2};
  return rig;
}

}  // namespace

// Catches factors of the local transform in another order, or a transposed rotation. A quarter
// turn about z takes x to y: elementary.
TEST_CASE("a local matrix scales, then turns, then moves") {
  model::Transform transform;
  transform.translation = {10, 20, 30};
  transform.rotation = {0, 0, std::sqrt(0.5), std::sqrt(0.5)};
  transform.scale = {2, 3, 4};
  const Matrix4d M = model::local_matrix(transform);
  Matrix4d expected;
  expected << 0, -3, 0, 10,  //
      2, 0, 0, 20,           //
      0, 0, 4, 30,           //
      0, 0, 0, 1;
  REQUIRE((M - expected).cwiseAbs().maxCoeff() < 1e-14);
}

// Catches a wrong sign or index in one of the nine entries: a rotation keeps lengths and
// handedness, and turns by the angle of its quaternion about its axis (elementary).
TEST_CASE("a quaternion gives the rotation about its axis") {
  const Vector3d axis = Vector3d(1, -2, 3).normalized();
  for (const double degrees : {0.0, 10.0, 90.0, 179.0, -120.0}) {
    const double half = degrees * std::acos(-1.0) / 360;
    model::Transform transform;
    transform.rotation << std::sin(half) * axis, std::cos(half);
    const Matrix3d R = model::local_matrix(transform).block<3, 3>(0, 0);
    REQUIRE((R * R.transpose() - Matrix3d::Identity()).cwiseAbs().maxCoeff() < 1e-14);
    REQUIRE((R * axis - axis).norm() < 1e-14);
    // Rodrigues' formula on a vector across the axis.
    const Vector3d across = axis.cross(Vector3d::UnitX()).normalized();
    const Vector3d turned = std::cos(2 * half) * across + std::sin(2 * half) * axis.cross(across);
    REQUIRE((R * across - turned).norm() < 1e-14);
  }
}

// Catches a shear or a change of size from quaternions that a file rounded: only the direction of
// a quaternion is a rotation.
TEST_CASE("a quaternion of another length turns the same") {
  model::Transform unit;
  unit.rotation = Vector4d(0.1, -0.2, 0.3, 0.9).normalized();
  model::Transform longer = unit;
  longer.rotation *= 3;
  REQUIRE((model::local_matrix(unit) - model::local_matrix(longer)).cwiseAbs().maxCoeff() < 1e-15);
}

// Catches noise where there must be none: the identity has to be exact for rest to return rest.
TEST_CASE("the default transform is exactly the identity") {
  REQUIRE(model::local_matrix({}) == Matrix4d::Identity());
}

// Catches parents that are applied on the wrong side or in the order of the array.
TEST_CASE("rest poses chain from the root") {
  model::Rig rig = body();
  rig.nodes[4].local.rotation = {0, 0, std::sqrt(0.5), std::sqrt(0.5)};  // a quarter turn about z
  const std::vector<Matrix4d> pose = model::rest_pose(rig);
  // hip (0, 2, 0); leg.L's (1, 0, 0) turned to (0, 1, 0); foot's (0, -1, 0) turned to (1, 0, 0).
  REQUIRE((pose[1].block<3, 1>(0, 3) - Vector3d(0, 3, 0)).norm() < 1e-14);
  REQUIRE((pose[0].block<3, 1>(0, 3) - Vector3d(1, 3, 0)).norm() < 1e-14);
  REQUIRE((pose[2].block<3, 1>(0, 3) - Vector3d(1, 1, 0)).norm() < 1e-14);
}

// Catches a matrix of the file that is passed over for the unused parts beside it.
TEST_CASE("a matrix of the file stands for the local transform") {
  model::Rig rig = body();
  Matrix4d shear = Matrix4d::Identity();
  shear(0, 1) = 0.5;
  rig.nodes[4].matrix = shear;
  const std::vector<Matrix4d> pose = model::rest_pose(rig);
  REQUIRE(pose[4] == shear);
  REQUIRE(pose[0].block<3, 1>(0, 3) == Vector3d(0.5, -1, 0));  // (1, -1, 0) sheared
}

// Catches paths written from the leaf up, and nodes without a name that vanish from them.
TEST_CASE("a path names every node from the root") {
  model::Rig rig = body();
  REQUIRE(model::node_path(rig, 0) == "hip/leg.L/foot");
  REQUIRE(model::node_path(rig, 4) == "hip");
  rig.nodes[1].name.clear();
  REQUIRE(model::node_path(rig, 0) == "hip/#1/foot");
}

// Catches ranks by index, and a walk that is not depth-first: leg.R stands at x = -1, so it and
// its foot come before leg.L.
TEST_CASE("ranks follow rest positions depth-first") {
  REQUIRE(model::node_ranks(body()) == std::vector<int>{4, 3, 2, 1, 0});
}

// Catches ranks that depend on how the file numbers its nodes.
TEST_CASE("ranks do not change with the numbering") {
  const model::Rig rig = body();
  const std::vector<int> ranks = model::node_ranks(rig);
  const std::vector<int> to = {3, 0, 4, 2, 1};  // new index of each node
  model::Rig renumbered;
  renumbered.nodes.resize(rig.nodes.size());
  for (std::size_t i = 0; i < to.size(); ++i) {
    model::Node moved = rig.nodes[i];
    if (moved.parent >= 0) moved.parent = to[static_cast<std::size_t>(moved.parent)];
    renumbered.nodes[static_cast<std::size_t>(to[i])] = moved;
  }
  for (const int old : rig.walk) {
    renumbered.walk.push_back(to[static_cast<std::size_t>(old)]);
  }
  const std::vector<int> after = model::node_ranks(renumbered);
  for (std::size_t i = 0; i < to.size(); ++i) {
    REQUIRE(after[static_cast<std::size_t>(to[i])] == ranks[i]);
  }
}

// Catches a comparison that stops at x, or that puts the name before the place, or that looks at
// local instead of model space.
TEST_CASE("ranks compare x, then y, then z, then the name") {
  model::Rig rig;
  rig.nodes = {node("b", -1, {0, 0, 1}), node("a", -1, {0, 0, 1}), node("c", -1, {0, 0, 0}),
               node("d", -1, {0, -1, 5}), node("e", -1, {-1, 9, 9})};
  rig.walk = {0, 1, 2, 3, 4};
  REQUIRE(model::node_ranks(rig) == std::vector<int>{4, 3, 2, 1, 0});

  model::Rig half_turned;  // the parent's half turn about z swaps its children in model space
  half_turned.nodes = {node("root", -1, {0, 0, 0}), node("a", 0, {-1, 0, 0}),
                       node("b", 0, {1, 0, 0})};
  half_turned.nodes[0].local.rotation = {0, 0, 1, 0};
  half_turned.walk = {0, 1, 2};
  REQUIRE(model::node_ranks(half_turned) == std::vector<int>{0, 2, 1});
}

// Catches morphs added after the scale, at the wrong vertices, or without their weight.
TEST_CASE("the rest shape is morphed, then scaled by its skin") {
  model::Rig rig;
  rig.positions = {{1, 0, 0}, {2, 0, 0}, {3, 0, 0}};
  rig.skins.resize(2);
  rig.skins[1].bind_scale = 100;
  rig.vertex_skin = {0, 1, 1};
  rig.morphs = {{1, {{0, 4, 0}, {0, 0, 8}}, 0.25}, {0, {{7, 7, 7}}, 0}};
  const model::Points rest = model::rest_shape(rig);
  REQUIRE(rest == model::Points{{1, 0, 0}, {200, 100, 0}, {300, 0, 200}});
}

// Catches a mesh without a skin that is read past the end of its empty list of skins.
TEST_CASE("the rest shape of a mesh alone is its positions") {
  model::Rig rig;
  rig.positions = {{1, 2, 3}, {-0.0, 5, 6}};
  REQUIRE(model::rest_shape(rig) == rig.positions);
}

// Catches a verdict that is reported under the name of another.
TEST_CASE("verdicts have the names of the documentation") {
  using model::Verdict;
  REQUIRE(model::verdict_name(Verdict::Within) == "within");
  REQUIRE(model::verdict_name(Verdict::Waived) == "waived");
  REQUIRE(model::verdict_name(Verdict::Unsigned) == "unsigned");
  REQUIRE(model::verdict_name(Verdict::Beyond) == "beyond");
  REQUIRE(model::verdict_name(Verdict::Broken) == "broken");
}
