#include "metrics/surface.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <numeric>
#include <vector>

using metrics::Index;
using metrics::make_surface;
using metrics::Point;
using metrics::Points;
using metrics::Surface;

namespace {

// Every pair compared; the lowest member of each group linked transitively.
std::vector<Index> slowly_welded(const Points& points, double distance) {
  std::vector<Index> label(points.size());
  std::iota(label.begin(), label.end(), Index{0});
  for (bool changed = true; changed;) {
    changed = false;
    for (std::size_t i = 0; i < points.size(); ++i) {
      for (std::size_t j = 0; j < points.size(); ++j) {
        const bool one = points[i] == points[j] || (points[i] - points[j]).norm() < distance;
        if (one && label[j] < label[i]) {
          label[i] = label[j];
          changed = true;
        }
      }
    }
  }
  return label;
}

double diagonal(const Points& points) {
  Point low = points[0];
  Point high = points[0];
  for (const Point& p : points) {
    low = low.cwiseMin(p);
    high = high.cwiseMax(p);
  }
  return (high - low).norm();
}

}  // namespace

// Catches a weld that compares with the wrong distance, or that stops at direct neighbours.
TEST_CASE("welding links transitively below its distance") {
  // D is 1; steps of 0.8e-3 on a line, then a gap of 1.2e-3.
  Points points{{0, 0, 0},      {0.8e-3, 0, 0}, {1.6e-3, 0, 0},
                {2.4e-3, 0, 0}, {3.6e-3, 0, 0}, {1, 0, 0}};
  std::reverse(points.begin(), points.end());
  const Surface surface = make_surface(points, {}, {}, 1e-3);
  CHECK(surface.welded == std::vector<Index>{0, 1, 2, 2, 2, 2});
  CHECK(surface.welded_count == 3);
  CHECK(surface.twins == std::vector<std::vector<Index>>{{2, 3, 4, 5}});
  CHECK(make_surface(points, {}, {}, 0).welded_count == 6);
  // A diagonal step in the lower corner, just longer and just shorter than the distance.
  for (const double step : {1.01e-3, 0.99e-3}) {
    const Point away = Point(1, 1, 1).normalized() * step;
    const Surface two = make_surface({{0, 0, 0}, away, {1, 0, 0}}, {}, {}, 1e-3);
    CHECK(two.welded_count == (step > 1e-3 ? 3 : 2));
  }
}

// Catches a zero that is told from its negative, and a weld of 0 that welds more or less.
TEST_CASE("equal positions are always welded") {
  const Points points{{0.0, 1, 0}, {-0.0, 1, -0.0}, {0, 1, 5e-324}};
  CHECK(make_surface(points, {}, {}, 0).welded == std::vector<Index>{0, 0, 2});
  CHECK(make_surface({{1e300, 0, 0}, {-1e300, 0, 0}, {1e300, 0, 0}}, {}).welded ==
        std::vector<Index>{0, 1, 0});
  CHECK(make_surface({{1e-300, 0, 0}, {-1e-300, 0, 0}, {1e-300, 0, 0}}, {}).welded ==
        std::vector<Index>{0, 1, 0});
  CHECK(make_surface({{1, 2, 3}, {1, 2, 3}}, {}).welded == std::vector<Index>{0, 0});
  CHECK(make_surface({}, {}).welded_count == 0);
}

// Catches cells of the grid that are not compared with all that lie in reach. Reference: all pairs.
TEST_CASE("welding equals the comparison of all pairs") {
  tests::Random random(7);
  for (int round = 0; round < 60; ++round) {
    const double weld = round % 3 == 0 ? 0.02 : round % 3 == 1 ? 0.1 : 0.3;
    Points points;
    for (int i = 0; i < 150; ++i) {
      points.push_back(random.point(-3, 5));
      if (random.uniform(0, 1) < 0.2) {
        points.push_back(points[random.bits() % points.size()]);
      }
    }
    CAPTURE(round);
    CHECK(make_surface(points, {}, {}, weld).welded ==
          slowly_welded(points, weld * diagonal(points)));
  }
}

// Catches crowded cells that are judged by their boxes alone: two bundles of points on both sides
// of the distance. Reference: all pairs.
TEST_CASE("crowded cells are compared point by point") {
  tests::Random random(8);
  for (int round = 0; round < 40; ++round) {
    Points points{{0, 0, 0}, {1, 0, 0}};
    const Point apart = random.point(-0.75, 0.75) * 1e-2;
    for (int i = 0; i < 60; ++i) {
      const Point p = Point(0.5, 0.5, 0.5) + random.point(-0.2, 0.2) * 1e-2;
      points.push_back(i % 2 == 0 ? p : p + apart);
    }
    CAPTURE(round);
    CHECK(make_surface(points, {}, {}, 5e-3).welded ==
          slowly_welded(points, 5e-3 * diagonal(points)));
  }
}

// Catches a comparison of all pairs, which would take hours here.
TEST_CASE("welding many vertices of one place is not quadratic") {
  Points points(400000, Point(1, 2, 3));
  points.emplace_back(0, 0, 0);
  CHECK(make_surface(points, {}).welded_count == 2);
  // A crowd within the distance, none equal, and two crowds just out of each other's reach.
  tests::Random random(9);
  for (std::size_t i = 0; i + 1 < points.size(); ++i) {
    points[i] = Point(1, 1, 1) + random.point(0, 1e-9);
  }
  CHECK(make_surface(points, {}).welded_count == 2);
  for (std::size_t i = 0; i + 1 < points.size(); i += 2) {
    points[i] += Point(1.9e-7, 0, 0);
  }
  CHECK(make_surface(points, {}).welded_count == 3);
}
