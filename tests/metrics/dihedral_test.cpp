#include "metrics/catalog.h"
#include "metrics/elementary.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <cmath>

using metrics::dihedral;
using metrics::kDegree;
using metrics::kPi;
using metrics::Point;

namespace {

metrics::Values angles(const metrics::Surface& surface) {
  const auto skin = tests::resting(surface.rest);
  return tests::measured(dihedral(), surface, skin.posed());
}

// Integral of the mean curvature: half the sum of edge length times exterior dihedral angle.
double mean_curvature(const tests::Shape& shape) {
  const auto surface = tests::surface_of(shape);
  const auto values = angles(surface);
  double sum = 0;
  for (std::size_t e = 0; e < values.size(); ++e) {
    sum += surface.edge_length[e] * values[e] * kDegree / 2;
  }
  return sum;
}

// Two triangles on the y axis, the second folded down by `degrees` from the plane of the first.
tests::Shape hinge(double degrees, double width = 1) {
  const double angle = degrees * kDegree;
  return {
      {{0, 0, 0}, {0, 1, 0}, {-1, 0, 0}, {width * std::cos(angle), 0, -width * std::sin(angle)}},
      {{0, 1, 2}, {1, 0, 3}}};
}

double fold_of(const tests::Shape& shape) {
  return angles(tests::surface_of(shape))[0];
}

}  // namespace

// Catches: a wrong sign (convex is positive), an angle of the interior, diagonals that are not
// flat. Source: elementary; icosahedron: interior angle acos(-sqrt 5 / 3).
TEST_CASE("dihedral angles of solids") {
  int right_angles = 0;
  for (const double value : angles(tests::surface_of(tests::cube(3)))) {
    const bool flat = std::abs(value) < 1e-12;
    CHECK((flat || value == Approx(90).epsilon(1e-14)));
    right_angles += flat ? 0 : 1;
  }
  CHECK(right_angles == 12);
  for (const double value : angles(tests::surface_of(tests::reversed(tests::cube(3))))) {
    CHECK((std::abs(value) < 1e-12 || value == Approx(-90).epsilon(1e-14)));
  }
  for (const double value : angles(tests::surface_of(tests::icosahedron()))) {
    CHECK(value == Approx(std::acos(std::sqrt(5.0) / 3) / kDegree).epsilon(1e-13));
  }
}

// Catches: angles beyond 90 degrees, near a half turn or close to flat lost, as acos or asin would.
// Source: elementary.
TEST_CASE("dihedral angle of a hinge") {
  for (const double degrees : {-179.0, -90.0, -1e-9, 0.0, 1e-9, 1e-4, 30.0, 120.0, 179.999999}) {
    CHECK(fold_of(hinge(degrees)) == Approx(degrees).epsilon(1e-9).margin(1e-14));
  }
}

// Catches: the angle of unwelded copies (all borders, no angle), or one that looks for the edge by
// file vertices.
TEST_CASE("dihedral angles do not see how vertices are split") {
  for (const auto& shape : {tests::split_cube(), tests::exploded(tests::cube())}) {
    double sum = 0;
    for (const double value : angles(tests::surface_of(shape))) {
      sum += value;
    }
    CHECK(sum == Approx(12 * 90).epsilon(1e-13));
  }
}

// Catches: a wrong weight, sign or welding anywhere on the surface.
// Source: Steiner's formula: 3 pi a of a cube, pi h + pi n r sin(pi/n) of a prism; 4 pi of the unit
// sphere, approached with order 2.
TEST_CASE("dihedral angles add up to the integral of the mean curvature") {
  for (const double edge : {1e-4, 1.0, 70.0}) {
    CHECK(mean_curvature(tests::cube(edge)) == Approx(3 * kPi * edge).epsilon(1e-13));
    CHECK(mean_curvature(tests::split_cube(edge)) == Approx(3 * kPi * edge).epsilon(1e-13));
  }
  for (const int n : {3, 7, 50}) {
    const double r = 1.5;
    const double h = 2;
    const auto prism = tests::tube(
        {.rings = 4, .sides = n, .radius = r, .length = h, .ends = tests::Ends::Capped});
    CHECK(mean_curvature(prism) ==
          Approx(kPi * h + kPi * n * r * std::sin(kPi / n)).epsilon(1e-13));
  }
  const double coarse = mean_curvature(tests::icosphere(4)) / (4 * kPi) - 1;
  const double fine = mean_curvature(tests::icosphere(5)) / (4 * kPi) - 1;
  CHECK(std::abs(fine) == Approx(1e-4).epsilon(0.05));
  CHECK(std::log2(coarse / fine) == Approx(2).margin(0.1));
}

// Catches: a change of 358 degrees where the fold passes the half turn; a change with a sign.
TEST_CASE("dihedral changes wrap around") {
  const auto metric = dihedral();
  CHECK(metric.difference(179, -179) == 2);
  CHECK(metric.difference(-179, 179) == 2);
  CHECK(metric.change(-90, 90) == 180);
  CHECK(metric.change(10, 40) == 30);
  const auto surface = tests::surface_of(hinge(170));
  const auto folded = tests::resting(hinge(-170).points);
  CHECK(tests::limit_of(metric, "max", surface, folded.posed()) == Approx(20).epsilon(1e-12));
}

// Catches: an rms by edges instead of by rest length. One of two hinges opens by 30 degrees; the
// edges have the lengths 1 and 3.
TEST_CASE("dihedral.rms weighs edges by their length at rest") {
  const auto longer = tests::moved(hinge(0).points, 3 * Eigen::Matrix3d::Identity(), {9, 0, 0});
  const auto surface = tests::surface_of(tests::joined(hinge(0), {longer, hinge(0).faces}));
  auto skin = tests::resting(surface.rest);
  for (std::size_t v = 0; v < 4; ++v) {
    skin.points[v] = hinge(30).points[v];
  }
  CHECK(tests::limit_of(dihedral(), "rms", surface, skin.posed()) ==
        Approx(30 * std::sqrt(1 / 4.0)).epsilon(1e-12));
}

// Catches: an angle where there is none.
TEST_CASE("dihedral is undefined at borders, forks, turned and empty faces") {
  const auto undefined = [](const tests::Shape& shape) {
    const auto values = angles(tests::surface_of(shape));
    return std::count_if(values.begin(), values.end(), [](double v) { return std::isnan(v); });
  };
  auto shape = hinge(60);
  CHECK(undefined(shape) == 4);  // the four borders
  std::swap(shape.faces[1][0], shape.faces[1][1]);
  CHECK(undefined(shape) == 5);  // turned the other way
  shape = hinge(60);
  shape.points.emplace_back(0, 0, 1);
  shape.faces.push_back({1, 0, 4});
  CHECK(undefined(shape) == 7);  // a third face on the edge

  // No area, as far as rounding can tell.
  const auto needle = hinge(60, 1e-13);
  const auto thin = metrics::make_surface(needle.points, needle.faces, {}, 0);
  REQUIRE(thin.edges.size() == 5);
  CHECK(std::isnan(angles(thin)[0]));
  const auto surface = tests::surface_of(hinge(60));
  const auto collapsed = tests::resting(hinge(60, 0).points);
  CHECK(std::isnan(tests::limit_of(dihedral(), "max", surface, collapsed.posed())));
}

// Catches: an angle that depends on which face comes first when a seam has opened.
TEST_CASE("dihedral at an open seam does not depend on the order of faces") {
  auto shape = tests::exploded(hinge(40));
  auto points = shape.points;
  points[3] += Point(0.1, 0.2, 2);
  const auto skin = tests::resting(points);
  const double one = tests::measured(dihedral(), tests::surface_of(shape), skin.posed())[0];
  std::swap(shape.faces[0], shape.faces[1]);
  const double other = tests::measured(dihedral(), tests::surface_of(shape), skin.posed())[0];
  CHECK(one == Approx(other).epsilon(1e-13));
  CHECK(std::abs(one - 40) > 1);
}

// Catches: a floor of rest altitudes, or in radians. Source: elementary, delta (1/h1 + 1/h2).
TEST_CASE("dihedral floors grow as posed faces get thin") {
  const auto surface = tests::surface_of(hinge(0));
  const auto thin = tests::resting(hinge(0, 0.01).points);
  metrics::Values floors;
  dihedral().floors(surface, thin.posed(1e-6), floors);
  CHECK(floors[0] == Approx(1e-6 * (1 + 100) / kDegree).epsilon(1e-12));
  const auto collapsed = tests::resting(hinge(0, 0).points);
  dihedral().floors(surface, collapsed.posed(1e-6), floors);
  CHECK(4 * floors[0] > dihedral().undecidable);
  const auto point = tests::resting(metrics::Points(4, Point(1, 1, 1)));
  dihedral().floors(surface, point.posed(1e-6), floors);
  CHECK(4 * floors[0] > dihedral().undecidable);
}

// Catches: an allowance below the noise of single precision, or so far above it that nothing shows.
// Source: largest ratio 0.69 in 120 runs of an independent implementation.
TEST_CASE("dihedral floors bound the rounding of single precision") {
  const double worst = tests::worst_rounding(dihedral(), false);
  CHECK(worst < 4);
  CHECK(worst > 0.05);
}
