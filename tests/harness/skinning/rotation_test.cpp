#include "metrics/elementary.h"
#include "tests/harness/skinning/tube_rig.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

namespace tests {
namespace {

using Eigen::Matrix3d;
using Eigen::Vector4d;
using skinning::Polar;
using skinning::polar;
using skinning::quaternion;

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

Matrix3d random_rotation(Random& random) {
  return rotation(random.point(-1, 1), random.uniform(-3.1, 3.1));
}

Matrix3d random_matrix(Random& random) {
  Matrix3d A;
  A << random.point(-1, 1), random.point(-1, 1), random.point(-1, 1);
  return A;
}

void check_proper(const Matrix3d& R) {
  CHECK((R.transpose() * R - Matrix3d::Identity()).norm() < 1e-14);
  CHECK(R.col(0).dot(R.col(1).cross(R.col(2))) == Approx(1).epsilon(1e-14));
}

/// The same rotation up to the sign of the quaternion.
double apart(const Vector4d& a, const Vector4d& b) {
  return std::min((a - b).norm(), (a + b).norm());
}

// Catches the factors swapped (A = S R) or a rotation that is only near. Source: uniqueness of the
// polar decomposition, elementary.
TEST_CASE("polar: a rotation times a positive stretch is taken apart into just these") {
  Random random(1);
  for (int i = 0; i < 200; ++i) {
    const Matrix3d R = random_rotation(random);
    const Matrix3d Q = random_rotation(random);
    const Point stretch(random.uniform(0.5, 2), random.uniform(0.5, 2), random.uniform(0.5, 2));
    const Matrix3d S = Q * stretch.asDiagonal() * Q.transpose();
    const double size = std::pow(10.0, random.uniform(-150, 150));
    const Polar found = polar(size * (R * S));
    check_proper(found.R);
    CHECK((found.R - R).norm() < 1e-14);
    CHECK((found.S / size - S).norm() < 1e-14);
  }
}

// Catches a bias in the simplest cases that rest poses are full of. Source: elementary.
TEST_CASE("polar: identity and positive diagonals come out exactly") {
  CHECK(polar(Matrix3d::Identity()).R == Matrix3d::Identity());
  CHECK(polar(Matrix3d::Identity()).S == Matrix3d::Identity());
  const Matrix3d D = Point(0.1, 3, 0.7).asDiagonal();
  CHECK(polar(D).R == Matrix3d::Identity());
  CHECK(polar(D).S == D);
}

// Catches a reflection taken for a rotation or undone along a direction that is not the shortest,
// and a rotation that is not the nearest one. Source: orthogonal Procrustes problem (Schoenemann
// 1966; det fix Kabsch 1976): trace(R^T A) is largest.
TEST_CASE("polar: no proper rotation is nearer, for any determinant and rank") {
  Random random(2);
  for (int i = 0; i < 60; ++i) {
    Matrix3d A = random_matrix(random);
    if (i % 4 == 1) A.col(2) = A.col(0) - 2 * A.col(1);
    if (i % 4 == 2) A = A.col(0) * A.row(1);
    if (i % 4 == 3) A = -A;
    const Polar found = polar(A);
    check_proper(found.R);
    CHECK((found.R * found.S - A).norm() < 1e-14);
    CHECK(found.S == found.S.transpose());
    const double trace = found.S.trace();
    for (int k = 0; k < 50; ++k) {
      const Matrix3d near = found.R * rotation(random.point(-1, 1), random.uniform(-0.5, 0.5));
      const Matrix3d far = random_rotation(random);
      CHECK((near.transpose() * A).trace() <= trace + 1e-14);
      CHECK((far.transpose() * A).trace() <= trace + 1e-14);
    }
  }
}

// Catches a rule for lost directions that turns a flattened joint for no reason. Source: our rule.
TEST_CASE("polar: a flattened matrix does not turn what it flattens") {
  CHECK(polar(Matrix3d::Zero()).R == Matrix3d::Identity());
  for (const Point& scale : {Point(2, 3, 0), Point(2, 0, 0), Point(0, 2, 0), Point(0, 0, 1)}) {
    const Matrix3d D = scale.asDiagonal();
    CHECK((polar(D).R - Matrix3d::Identity()).norm() < 1e-15);
  }
  CHECK(polar(Matrix3d(Point(3, 2, -1).asDiagonal())).R == Matrix3d::Identity());
  Random random(8);
  for (int i = 0; i < 20; ++i) {
    const Point axis = random.point(-1, 1);
    CHECK((polar(axis * axis.transpose()).R - Matrix3d::Identity()).norm() < 1e-14);
  }
  Matrix3d x_to_y = Matrix3d::Zero();
  x_to_y(1, 0) = 2;
  CHECK((polar(x_to_y).R - rotation({0, 0, 1}, metrics::kPi / 2)).norm() < 1e-15);
}

// Catches endless iteration and rotations made up from garbage.
TEST_CASE("polar: what is no number stays none; the smallest and largest numbers do not break it") {
  for (const double bad : {kNaN, std::numeric_limits<double>::infinity()}) {
    Matrix3d A = Matrix3d::Identity();
    A(2, 1) = bad;
    CHECK(polar(A).R.array().isNaN().all());
    CHECK(polar(A).S.array().isNaN().all());
  }
  check_proper(polar(Matrix3d::Constant(std::numeric_limits<double>::denorm_min())).R);
  check_proper(polar(Matrix3d::Constant(1e308)).R);
  Matrix3d A;
  A << 1e300, 1, 1e-300, 1e-300, 1, 1e-300, 0, 1, 1e-300;
  check_proper(polar(A).R);
}

// Catches a wrong sign or a wrong index in one of the four branches: each component is the largest
// in some of the cases. Source: elementary (half angle).
TEST_CASE("quaternion: axis times sine and cosine of half the angle") {
  Random random(3);
  for (int i = 0; i < 400; ++i) {
    Point axis = random.point(-1, 1);
    if (i % 4 < 3) axis[i % 4] *= 20;
    axis.normalize();
    const double angle = random.uniform(-metrics::kPi, metrics::kPi);
    Vector4d expected;
    expected << std::sin(angle / 2) * axis, std::cos(angle / 2);
    const Vector4d q = quaternion(rotation(axis, angle));
    CHECK(apart(q, expected) < 1e-14);
    CHECK(q.norm() == Approx(1).epsilon(1e-15));
  }
  CHECK(quaternion(Matrix3d::Identity()) == Vector4d(0, 0, 0, 1));
}

Prepared one_vertex(const Run& run, std::size_t joints) {
  return prepared_of({{1, 2, 3}}, {run}, joints);
}

// Catches a rotation of the wrong joint, a stretch that leaks into the rotation, and unowned
// vertices left without one. Source: elementary.
TEST_CASE("carried_rotations: at rest, of one joint, and of none") {
  TubeRig rig = random_tube(4);
  const std::vector<Affine> at_rest(kTubeJoints, affine(Matrix3d::Identity()));
  for (const Vector4d& q : skinning::carried_rotations(rig.prepared, at_rest)) {
    CHECK(apart(q, {0, 0, 0, 1}) < 1e-15);
  }

  std::vector<Run> runs;
  for (std::size_t v = 0; v < rig.prepared.rest.size(); ++v) {
    runs.push_back({{static_cast<Index>(v % kTubeJoints), 0.7}});
  }
  runs.back().clear();
  rig.prepared.influences = influences_of(runs);
  std::vector<Affine> stretched = rig.matrices;
  for (Affine& M : stretched) M.leftCols<3>() *= Point(2, 1, 0.5).asDiagonal();
  const std::vector<Vector4d> carried = skinning::carried_rotations(rig.prepared, stretched);
  for (std::size_t v = 0; v + 1 < carried.size(); ++v) {
    CHECK(apart(carried[v], quaternion(rig.matrices[v % kTubeJoints].leftCols<3>())) < 1e-14);
  }
  CHECK(carried.back() == Vector4d(0, 0, 0, 1));
  CHECK(skinning::carried_rotations(rig.prepared, {}).empty());
}

// Catches a blend without normalization or the long way round: half angles 0 and 100 degrees meet
// at -40, as 100 counts as -80. Source: elementary.
TEST_CASE("carried_rotations: the normalized blend, signs by the heaviest joint") {
  const double degree = metrics::kDegree;
  const std::vector<Affine> matrices = {affine(Matrix3d::Identity()),
                                        affine(rotation({0, 0, 1}, 200 * degree))};
  const Vector4d q =
      skinning::carried_rotations(one_vertex({{1, 0.5}, {0, 0.5}}, 2), matrices).front();
  CHECK(apart(q, {0, 0, std::sin(-40 * degree), std::cos(-40 * degree)}) < 1e-14);
}

// Catches an arbitrary side taken where both are as near, and the threshold left out or squared.
// cos of the half angle: 5e-4 is undecided, 2e-3 decided. Source: our rule.
TEST_CASE("carried_rotations: undecided near half a turn from the heaviest joint") {
  const auto carried = [](double cosine) {
    const std::vector<Affine> matrices = {affine(Matrix3d::Identity()),
                                          affine(rotation({1, 0, 0}, 2 * std::acos(cosine)))};
    return skinning::carried_rotations(one_vertex({{0, 0.9}, {1, 0.1}}, 2), matrices).front();
  };
  for (const double cosine : {0.0, 5e-4, -5e-4}) {
    CHECK(std::isnan(carried(cosine)[0]));
    CHECK(std::isnan(carried(cosine)[3]));
  }
  for (const double cosine : {2e-3, -2e-3}) CHECK(carried(cosine).allFinite());
}

}  // namespace
}  // namespace tests
