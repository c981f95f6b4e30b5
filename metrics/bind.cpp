#include "metrics/catalog.h"
#include "metrics/geometry.h"

namespace metrics {
namespace {

// Distance a vertex is carried by the weighted products of its joints, in units of the file before
// bind_scale. A vertex without weight is carried nowhere; one with a singular bind gives NaN.
double residual(const Binding& binding, std::size_t v) {
  const Point& u = binding.positions[v];
  Point carried = Point::Zero();
  bool owned = false;
  for (Index i = binding.first[v]; i < binding.first[v + 1]; ++i) {
    if (binding.weight[i] != 0) {
      const Eigen::Matrix<double, 3, 4>& product = binding.bind_product[binding.joint[i]];
      carried += binding.weight[i] * (product.leftCols<3>() * u + product.col(3));
      owned = true;
    }
  }
  return owned ? (carried - u).norm() : 0;
}

std::vector<Reading> measure(const Surface& surface, const Binding& binding) {
  const double unit = unit_length(surface);
  Values values(binding.positions.size());
  for (std::size_t v = 0; v < values.size(); ++v) {
    values[v] = residual(binding, v) * binding.bind_scale[v] / unit;
  }
  return {aggregate(Aggregate::Max, values, {}, 0)};
}

}  // namespace

AssetMetric bind() {
  return {
      .name = "bind",
      .unit = "D",
      .summary =
          "distance from the rest shape when every joint stands at the inverse of its "
          "inverse bind and the skin is blended linearly",
      .undefined = "on vertices with a weight on a joint whose inverse bind is singular",
      .cannot_see = "an inverse bind that is wrong but can be inverted: that shows as drift",
      .source = "common practice, no source",
      .statistics = {{.name = "residual", .aggregate = Aggregate::Max, .drift = false}},
      .always = {1e-4},
      .measure = measure,
  };
}

}  // namespace metrics
