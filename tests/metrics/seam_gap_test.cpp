#include "metrics/catalog.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <cmath>

using metrics::Point;
using metrics::seam_gap;

namespace {

double gap_of(const metrics::Surface& surface, const metrics::Points& points) {
  const auto skin = tests::resting(points);
  return tests::limit_of(seam_gap(), "max", surface, skin.posed());
}

const double kDiagonal = std::sqrt(3.0);  // of the unit cube

}  // namespace

// Catches: a crack that is not seen, measured in file units or told at the wrong vertex.
TEST_CASE("seam_gap is the width of a crack in units of D") {
  const auto surface = tests::surface_of(tests::split_cube());
  REQUIRE(surface.twins.size() == 8);
  CHECK(gap_of(surface, surface.rest) == 0);
  auto points = surface.rest;
  points[7] += Point(0, 0.03, 0.04);
  CHECK(gap_of(surface, points) == Approx(0.05 / kDiagonal).epsilon(1e-13));
  const auto skin = tests::resting(points);
  const auto values = tests::measured(seam_gap(), surface, skin.posed());
  REQUIRE(values.size() == 24);
  for (std::size_t v = 0; v < values.size(); ++v) {
    CHECK((values[v] > 0) == (v == surface.welded[7]));
  }
  const auto golden = tests::resting(surface.rest);
  CHECK(tests::drift_of(seam_gap(), "max", surface, skin.posed(), golden.posed()) ==
        Approx(0.05 / kDiagonal).epsilon(1e-13));
}

// Catches: distances from a representative, which depend on the numbering: no two copies of a
// corner are further than 2 here, the representative stays in the middle.
TEST_CASE("seam_gap is the largest distance between any two twins") {
  const auto surface = tests::surface_of(tests::split_cube());
  for (const auto& twins : surface.twins) {
    REQUIRE(twins.size() == 3);
    for (std::size_t still = 0; still < 3; ++still) {
      auto points = surface.rest;
      points[twins[(still + 1) % 3]].x() += 0.1;
      points[twins[(still + 2) % 3]].x() -= 0.1;
      CHECK(gap_of(surface, points) == Approx(0.2 / kDiagonal).epsilon(1e-13));
    }
  }
}

// Catches: pairs that are skipped in a large group, by comparison with all pairs.
TEST_CASE("seam_gap of a large group of twins") {
  metrics::Points rest(40, Point(1, 1, 1));
  rest.emplace_back(0, 0, 0);
  rest.emplace_back(0, 1, 0);
  const auto surface = metrics::make_surface(rest, {{0, 40, 41}});
  tests::Random random(3);
  for (int trial = 0; trial < 20; ++trial) {
    auto points = rest;
    double largest = 0;
    for (std::size_t i = 0; i < 40; ++i) {
      points[i] += random.point(-0.1, 0.1);
      for (std::size_t j = 0; j < i; ++j) {
        largest = std::max(largest, (points[i] - points[j]).norm());
      }
    }
    CHECK(gap_of(surface, points) == Approx(largest / kDiagonal).epsilon(1e-13));
  }
}

// Catches: a gap of the rest shape, bridged by a wide `weld`, that is reported as a crack.
TEST_CASE("seam_gap leaves out vertices that do not coincide at rest") {
  auto shape = tests::exploded(tests::grid(2, 2));
  for (std::size_t v = 3; v < 6; ++v) {
    shape.points[v].x() += 1e-4;
  }
  const auto surface = metrics::make_surface(shape.points, shape.faces, {}, 1e-3);
  REQUIRE(surface.twins.size() == 2);
  CHECK(gap_of(surface, shape.points) == 0);
}

// Catches: an allowance below the noise of single precision, or so far above it that nothing shows.
TEST_CASE("seam_gap floors bound the rounding of single precision") {
  const double worst = tests::worst_rounding(seam_gap(), true);
  CHECK(worst < 4);
  CHECK(worst > 0.05);
}
