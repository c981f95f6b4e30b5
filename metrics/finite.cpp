#include "metrics/catalog.h"

#include <cmath>

namespace metrics {
namespace {

void measure(const Surface& /*surface*/, const Posed& posed, Values& values) {
  std::size_t bad = 0;
  for (const Point& point : posed.points) {
    for (int axis = 0; axis < 3; ++axis) {
      bad += std::isfinite(point[axis]) ? 0U : 1U;
    }
  }
  values.assign(1, static_cast<double>(bad));
}

void compare(const Surface& /*golden_surface*/, const Posed& current, const Posed& golden,
             Values& drift) {
  std::size_t different = 0;
  for (std::size_t v = 0; v < golden.points.size(); ++v) {
    for (int axis = 0; axis < 3; ++axis) {
      const bool now = std::isfinite(current.points[v][axis]);
      const bool then = std::isfinite(golden.points[v][axis]);
      different += now == then ? 0U : 1U;
    }
  }
  drift.assign(1, static_cast<double>(different));
}

}  // namespace

Metric finite() {
  return {
      .name = "finite",
      .unit = "count",
      .summary =
          "coordinates that are no finite number; as drift those finite in only one of skin "
          "and golden. All other measurements need finite points",
      .undefined = "nowhere",
      .cannot_see = "a finite coordinate in the wrong place, however far",
      .source = "common practice, no source",
      .domain = Domain::Frame,
      .statistics = {{.name = "bad", .aggregate = Aggregate::Sum}},
      .measure = measure,
      .compare = compare,
  };
}

}  // namespace metrics
