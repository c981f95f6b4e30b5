#include "metrics/elementary.h"
#include "tests/harness/skinning/tube_rig.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

namespace tests {
namespace {

using Eigen::Matrix3d;
using Eigen::Matrix4d;
using Eigen::Vector4d;
using metrics::kDegree;

Matrix4d matrix(const Matrix3d& linear, const Point& translation = Point::Zero()) {
  Matrix4d M = Matrix4d::Identity();
  M.topLeftCorner<3, 3>() = linear;
  M.topRightCorner<3, 1>() = translation;
  return M;
}

Matrix3d scaling(const Point& scale) {
  return scale.asDiagonal();
}

Vector4d turn(const Point& axis, double degrees) {
  Vector4d q;
  q << std::sin(degrees * kDegree / 2) * axis.normalized(), std::cos(degrees * kDegree / 2);
  return q;
}

const Point kX(1, 0, 0);
const Point kY(0, 1, 0);
const Point kZ(0, 0, 1);
const Point kTranslation(1, 2, 3);
const Point kScale(1, 2, 0.5);
const Point kAxis(1, -1, 2);

/// Node 2 is a root and no joint, node 0 its child and joint 1, node 1 the child of 0 and joint 0.
model::Rig chain() {
  model::Rig rig;
  rig.nodes.resize(3);
  rig.nodes[2].local.translation = {0, 0, 10};
  rig.nodes[0].parent = 2;
  rig.nodes[0].local = {kTranslation, 3 * turn(kAxis, 40), kScale};
  rig.nodes[1].parent = 0;
  rig.nodes[1].local.translation = {0, 5, 0};
  rig.walk = {2, 0, 1};
  rig.skins.emplace_back();
  rig.joints.resize(2);
  rig.joints[0].node = 1;
  rig.joints[1].node = 0;
  return rig;
}

model::Motion motion_of(std::vector<double> times, decltype(model::Motion::pose) pose) {
  model::Motion motion;
  motion.times = std::move(times);
  motion.pose = std::move(pose);
  return motion;
}

/// Local transform of node 0 in a frame of a motion, read from the pose of its joint.
Matrix4d local_of(const model::Rig& rig, const model::Motion& motion, std::size_t frame) {
  return matrix(Matrix3d::Identity(), {0, 0, -10}) *
         skinning::joint_to_model(rig, motion, frame)[1];
}

double apart(const Matrix4d& a, const Matrix4d& b) {
  return (a - b).norm();
}

model::Track track(model::Channel channel, std::vector<double> times, std::vector<Vector4d> values,
                   model::Interpolation interpolation = model::Interpolation::Linear) {
  return {0, channel, interpolation, std::move(times), std::move(values)};
}

model::Motion play(std::vector<double> times, const model::Track& one) {
  return motion_of(std::move(times), model::Play{{one}});
}

// Catches ancestors that are no joints left out, joints and nodes mixed up, quaternions used
// unnormalized, and a moved parent that leaves its children behind. Source: elementary.
TEST_CASE("joint_to_model: rest pose through all ancestors, children follow") {
  const model::Rig rig = chain();
  const Matrix4d local = matrix(rotation(kAxis, 40 * kDegree) * scaling(kScale), kTranslation);
  const Matrix4d root = matrix(Matrix3d::Identity(), {0, 0, 10});
  const Matrix4d leaf = matrix(Matrix3d::Identity(), {0, 5, 0});
  const std::vector<Matrix4d> rest =
      skinning::joint_to_model(rig, motion_of({0}, model::Play{}), 0);
  REQUIRE(rest.size() == 2);
  CHECK(apart(rest[0], root * local * leaf) < 1e-14);
  CHECK(apart(rest[1], root * local) < 1e-14);

  const model::Motion sweep = motion_of({0}, model::Sweep{{{2, kX, 0, 90}}});
  const Matrix4d turned = root * matrix(rotation(kX, 90 * kDegree));
  CHECK(apart(skinning::joint_to_model(rig, sweep, 0)[0], turned * local * leaf) < 1e-13);
}

// Catches a sweep on the wrong side of R or S, degrees taken for radians, a last frame that falls
// short, and one frame at the first angle. Source: the definition of a sweep; elementary.
TEST_CASE("joint_to_model: a sweep is T R R(axis, angle) S, from the first angle to the last") {
  const model::Rig rig = chain();
  const Matrix3d R = rotation(kAxis, 40 * kDegree);
  const model::Motion four = motion_of({0, 1, 2, 3}, model::Sweep{{{0, kY, -30, 60}}});
  for (std::size_t frame = 0; frame < 4; ++frame) {
    const Matrix3d turned = rotation(kY, (-30 + 30.0 * static_cast<double>(frame)) * kDegree);
    CHECK(apart(local_of(rig, four, frame), matrix(R * turned * scaling(kScale), kTranslation)) <
          1e-14);
  }
  const model::Motion one = motion_of({0}, model::Sweep{{{0, kY, -30, 60}}});
  CHECK(apart(local_of(rig, one, 0),
              matrix(R * rotation(kY, 60 * kDegree) * scaling(kScale), kTranslation)) < 1e-14);
}

// Catches entries multiplied in the reverse order or only the last one applied; a turn that is
// whole, or beyond the range of the sine, must come back. Source: elementary (90 degrees about x
// then y of the turned frame: x -> -z, y -> x, z -> -y).
TEST_CASE("joint_to_model: entries of one node multiply in the order written") {
  model::Rig rig = chain();
  rig.nodes[0].local = {};
  const model::Motion motion = motion_of({0}, model::Sweep{{{0, kX, 0, 90}, {0, kY, 0, 90}}});
  Matrix3d expected;
  expected << 0, 0, 1, 1, 0, 0, 0, 1, 0;
  CHECK(apart(local_of(rig, motion, 0), matrix(expected)) < 1e-15);

  const model::Motion many = motion_of({0}, model::Sweep{{{0, kX, 0, 360e9 + 90}}});
  CHECK(apart(local_of(rig, many, 0), matrix(rotation(kX, 90 * kDegree))) < 1e-14);
}

// Catches a matrix that jumps when it is first moved, a reflection or a shear lost on the way, and
// the turn applied in another frame than for T R S. Source: our rule; elementary.
TEST_CASE("joint_to_model: a node given as a matrix turns as its T R S would, shear kept") {
  const Matrix3d R = rotation(kAxis, 40 * kDegree);
  const Matrix3d turned = rotation(kY, 70 * kDegree);
  const model::Motion still = motion_of({0}, model::Sweep{{{0, kY, 0, 0}}});
  const model::Motion sweep = motion_of({0}, model::Sweep{{{0, kY, 0, 70}}});
  for (const Point& scale : {kScale, Point(-1, 2, 0.5)}) {
    model::Rig rig = chain();
    rig.nodes[0].matrix = matrix(R * scaling(scale), kTranslation);
    CHECK(apart(local_of(rig, still, 0), *rig.nodes[0].matrix) < 1e-14);
    CHECK(apart(local_of(rig, sweep, 0), matrix(R * turned * scaling(scale), kTranslation)) <
          1e-14);
  }

  model::Rig sheared = chain();
  Matrix3d A;
  A << 1, 0.5, 0, 0, 1, 0, 0, 0.2, 2;
  sheared.nodes[0].matrix = matrix(A, kTranslation);
  CHECK(apart(local_of(sheared, still, 0), *sheared.nodes[0].matrix) < 1e-14);
  const Matrix3d swept = local_of(sheared, sweep, 0).topLeftCorner<3, 3>();
  CHECK((swept.transpose() * swept - A.transpose() * A).norm() < 1e-13);
  // Columns at 0 and 70 degrees, whatever their lengths, stand about a frame turned by -10.
  const Matrix3d frame = rotation(kZ, -10 * kDegree);
  A.col(1) << 3 * std::cos(70 * kDegree), 3 * std::sin(70 * kDegree), 0;
  A.col(2) = kZ;
  sheared.nodes[0].matrix = matrix(A, kTranslation);
  CHECK(apart(local_of(sheared, sweep, 0),
              matrix(frame * turned * frame.transpose() * A, kTranslation)) < 1e-14);
  sheared.nodes[0].matrix = matrix(Matrix3d::Zero(), kTranslation);
  CHECK(local_of(sheared, sweep, 0).allFinite());
}

// Catches linear interpolation left unnormalized, an angle that does not grow evenly, and the long
// way round. Source: Shoemake 1985; the closed form of a turn about one axis, elementary.
TEST_CASE("joint_to_model: LINEAR rotations turn evenly the short way") {
  const model::Rig rig = chain();
  const Vector4d from = turn(kAxis, 10);
  for (const double sign : {1.0, -1.0, 5.0}) {
    const model::Motion motion = play({1, 1.25, 1.5, 2, 3}, track(model::Channel::Rotation, {1, 3},
                                                                  {from, sign * turn(kAxis, 130)}));
    for (std::size_t frame = 0; frame < motion.times.size(); ++frame) {
      const double degrees = 10 + 60 * (motion.times[frame] - 1);
      const Matrix3d R = rotation(kAxis, degrees * kDegree);
      CHECK(apart(local_of(rig, motion, frame), matrix(R * scaling(kScale), kTranslation)) < 2e-14);
    }
  }
  const model::Motion across =
      play({0.25}, track(model::Channel::Rotation, {0, 1}, {turn(kX, 0), turn(kX, 270)}));
  CHECK(apart(local_of(rig, across, 0),
              matrix(rotation(kX, -22.5 * kDegree) * scaling(kScale), kTranslation)) < 1e-14);
}

// Catches 0 / 0 between equal keys, digits lost between nearly equal ones, and a straight line
// where it shows: off the middle, over 8 degrees, it is 5e-6 away. Source: elementary.
TEST_CASE("joint_to_model: LINEAR between rotations that are nearly or fully equal") {
  model::Rig rig = chain();
  rig.nodes[0].local.scale = {1, 1, 1};
  for (const double degrees : {0.0, 1e-12, 1e-8, 1e-6, 1e-5, 1e-2, 8.0}) {
    const model::Motion motion =
        play({0.25}, track(model::Channel::Rotation, {0, 1}, {{0, 0, 0, 1}, turn(kZ, degrees)}));
    const Matrix4d M = local_of(rig, motion, 0);
    CHECK(M(1, 0) == Approx(std::sin(degrees * kDegree / 4)).epsilon(1e-12).margin(0));
    CHECK(M(0, 0) == Approx(std::cos(degrees * kDegree / 4)).epsilon(1e-15));
  }
}

// Catches extrapolation outside the keys, STEP that jumps early or late, LINEAR that is no
// straight line, and keys off by one. Source: glTF 2.0, appendix C.
TEST_CASE("joint_to_model: values at, between and outside the keys") {
  const model::Rig rig = chain();
  const std::vector<Vector4d> values = {{1, 0, 0, 0}, {3, 0, 0, 0}, {-1, 8, 0, 0}};
  const std::vector<double> keys = {1, 2, 4};
  const std::vector<double> times = {0, 1, 1.5, 2, 3, 4, 9};
  const auto translations = [&](model::Interpolation interpolation) {
    const model::Motion motion =
        play(times, track(model::Channel::Translation, keys, values, interpolation));
    Points result;
    for (std::size_t frame = 0; frame < times.size(); ++frame) {
      const Matrix4d M = skinning::joint_to_model(rig, motion, frame)[1];
      result.emplace_back(M(0, 3), M(1, 3), M(2, 3) - 10);
    }
    return result;
  };
  CHECK(translations(model::Interpolation::Linear) ==
        Points{{1, 0, 0}, {1, 0, 0}, {2, 0, 0}, {3, 0, 0}, {1, 4, 0}, {-1, 8, 0}, {-1, 8, 0}});
  CHECK(translations(model::Interpolation::Step) ==
        Points{{1, 0, 0}, {1, 0, 0}, {1, 0, 0}, {3, 0, 0}, {3, 0, 0}, {-1, 8, 0}, {-1, 8, 0}});
}

// Catches a track that resets the channels it does not drive, or a scale added to the rest scale
// instead of put in its place. Source: glTF 2.0, 3.11; elementary.
TEST_CASE("joint_to_model: a track replaces its channel and leaves the others at rest") {
  const model::Rig rig = chain();
  const Matrix3d R = rotation(kAxis, 40 * kDegree);
  CHECK(apart(local_of(rig, play({0}, track(model::Channel::Scale, {0}, {{2, 3, 4, 0}})), 0),
              matrix(R * scaling({2, 3, 4}), kTranslation)) < 1e-14);
  CHECK(apart(local_of(rig, play({0}, track(model::Channel::Translation, {0}, {{9, 8, 7, 0}})), 0),
              matrix(R * scaling(kScale), {9, 8, 7})) < 1e-14);
}

// Catches a move in the parent's frame, a rotation on the wrong side, and a scale that replaces.
// Source: the definition of a pose; elementary.
TEST_CASE("joint_to_model: poses change the rest pose: T + R move, R rotate, S scale") {
  const model::Rig rig = chain();
  const Matrix3d R = rotation(kAxis, 40 * kDegree);
  model::PoseList::Change change;
  change.rotate = 2 * turn(kY, 30);
  change.move = Point(0, 0, 4);
  change.scale = Point(2, 1, 3);
  const model::Motion motion = motion_of({0, 1}, model::PoseList{{{}, {change}}});
  CHECK(apart(local_of(rig, motion, 0), matrix(R * scaling(kScale), kTranslation)) < 1e-14);
  CHECK(
      apart(local_of(rig, motion, 1), matrix(R * rotation(kY, 30 * kDegree) * scaling({2, 2, 1.5}),
                                             kTranslation + R * Point(0, 0, 4))) < 1e-14);
}

// Catches given matrices touched, and a pose made up where there is none.
TEST_CASE("joint_to_model: matrices as given, nothing without a pose") {
  const model::Rig rig = chain();
  Random random(6);
  const std::vector<Matrix4d> given = {matrix(rotation(kAxis, 1), random.point(-1, 1)),
                                       matrix(scaling({1, 2, 3}), random.point(-1, 1))};
  const model::Motion motion = motion_of({0, 1}, model::MatrixList{{{given[1], given[0]}, given}});
  CHECK(skinning::joint_to_model(rig, motion, 1) == given);
  CHECK(skinning::joint_to_model(rig, motion_of({0}, model::NoPose{}), 0).empty());
  CHECK(skinning::skinning_matrices(rig, {}).empty());
}

// Catches the product the wrong way round, a bottom row that is trusted, and a bind scale that is
// ignored, applied to the translation or to the whole matrix. Source: elementary: a skinning matrix
// takes the scaled rest shape where the plain product takes the file's.
TEST_CASE("skinning_matrices: pose times inverse bind, for the scaled rest shape") {
  model::Rig rig = chain();
  rig.joints[0].inverse_bind = matrix(rotation(kAxis, 0.3) * 0.01, {1, 2, 3});
  rig.joints[1].inverse_bind = matrix(rotation(kX, 1), {-1, 0, 2});
  std::vector<Matrix4d> pose = {matrix(rotation(kY, 1.2), {0, 3, 1}), matrix(scaling(kScale))};
  const Matrix4d plain = pose[0] * rig.joints[0].inverse_bind;
  const Matrix4d second = pose[1] * rig.joints[1].inverse_bind;
  pose[0].row(3) << 7, 7, 7, 7;
  const std::vector<Affine> unscaled = skinning::skinning_matrices(rig, pose);
  CHECK((unscaled[0] - plain.topRows<3>()).norm() < 1e-14);
  CHECK((unscaled[1] - second.topRows<3>()).norm() < 1e-14);

  rig.skins[0].bind_scale = 0.01;
  const Affine scaled = skinning::skinning_matrices(rig, pose)[0];
  const Point p(4, 5, 6);
  CHECK((scaled * (0.01 * p).homogeneous() - plain.topRows<3>() * p.homogeneous()).norm() < 1e-14);
  CHECK(scaled.leftCols<3>().norm() == Approx(std::sqrt(3.0)).epsilon(1e-14));
}

}  // namespace
}  // namespace tests
