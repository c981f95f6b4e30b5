#include "metrics/elementary.h"
#include "tests/harness/skinning/tube_rig.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

namespace tests {
namespace {

using metrics::kDegree;

model::MethodSpec with_scale(const std::string& scale) {
  model::MethodSpec method = with_defaults(skinning::find_method("dual_quaternion"));
  method.parameters["scale"] = scale;
  return method;
}

Points deformed_one(const Point& rest, const Run& run, const std::vector<Affine>& matrices) {
  return deformed("dual_quaternion", prepared_of({rest}, {run}, matrices.size()), matrices);
}

/// Rotation about z through the point (px, py, 0).
Affine turn_z(double degrees, double px = 0, double py = 0) {
  const Eigen::Matrix3d R = rotation({0, 0, 1}, degrees * kDegree);
  const Point pivot(px, py, 0);
  return affine(R, pivot - R * pivot);
}

// Catches linear blending in disguise, quaternions left unnormalized and a wrong half angle.
// Source: the angle of a normalized blend of two unit vectors, elementary; the radius kept: Kavan
// et al. 2008.
TEST_CASE("dual_quaternion: a twist keeps the radius and turns by 2 atan2(w sin, 1 - w + w cos)") {
  for (const double degrees : {10.0, 90.0, 150.0, 179.0}) {
    for (const double w : {0.1, 0.25, 0.5, 0.8}) {
      const double half = degrees * kDegree / 2;
      const double angle = 2 * std::atan2(w * std::sin(half), 1 - w + w * std::cos(half));
      const Point point =
          deformed_one({2, 0, 1}, {{0, 1 - w}, {1, w}}, {turn_z(0), turn_z(degrees)}).front();
      CHECK(point.head<2>().norm() == Approx(2).margin(1e-12));
      CHECK(std::atan2(point.y(), point.x()) == Approx(angle).margin(1e-14));
      CHECK(point.z() == Approx(1).margin(1e-14));
    }
  }
}

// Catches a pivot that drifts: a dual part with a wrong sign or factor moves points of the joint
// section off their sphere about the joint. Source: Kavan et al. 2008; elementary.
TEST_CASE("dual_quaternion: a bend about a pivot away from the origin keeps distances from it") {
  const Point pivot(5, -3, 0);
  for (const double degrees : {30.0, 90.0, 150.0}) {
    for (const double w : {0.25, 0.5}) {
      const Point rest = pivot + Point(0, 1, 0.5);
      const Point point =
          deformed_one(rest, {{0, 1 - w}, {1, w}}, {turn_z(0, 5, -3), turn_z(degrees, 5, -3)})
              .front();
      CHECK((point - pivot).norm() == Approx((rest - pivot).norm()).margin(1e-12));
      CHECK((point - rest).norm() > 0.1);
    }
  }
}

// Catches a blend the long way round, and signs taken from the first influence listed: here the
// two differ. Half angles 0, 70 and 140 degrees on one circle; the heaviest stands at 0, so 140
// counts as -40. Source: elementary.
TEST_CASE("dual_quaternion: every joint is taken on the side of the heaviest") {
  const Point short_way =
      deformed_one({1, 0, 0}, {{0, 0.5}, {1, 0.5}}, {turn_z(0), turn_z(200)}).front();
  CHECK(std::atan2(short_way.y(), short_way.x()) == Approx(-80 * kDegree).margin(1e-13));

  const std::vector<Affine> matrices = {turn_z(0), turn_z(140), turn_z(280)};
  const auto circle = [](double degrees) {
    return Eigen::Vector2d(std::cos(degrees * kDegree), std::sin(degrees * kDegree));
  };
  const Eigen::Vector2d sum = 0.4 * circle(0) + 0.35 * circle(70) + 0.25 * circle(-40);
  const double angle = 2 * std::atan2(sum.y(), sum.x());
  for (const Run& run : {Run{{0, 0.4}, {1, 0.35}, {2, 0.25}}, Run{{1, 0.35}, {2, 0.25}, {0, 0.4}},
                         Run{{2, 0.25}, {0, 0.4}, {1, 0.35}}}) {
    const Point point = deformed_one({1, 0, 0}, run, matrices).front();
    CHECK(std::atan2(point.y(), point.x()) == Approx(angle).margin(1e-13));
  }
}

// Catches a division by zero where the blend cancels. Source: elementary; the fallback is ours.
TEST_CASE("dual_quaternion: where the blend is zero the vertex follows its heaviest joint") {
  const std::vector<Affine> matrices = {affine(Eigen::Matrix3d::Identity(), {9, 9, 9}),
                                        turn_z(90, 1, 0)};
  Prepared prepared = prepared_of({{2, 0, 0}}, {{{0, -0.5}, {1, 0.5}, {2, -0.0}}}, 3);
  // Both at the rotation of joint 1, so that the real parts cancel to the last bit.
  std::vector<Affine> all = {matrices[1], matrices[1], matrices[0]};
  all[0].col(3) += Point(0, 0, 3);
  const Points points = deformed(with_scale("drop"), prepared, all);
  CHECK((points.front() - Point(1, 1, 0)).norm() < 1e-14);
}

Eigen::Matrix3d symmetric_stretch() {
  Eigen::Matrix3d S;
  S << 1.5, 0.2, -0.1, 0.2, 0.7, 0.3, -0.1, 0.3, 1.1;
  return S;
}

// Catches a stretch applied after the rotation or lost. Source: Kavan et al. 2008, section on
// scaling; elementary for a common map.
TEST_CASE("dual_quaternion: two_phase reproduces a common affine map, drop its rigid part") {
  TubeRig rig = random_tube(2);
  const Eigen::Matrix3d R = rotation({1, 2, -1}, 2.1);
  const Point t(3, -1, 2);
  rig.matrices.assign(kTubeJoints, affine(R * symmetric_stretch(), t));
  CHECK(largest_distance(deformed(with_scale("two_phase"), rig.prepared, rig.matrices),
                         moved(rig.prepared.rest, rig.matrices[0])) < 1e-12 * kTubeDiagonal);
  CHECK(largest_distance(deformed(with_scale("drop"), rig.prepared, rig.matrices),
                         moved(rig.prepared.rest, affine(R, t))) < 1e-12 * kTubeDiagonal);
}

// Catches a first phase that is no plain weighted sum of the stretches. Source: elementary.
TEST_CASE("dual_quaternion: two_phase blends stretches linearly, and is drop without any") {
  const Eigen::Matrix3d S = symmetric_stretch();
  const Point rest(1, 2, 3);
  const Point point = deformed_one(rest, {{0, 0.25}, {1, 0.75}},
                                   {affine(Eigen::Matrix3d::Identity()), affine(S, Point::Zero())})
                          .front();
  CHECK((point - (0.25 * rest + 0.75 * (S * rest))).norm() < 1e-14);

  const TubeRig rig = random_tube(3);
  CHECK(largest_distance(deformed(with_scale("two_phase"), rig.prepared, rig.matrices),
                         deformed(with_scale("drop"), rig.prepared, rig.matrices)) <
        1e-12 * kTubeDiagonal);
}

// Catches a polar split that lets a reflection into the quaternion: x -> -x then is no rotation and
// the point lands anywhere. Source: elementary.
TEST_CASE("dual_quaternion: a mirrored joint still reproduces its own map") {
  const Affine mirror = affine(rotation({1, 1, 0}, 0.7) * Point(-1.5, 1, 0.5).asDiagonal());
  const Point point = deformed_one({1, 2, 3}, {{0, 1}}, {mirror}).front();
  CHECK((point - mirror.leftCols<3>() * Point(1, 2, 3)).norm() < 1e-13);
}

// Catches infinite loops and made-up numbers: what is no number must show as none.
TEST_CASE("dual_quaternion: a matrix that is no number gives no number") {
  Affine broken = turn_z(0);
  broken(1, 1) = std::numeric_limits<double>::quiet_NaN();
  CHECK(deformed_one({1, 2, 3}, {{0, 1}}, {broken}).front().hasNaN());
}

}  // namespace
}  // namespace tests
