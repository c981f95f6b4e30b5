#include "metrics/catalog.h"
#include "metrics/elementary.h"
#include "metrics/geometry.h"

namespace metrics {
namespace {

constexpr double kLeastFloor = 2.5e-7;  // radians

// Angle in radians at corner k; NaN where one of its sides has no length.
double corner_angle(const Triangle& face, std::size_t k) {
  const Point& out = face.sides[k];
  const Point back = -face.sides[(k + 2) % 3];
  if (out.squaredNorm() == 0 || back.squaredNorm() == 0) {
    return kUndefined;
  }
  return arc_tangent(face.normal.norm(), out.dot(back));
}

// Of the vertices welded into one the lowest stands for all. A vertex without face is a border.
bool can_have_defect(const Surface& surface, std::size_t v) {
  return surface.welded[v] == v && !surface.border[v];
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  Values angles(surface.rest.size(), 0);
  for (std::size_t f = 0; f < surface.faces.size(); ++f) {
    if (surface.degenerate[f]) {
      continue;
    }
    const Triangle face = triangle(posed.points, surface.faces[f]);
    for (std::size_t k = 0; k < 3; ++k) {
      angles[surface.welded[surface.faces[f][k]]] += corner_angle(face, k);
    }
  }
  values.assign(angles.size(), kUndefined);
  for (std::size_t v = 0; v < values.size(); ++v) {
    if (can_have_defect(surface, v)) {
      values[v] = (2 * kPi - angles[v]) / kDegree;
    }
  }
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  Values reciprocals(surface.rest.size(), 0);
  for (const Edge& edge : surface.edges) {
    const double reciprocal = 1 / (posed.points[edge.b] - posed.points[edge.a]).norm();
    reciprocals[edge.a] += reciprocal;
    reciprocals[edge.b] += reciprocal;
  }
  values.assign(reciprocals.size(), 0);
  for (std::size_t v = 0; v < values.size(); ++v) {
    if (can_have_defect(surface, v)) {
      // Without noise there is none to divide, whatever the edges.
      const double noise = posed.delta > 0 ? 2 * posed.delta * reciprocals[v] : 0;
      values[v] = std::max(noise, kLeastFloor) / kDegree;
    }
  }
}

}  // namespace

Metric defect() {
  return {
      .name = "defect",
      .unit = "deg",
      .summary = "change of what the angles around a vertex lack to a full turn",
      .undefined =
          "on borders, where faces do not form one fan, on vertices without face, where an "
          "edge has no length; of vertices welded into one only the lowest has a value",
      .cannot_see = "bending without stretching, as rolling up a sheet",
      .source =
          "Meyer, Desbrun, Schroeder, Barr 2003, Discrete differential-geometry operators for "
          "triangulated 2-manifolds",
      .domain = Domain::Vertex,
      .statistics = {{.name = "max", .aggregate = Aggregate::Max}},
      .measure = measure,
      .change = [](double posed, double rest) { return std::abs(posed - rest); },
      .floors = floors,
      .undecidable = 30,
  };
}

}  // namespace metrics
