#include "metrics/catalog.h"
#include "metrics/geometry.h"

namespace metrics {
namespace {

// Fraction of D: further apart at rest, two vertices are no twins even if the suite welds them.
constexpr double kCoincident = 1e-7;

// Largest distance between any two of the group that coincide at rest.
double gap(const Surface& surface, const Posed& posed, const std::vector<Index>& group) {
  const Point& first = posed.points[group.front()];
  double reach = 0;
  for (const Index v : group) {
    reach = std::max(reach, (posed.points[v] - first).norm());
  }
  const double coincident = kCoincident * surface.diagonal;
  double largest = 0;
  for (std::size_t i = 0; i < group.size(); ++i) {
    const Index a = group[i];
    // No partner of a is further from it; spares most pairs of a large group that moves as one.
    if ((posed.points[a] - first).norm() + reach <= largest) {
      continue;
    }
    for (std::size_t j = i + 1; j < group.size(); ++j) {
      const Index b = group[j];
      const double distance = (posed.points[b] - posed.points[a]).norm();
      if (distance > largest && (surface.rest[b] - surface.rest[a]).norm() <= coincident) {
        largest = distance;
      }
    }
  }
  return largest;
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  const double unit = unit_length(surface);
  values.assign(surface.rest.size(), 0);
  for (const std::vector<Index>& group : surface.twins) {
    values[group.front()] = gap(surface, posed, group) / unit;
  }
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.rest.size(), 2 * posed.delta / unit_length(surface));
}

}  // namespace

Metric seam_gap() {
  return {
      .name = "seam_gap",
      .unit = "D",
      .summary =
          "largest distance between any two twins that coincide at rest, told at the lowest "
          "vertex of their group; 0 elsewhere",
      .undefined = "on twins of a rest shape without extent (D = 0)",
      .cannot_see =
          "a seam that stays closed in the wrong place; vertices welded by a wide `weld` "
          "but further apart than 1e-7 D at rest",
      .source = "common practice, no source",
      .domain = Domain::Vertex,
      .statistics = {{.name = "max", .aggregate = Aggregate::Max}},
      .measure = measure,
      .floors = floors,
  };
}

}  // namespace metrics
