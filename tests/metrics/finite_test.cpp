#include "metrics/catalog.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <limits>

using metrics::finite;

// Catches: infinities overlooked, points counted instead of coordinates.
TEST_CASE("finite.bad counts coordinates that are no number") {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const double infinity = std::numeric_limits<double>::infinity();
  const auto surface = tests::surface_of(tests::cube());
  const auto golden = tests::resting(surface.rest);
  auto skin = golden;
  CHECK(tests::limit_of(finite(), "bad", surface, skin.posed()) == 0);
  skin.points[1].y() = nan;
  skin.points[1].z() = infinity;
  skin.points[6].x() = -infinity;
  skin.points[7].x() = 1e308;
  CHECK(tests::limit_of(finite(), "bad", surface, skin.posed()) == 3);
  CHECK(tests::drift_of(finite(), "bad", surface, skin.posed(), golden.posed()) == 3);
  CHECK(tests::drift_of(finite(), "bad", surface, skin.posed(), skin.posed()) == 0);

  // As many, but elsewhere.
  auto other = golden;
  other.points[1].x() = nan;
  other.points[1].y() = infinity;
  other.points[6].x() = nan;
  CHECK(tests::drift_of(finite(), "bad", surface, skin.posed(), other.posed()) == 2);
}
