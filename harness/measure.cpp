#include "harness/measure.h"

#include <cmath>

namespace harness {

using metrics::Metric;

Measured measure(const metrics::Surface& surface, const metrics::Posed& posed) {
  const std::vector<Metric>& catalog = metrics::catalog();
  Measured out;
  out.fields.resize(catalog.size());
  for (const metrics::Point& point : posed.points)
    out.finite = out.finite && std::isfinite(point.x()) && std::isfinite(point.y()) &&
                 std::isfinite(point.z());
  for (std::size_t i = 0; i < catalog.size(); ++i) {
    if (catalog[i].measure == nullptr) continue;
    if (out.finite || catalog[i].name == "finite")
      catalog[i].measure(surface, posed, out.fields[i]);
  }
  return out;
}

Measured measure_rest(const metrics::Surface& surface) {
  const std::vector<Eigen::Vector4d> still(surface.rest.size(), Eigen::Vector4d(0, 0, 0, 1));
  return measure(surface, {surface.rest, still, 0});
}

metrics::Values limit_values(std::size_t index, const Measured& measured, const Measured& rest) {
  const Metric& metric = metrics::catalog()[index];
  metrics::Values values = measured.fields[index];
  if (metric.change != nullptr)
    for (std::size_t i = 0; i < values.size(); ++i)
      values[i] = metric.change(values[i], rest.fields[index][i]);
  return values;
}

metrics::Reading limit_reading(const metrics::Surface& surface, std::size_t index,
                               std::size_t position, const metrics::Values& values) {
  const Metric& metric = metrics::catalog()[index];
  const metrics::Statistic& statistic = metric.statistics[position];
  const std::span<const double> weights =
      metric.weights == nullptr ? std::span<const double>() : metric.weights(surface);
  const double neutral =
      statistic.aggregate == metrics::Aggregate::Rms ? metric.centre : statistic.neutral;
  return metrics::aggregate(statistic.aggregate, values, weights, neutral);
}

}  // namespace harness
