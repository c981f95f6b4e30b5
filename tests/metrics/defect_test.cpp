#include "metrics/catalog.h"
#include "metrics/elementary.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <cmath>
#include <numeric>

using metrics::defect;
using metrics::kDegree;
using metrics::kPi;
using metrics::Point;

namespace {

metrics::Values defects(const metrics::Surface& surface) {
  const auto skin = tests::resting(surface.rest);
  return tests::measured(defect(), surface, skin.posed());
}

// Sum over the vertices that have a defect, and how many these are.
std::pair<double, int> total(const tests::Shape& shape) {
  std::pair<double, int> result{0, 0};
  for (const double value : defects(tests::surface_of(shape))) {
    if (!std::isnan(value)) {
      result.first += value;
      ++result.second;
    }
  }
  return result;
}

}  // namespace

// Catches: wrong corner angles; the unit. Source: elementary.
TEST_CASE("defect at the corners of a cube and at the tip of a cone") {
  for (const double value : defects(tests::surface_of(tests::cube(0.3)))) {
    CHECK(value == Approx(90).epsilon(1e-13));
  }
  // n triangles with legs sqrt(r^2 + h^2) on chords of 2 r sin(pi/n).
  const int n = 12;
  const double leg = std::hypot(1.0, 2.0);
  const double tip = 2 * std::asin(std::sin(kPi / n) / leg) / kDegree;
  const auto values = defects(tests::surface_of(tests::cone(n, 1, 2)));
  CHECK(values.back() == Approx(360 - n * tip).epsilon(1e-13));
}

// Catches: a missing or doubled vertex, split copies counted each. Source: Gauss-Bonnet: the sum is
// 2 pi times the Euler characteristic.
TEST_CASE("defects of closed surfaces add up to a whole number of turns") {
  CHECK(total(tests::icosphere(3)).first == Approx(720).epsilon(1e-11));
  CHECK(total(tests::torus(2, 1, 24, 16)).first == Approx(0).margin(1e-9));
  CHECK(total(tests::tube({.ends = tests::Ends::Capped})).first == Approx(720).epsilon(1e-11));
  auto apart = tests::split_cube();
  apart.points = tests::moved(apart.points, Eigen::Matrix3d::Identity(), {5, 5, 5});
  CHECK(total(tests::joined(tests::icosphere(1), apart)).first == Approx(1440).epsilon(1e-11));
  for (const auto& shape : {tests::split_cube(), tests::exploded(tests::cube())}) {
    const auto [sum, count] = total(shape);
    CHECK(sum == Approx(720).epsilon(1e-13));
    CHECK(count == 8);
  }
}

// Catches: the full turn expected at a border; a defect of a vertex that no face has.
TEST_CASE("defect is undefined at borders, forks and on lone vertices") {
  CHECK(total(tests::grid(4, 4)).second == 4);  // the inner ones
  // An open cylinder: flat inside.
  const auto [sum, count] = total(tests::tube({.rings = 5, .sides = 8}));
  CHECK(count == 3 * 8);
  CHECK(sum == Approx(0).margin(1e-10));
  auto shape = tests::cube();
  shape.points.emplace_back(5, 5, 5);
  CHECK(total(shape).second == 8);
  shape = tests::joined(tests::tetra(), tests::tetra());
  for (Point& p : shape.points) {
    p = &p - shape.points.data() < 4 ? p : Point(-p);  // they touch at the origin
  }
  CHECK(total(shape).second == 6);
  // Two corners of a face in one place after posing: no angle there.
  const auto surface = tests::surface_of(tests::tetra());
  auto skin = tests::resting(surface.rest);
  skin.points[1] = skin.points[0];
  const auto values = tests::measured(defect(), surface, skin.posed());
  CHECK(std::isnan(values[0]));
  CHECK(std::isnan(values[1]));
  CHECK(values[2] == Approx(360 - 90).epsilon(1e-13));  // 45, 45 and 0 degrees
}

// Catches: a measurement that sees what is intrinsic and what is not the wrong way round.
// Source: Gauss: bending without stretching keeps the defect; elementary for the pyramid.
TEST_CASE("defect changes with stretching and not with folding") {
  const auto surface = tests::surface_of(tests::grid(9, 9, 1, tests::Diagonals::Uniform));
  auto skin = tests::resting(surface.rest);
  for (Point& p : skin.points) {
    if (p.x() > 4) {
      p = {4, p.y(), p.x() - 4};
    }
  }
  CHECK(tests::limit_of(defect(), "max", surface, skin.posed()) < 1e-10);
  skin = tests::resting(surface.rest);
  skin.points[40].z() += 1;
  CHECK(tests::limit_of(defect(), "max", surface, skin.posed()) > 60);
  CHECK(defect().change(10, 40) == 30);
  CHECK(tests::drift_of(defect(), "max", surface, skin.posed(), skin.posed()) == 0);
}

// Catches: a floor of other edges or in radians. Source: elementary, 2 delta times the sum of 1/l,
// at least 2.5e-7 radians.
TEST_CASE("defect floors are those of the posed edges") {
  const auto surface = tests::surface_of(tests::tetra());
  const auto skin = tests::resting(tests::moved(surface.rest, 2 * Eigen::Matrix3d::Identity()));
  metrics::Values floors;
  defect().floors(surface, skin.posed(1e-3), floors);
  CHECK(floors[0] == Approx(2e-3 * 3 / 2 / kDegree).epsilon(1e-13));
  CHECK(floors[1] == Approx(2e-3 * (0.5 + std::sqrt(0.5)) / kDegree).epsilon(1e-13));
  defect().floors(surface, skin.posed(0), floors);
  CHECK(floors[0] == Approx(2.5e-7 / kDegree).epsilon(1e-13));
}

// Catches: an allowance below the noise of single precision, or so far above it that nothing shows.
// Source: to first order each edge turns by at most 2 delta / l and bounds two angles, so 2 floors.
TEST_CASE("defect floors bound the rounding of single precision") {
  const double worst = tests::worst_rounding(defect(), false);
  CHECK(worst < 4);
  CHECK(worst > 0.02);
}
