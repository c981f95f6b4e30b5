#include "tests/support/limb.h"

#include <Eigen/Geometry>

#include <cmath>
#include <stdexcept>

namespace tests {
namespace {

const metrics::Statistic& find(const Metric& metric, std::string_view name) {
  for (const metrics::Statistic& statistic : metric.statistics) {
    if (statistic.name == name) {
      return statistic;
    }
  }
  throw std::out_of_range("no such statistic");
}

std::vector<double> weights_of(const Metric& metric, const Surface& surface) {
  return metric.weights != nullptr ? metric.weights(surface) : std::vector<double>();
}

// One limb in single and in double precision.
struct Trial {
  Surface surface;
  Points exact, rounded;
  double delta = 0;
};

Trial trial(std::uint64_t seed, bool split) {
  Random random(seed);
  Shape shape = tube({.rings = 25, .sides = 16, .length = 6, .ends = Ends::Capped});
  for (Point& p : shape.points) {
    p += random.point(-0.02, 0.02);
  }
  if (split) {
    shape = exploded(shape);
  }
  const double half_width = random.uniform(0.2, 1);
  std::vector<double> weights;
  for (const Point& p : shape.points) {
    weights.push_back(upper_weight(p.z(), half_width) + (split ? random.uniform(0, 1e-3) : 0));
  }
  const Point origin = seed % 4 == 3 ? random.point(-1000, 1000) : random.point(-1, 1);
  shape.points = moved(shape.points, Eigen::Matrix3d::Identity(), origin);
  const Eigen::Matrix3d R = rotation(random.point(-1, 1), random.uniform(0, 1.5));
  const Point translation = origin - R * origin;

  Trial result{surface_of(shape), {}, {}, 0};
  double largest = translation.cwiseAbs().maxCoeff();
  for (std::size_t v = 0; v < shape.points.size(); ++v) {
    const Point& p = shape.points[v];
    const double w = weights[v];
    result.exact.emplace_back((1 - w) * p + w * (R * p + translation));
    const Eigen::Vector3f single = p.cast<float>();
    const auto weight = static_cast<float>(w);
    const Eigen::Vector3f upper = R.cast<float>() * single + translation.cast<float>();
    result.rounded.emplace_back(((1 - weight) * single + weight * upper).cast<double>());
    largest = std::max(largest, p.cwiseAbs().maxCoeff());
  }
  result.delta = 4 * 0x1p-24 * largest;
  return result;
}

}  // namespace

Quaternion quaternion(const Point& axis, double radians) {
  const Point vector = std::sin(radians / 2) * axis.normalized();
  return {vector.x(), vector.y(), vector.z(), std::cos(radians / 2)};
}

Eigen::Matrix3d matrix(const Quaternion& q) {
  return Eigen::Quaterniond(q).normalized().toRotationMatrix();
}

Skinned resting(const Points& points) {
  return {points, std::vector<Quaternion>(points.size(), Quaternion(0, 0, 0, 1))};
}

Skinned turned(const Points& points, const Quaternion& q, const Point& translation) {
  return {moved(points, matrix(q), translation), std::vector<Quaternion>(points.size(), q)};
}

Skinned limb(const Points& rest, const Point& axis, double radians, double half_width,
             Blend blend) {
  const Quaternion upper = quaternion(axis, radians);
  const Eigen::Matrix3d R = matrix(upper);
  Skinned skin;
  for (const Point& p : rest) {
    const double w = upper_weight(p.z(), half_width);
    const Quaternion sum = (1 - w) * Quaternion(0, 0, 0, 1) + w * upper;
    const double length = sum.norm();
    const double nan = std::numeric_limits<double>::quiet_NaN();
    const Quaternion carried =
        length < 1e-3 ? Quaternion(Quaternion::Constant(nan)) : Quaternion(sum / length);
    skin.carried.push_back(carried);
    skin.points.emplace_back(blend == Blend::Linear ? Point((1 - w) * p + w * (R * p))
                                                    : Point(matrix(carried) * p));
  }
  return skin;
}

Surface surface_of(const Shape& shape) {
  return metrics::make_surface(shape.points, shape.faces);
}

Values measured(const Metric& metric, const Surface& surface, const Posed& posed) {
  Values values;
  metric.measure(surface, posed, values);
  return values;
}

double limit_of(const Metric& metric, std::string_view statistic, const Surface& surface,
                const Posed& posed) {
  Values values = measured(metric, surface, posed);
  if (metric.change != nullptr) {
    const Skinned rest = resting(surface.rest);
    const Values at_rest = measured(metric, surface, rest.posed(posed.delta));
    for (std::size_t i = 0; i < values.size(); ++i) {
      values[i] = metric.change(values[i], at_rest[i]);
    }
  }
  const metrics::Statistic& found = find(metric, statistic);
  const bool is_rms = found.aggregate == metrics::Aggregate::Rms;
  return metrics::aggregate(found.aggregate, values, weights_of(metric, surface),
                            is_rms ? metric.centre : found.neutral)
      .value;
}

Values drifts(const Metric& metric, const Surface& surface, const Posed& current,
              const Posed& golden) {
  Values drift;
  if (metric.compare != nullptr) {
    metric.compare(surface, current, golden, drift);
    return drift;
  }
  drift = measured(metric, surface, current);
  const Values then = measured(metric, surface, golden);
  for (std::size_t i = 0; i < drift.size(); ++i) {
    drift[i] = metric.difference != nullptr ? metric.difference(drift[i], then[i])
                                            : std::abs(drift[i] - then[i]);
  }
  return drift;
}

double drift_of(const Metric& metric, std::string_view statistic, const Surface& surface,
                const Posed& current, const Posed& golden) {
  return metrics::aggregate(find(metric, statistic).aggregate,
                            drifts(metric, surface, current, golden), weights_of(metric, surface),
                            0)
      .value;
}

double worst_rounding(const Metric& metric, bool split) {
  double worst = 0;
  for (std::uint64_t seed = 1; seed <= 40; ++seed) {
    const Trial now = trial(seed, split);
    const Posed current{now.rounded, {}, now.delta};
    const Posed golden{now.exact, {}, now.delta};
    const Values drift = drifts(metric, now.surface, current, golden);
    Values floors;
    metric.floors(now.surface, golden, floors);
    for (std::size_t i = 0; i < drift.size(); ++i) {
      if (drift[i] > 0 && 4 * floors[i] <= metric.undecidable) {
        worst = std::max(worst, drift[i] / floors[i]);
      }
    }
  }
  return worst;
}

}  // namespace tests
