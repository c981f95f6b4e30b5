#pragma once

#include "metrics/metric.h"
#include "tests/support/shapes.h"

#include <Eigen/Core>

#include <cstdint>
#include <vector>

namespace tests {

using metrics::Metric;
using metrics::Posed;
using metrics::Surface;
using metrics::Values;
using Quaternion = Eigen::Vector4d;  // x, y, z, w

Quaternion quaternion(const Point& axis, double radians);
Eigen::Matrix3d matrix(const Quaternion& q);

/// A skin with the rotations its joints carry it by.
struct Skinned {
  Points points;
  std::vector<Quaternion> carried;

  Posed posed(double delta = 0) const { return {points, carried, delta}; }
};

/// The points as they are, carried by no rotation.
Skinned resting(const Points& points);

/// The points turned about the origin by `q`, then moved; carried by `q`.
Skinned turned(const Points& points, const Quaternion& q, const Point& translation = {0, 0, 0});

enum class Blend { Linear, DualQuaternion };

/// Limb of two bones that meet at the origin, the one along +z turned by `radians` about `axis`;
/// weights linear in z over [-half_width, half_width]. For bones that only turn about one point
/// dual quaternions are their rotations, so blending these alone is exact.
Skinned limb(const Points& rest, const Point& axis, double radians, double half_width, Blend blend);

Surface surface_of(const Shape& shape);

/// The values of all elements in a frame.
Values measured(const Metric& metric, const Surface& surface, const Posed& posed);

/// What a limit of this statistic, e.g. "max", is held against.
double limit_of(const Metric& metric, std::string_view statistic, const Surface& surface,
                const Posed& posed);

/// Per element what a drift is held against.
Values drifts(const Metric& metric, const Surface& surface, const Posed& current,
              const Posed& golden);

/// Drift of one statistic from the golden.
double drift_of(const Metric& metric, std::string_view statistic, const Surface& surface,
                const Posed& current, const Posed& golden);

/// Largest drift over floor of any decided element when a bent limb is skinned in single precision
/// instead of double, over many limbs, a quarter of them far from the origin. With `split` every
/// corner of a face is a vertex with slightly different weights.
double worst_rounding(const Metric& metric, bool split);

}  // namespace tests
