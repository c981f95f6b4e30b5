#include "metrics/elementary.h"
#include "tests/harness/skinning/tube_rig.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

namespace tests {
namespace {

/// A ring of radius 2 around the axis z, every vertex with weight w on the second of two joints.
Prepared ring(double w) {
  Points points;
  for (int i = 0; i < 16; ++i) {
    const double angle = 2 * metrics::kPi * i / 16;
    points.emplace_back(2 * std::cos(angle), 2 * std::sin(angle), 0);
  }
  return prepared_of(points, std::vector<Run>(points.size(), Run{{0, 1 - w}, {1, w}}), 2);
}

std::vector<Affine> second_turned(const Point& axis, double radians) {
  return {affine(Eigen::Matrix3d::Identity()), affine(rotation(axis, radians))};
}

double area(const Points& ring) {
  Point sum = Point::Zero();
  for (std::size_t i = 0; i < ring.size(); ++i) sum += ring[i].cross(ring[(i + 1) % ring.size()]);
  return 0.5 * sum.norm();
}

// Catches weights or matrices that are mixed up and any normalization of lengths: a twist must
// lose exactly the radius that linear blending loses. Source: elementary (chord of an arc).
TEST_CASE("linear_blend: radius of a twisted ring is sqrt(1 - 4 w (1 - w) sin^2(t / 2))") {
  for (const double degrees : {0.0, 30.0, 90.0, 150.0, 180.0}) {
    for (const double w : {0.0, 0.1, 0.5, 0.75}) {
      const double t = degrees * metrics::kDegree;
      const double factor = std::sqrt(1 - 4 * w * (1 - w) * std::pow(std::sin(t / 2), 2));
      const Points points = deformed("linear_blend", ring(w), second_turned({0, 0, 1}, t));
      for (const Point& point : points) {
        CHECK(point.norm() == Approx(2 * factor).margin(1e-7));
        CHECK(point.squaredNorm() == Approx(4 * factor * factor).margin(1e-12));
      }
      if (w == 0.5) {
        CHECK(area(points) ==
              Approx(area(ring(w).rest) * std::pow(std::cos(t / 2), 2)).margin(1e-12));
      }
    }
  }
}

// Catches blending of rotations where positions are due, which keeps the area. Source: elementary.
TEST_CASE("linear_blend: a bend narrows the ring at the joint by cos(t / 2) and keeps its depth") {
  for (const double degrees : {30.0, 90.0, 150.0}) {
    const double t = degrees * metrics::kDegree;
    const Prepared prepared = ring(0.5);
    const Points points = deformed("linear_blend", prepared, second_turned({1, 0, 0}, t));
    CHECK(area(points) == Approx(area(prepared.rest) * std::cos(t / 2)).margin(1e-12));
    double nearest = 2;
    for (std::size_t i = 0; i < points.size(); ++i) {
      CHECK(points[i].x() == Approx(prepared.rest[i].x()).margin(1e-14));
      nearest = std::min(nearest, points[i].norm());
    }
    CHECK(nearest == Approx(2 * std::cos(t / 2)).margin(1e-12));
  }
}

// Catches a silent normalization of weights and a vertex without weight sent to the origin.
// Source: elementary.
TEST_CASE("linear_blend: sums other than 1 show, a vertex without weight stays") {
  const Prepared prepared = prepared_of({{2, 4, 6}, {2, 4, 6}}, {{{0, 0.5}}, {}}, 1);
  const std::vector<Affine> matrices = {affine(Eigen::Matrix3d::Identity(), {0, 0, 2})};
  CHECK(deformed("linear_blend", prepared, matrices) == Points{{1, 2, 4}, {2, 4, 6}});
}

// Catches a method that keeps only the rotation of a joint. Source: elementary (linearity).
TEST_CASE("linear_blend: a common affine map comes out as it is") {
  Random random(7);
  TubeRig rig = random_tube(1);
  Eigen::Matrix3d A;
  A << random.point(-2, 2), random.point(-2, 2), random.point(-2, 2);
  const Affine map = affine(A, {1, -2, 3});
  rig.matrices.assign(kTubeJoints, map);
  CHECK(largest_distance(deformed("linear_blend", rig.prepared, rig.matrices),
                         moved(rig.prepared.rest, map)) < 1e-12 * kTubeDiagonal);
}

}  // namespace
}  // namespace tests
