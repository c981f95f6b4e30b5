#pragma once

#include "metrics/surface.h"

#include <span>
#include <vector>

namespace metrics {

/// Per point the lowest point it is one with: equal (-0 is 0) or, linked transitively, nearer than
/// `weld` * `diagonal`, the diagonal of their bounding box. A `weld` below 1e-12 or no finite
/// diagonal: equal points only. O(n log n), also where many points coincide or crowd together.
std::vector<Index> weld_points(std::span<const Point> points, double diagonal, double weld);

}  // namespace metrics
