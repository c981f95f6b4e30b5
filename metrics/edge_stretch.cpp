#include "metrics/catalog.h"
#include "metrics/geometry.h"

namespace metrics {
namespace {

double stretch(const Surface& surface, const Posed& posed, const std::array<Index, 2>& ends) {
  const auto [i, j] = ends;
  const double rest = (surface.rest[j] - surface.rest[i]).norm();
  return rest > 0 ? (posed.points[j] - posed.points[i]).norm() / rest : kUndefined;
}

// The file vertices that a face has at the ends of an edge, ascending.
std::array<Index, 2> ends_in(const Surface& surface, const Edge& edge, Index face) {
  const Face& corners = surface.faces[face];
  const std::size_t k = side_on(surface, edge, face);
  const auto [low, high] = std::minmax({corners[k], corners[(k + 1) % 3]});
  return {low, high};
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), kUndefined);
  for (std::size_t e = 0; e < values.size(); ++e) {
    const Edge& edge = surface.edges[e];
    if (edge.diagonal) {
      continue;
    }
    const auto ends = ends_in(surface, edge, edge.faces[0]);
    values[e] = stretch(surface, posed, ends);
    if (edge.face_count > 1) {
      // On a seam each face has vertices of its own. Any one of them would do where the seam holds;
      // where it opens the mean sees them all and does not depend on the numbering.
      const auto twins = ends_in(surface, edge, edge.faces[1]);
      if (twins != ends) {
        values[e] = (values[e] + stretch(surface, posed, twins)) / 2;
      }
    }
  }
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), 0);
  for (std::size_t e = 0; e < values.size(); ++e) {
    if (surface.edge_length[e] > 0 && !surface.edges[e].diagonal) {
      values[e] = 2 * posed.delta / surface.edge_length[e];
    }
  }
}

const std::vector<double>& rest_lengths(const Surface& surface) {
  return surface.edge_length;
}

}  // namespace

Metric edge_stretch() {
  return {
      .name = "edge_stretch",
      .unit = "1",
      .summary =
          "length of an edge over its length at rest; .rms is that of the difference from "
          "1, weighted by length at rest",
      .undefined = "on edges of no length at rest and on diagonals of fanned polygons",
      .cannot_see = "bending without stretching, rigid motion of a whole part, mirroring",
      .source =
          "engineering strain, elementary; differences per edge between moving meshes: Vasa "
          "and Skala 2011 (from memory)",
      .domain = Domain::Edge,
      .statistics = {{.name = "max", .aggregate = Aggregate::Max, .neutral = 1},
                     {.name = "min", .aggregate = Aggregate::Min, .neutral = 1, .drift = false},
                     {.name = "p99", .aggregate = Aggregate::P99, .neutral = 1},
                     {.name = "rms", .aggregate = Aggregate::Rms}},
      .measure = measure,
      .floors = floors,
      .undecidable = 0.5,
      .weights = rest_lengths,
      .centre = 1,
  };
}

}  // namespace metrics
