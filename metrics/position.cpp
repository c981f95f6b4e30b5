#include "metrics/catalog.h"
#include "metrics/geometry.h"

namespace metrics {
namespace {

void compare(const Surface& golden_surface, const Posed& current, const Posed& golden,
             Values& drift) {
  const double unit = unit_length(golden_surface);
  drift.resize(golden.points.size());
  for (std::size_t v = 0; v < drift.size(); ++v) {
    drift[v] = (current.points[v] - golden.points[v]).norm() / unit;
  }
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(posed.points.size(), posed.delta / unit_length(surface));
}

}  // namespace

Metric position() {
  return {
      .name = "position",
      .unit = "D",
      .summary = "distance of a vertex from its place in the golden",
      .undefined = "everywhere on a rest shape without extent (D = 0)",
      .cannot_see =
          "whether a pose is right: it exists only against a golden; .p99 and .rms are "
          "blind to a fault of a few vertices",
      .source = "common practice, no source",
      .domain = Domain::Vertex,
      .statistics = {{.name = "max", .aggregate = Aggregate::Max, .limit = false},
                     {.name = "p99", .aggregate = Aggregate::P99, .limit = false},
                     {.name = "rms", .aggregate = Aggregate::Rms, .limit = false}},
      .compare = compare,
      .floors = floors,
  };
}

}  // namespace metrics
