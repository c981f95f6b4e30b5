#pragma once

#include "metrics/surface.h"

#include <Eigen/Geometry>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <span>

namespace metrics {

inline constexpr double kUndefined = std::numeric_limits<double>::quiet_NaN();

/// D of a surface; NaN where it is 0, so that lengths in D are undefined there.
inline double unit_length(const Surface& surface) {
  return surface.diagonal > 0 ? surface.diagonal : kUndefined;
}

/// A face at given positions.
struct Triangle {
  std::array<Point, 3> sides;  ///< side k runs from corner k to corner k + 1
  Point normal;                ///< not normalized: twice the area long

  /// Length of the longest side, squared.
  double longest_squared() const {
    return std::max({sides[0].squaredNorm(), sides[1].squaredNorm(), sides[2].squaredNorm()});
  }

  /// Smallest of the three altitudes; 0 for a point.
  double altitude() const {
    const double longest = std::sqrt(longest_squared());
    return longest > 0 ? normal.norm() / longest : 0;
  }

  /// No area worth the name, so no normal either: below 1e-12 of the longest side squared.
  bool collapsed() const { return !(normal.norm() > 2e-12 * longest_squared()); }
};

inline Triangle triangle(std::span<const Point> points, const Face& face) {
  const Point& a = points[face[0]];
  const Point& b = points[face[1]];
  const Point& c = points[face[2]];
  return {{b - a, c - b, a - c}, (b - a).cross(c - a)};
}

/// Which side of a face lies on an edge: that from corner k to corner k + 1.
/// Precondition: one does.
inline std::size_t side_on(const Surface& surface, const Edge& edge, Index face) {
  const Face& corners = surface.faces[face];
  for (std::size_t k = 0; k < 2; ++k) {
    const auto [low, high] =
        std::minmax({surface.welded[corners[k]], surface.welded[corners[k + 1]]});
    if (low == edge.a && high == edge.b) {
      return k;
    }
  }
  return 2;
}

}  // namespace metrics
