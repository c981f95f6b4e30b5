#include "metrics/catalog.h"
#include "metrics/elementary.h"
#include "metrics/geometry.h"

#include <limits>

namespace metrics {
namespace {

bool has_angle(const Edge& edge) {
  return edge.face_count == 2 && edge.consistent;
}

std::vector<Triangle> triangles(const Surface& surface, const Posed& posed) {
  std::vector<Triangle> result;
  result.reserve(surface.faces.size());
  for (const Face& face : surface.faces) {
    result.push_back(triangle(posed.points, face));
  }
  return result;
}

// Calls visit(edge, first face, its side, second face, its side) for every edge with an angle.
template <typename Visit>
void for_each_hinge(const Surface& surface, const Posed& posed, Visit visit) {
  const std::vector<Triangle> faces = triangles(surface, posed);
  for (std::size_t e = 0; e < surface.edges.size(); ++e) {
    const Edge& edge = surface.edges[e];
    if (has_angle(edge)) {
      const auto [first, second] = edge.faces;
      visit(e, faces[first], faces[first].sides[side_on(surface, edge, first)], faces[second],
            faces[second].sides[side_on(surface, edge, second)]);
    }
  }
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), kUndefined);
  for_each_hinge(surface, posed,
                 [&](std::size_t e, const Triangle& first, const Point& first_side,
                     const Triangle& second, const Point& second_side) {
                   if (!first.collapsed() && !second.collapsed()) {
                     // The second face runs the other way. On a seam that has opened the two sides
                     // differ, and their mean does not depend on which face comes first.
                     const Point along = first_side - second_side;
                     const double sine_part = first.normal.cross(second.normal).dot(along);
                     const double cosine_part = first.normal.dot(second.normal) * along.norm();
                     values[e] = arc_tangent(sine_part, cosine_part) / kDegree;
                   }
                 });
}

// Angle in radians by which the noise may tilt a face about one of its sides.
double tilt(const Triangle& face, const Point& side, double delta) {
  const double area = face.normal.norm();
  return area > 0 ? delta * side.norm() / area : std::numeric_limits<double>::infinity();
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), 0);
  for_each_hinge(surface, posed,
                 [&](std::size_t e, const Triangle& first, const Point& first_side,
                     const Triangle& second, const Point& second_side) {
                   values[e] = (tilt(first, first_side, posed.delta) +
                                tilt(second, second_side, posed.delta)) /
                               kDegree;
                 });
}

// Both angles lie within half a turn of 0.
double angle_between(double a, double b) {
  const double difference = std::abs(a - b);
  return difference > 180 ? 360 - difference : difference;
}

const std::vector<double>& rest_lengths(const Surface& surface) {
  return surface.edge_length;
}

}  // namespace

Metric dihedral() {
  return {
      .name = "dihedral",
      .unit = "deg",
      .summary =
          "change of the angle between the normals of the two faces on an edge, convex "
          "positive; .rms is weighted by length at rest",
      .undefined =
          "on edges of other than two faces, between faces turned in opposite ways and at "
          "faces without area, posed or at rest",
      .cannot_see = "stretching within a flat part, rigid motion",
      .source =
          "Grinspun, Hirani, Desbrun, Schroeder 2003, Discrete Shells (from memory); as "
          "distance between meshes: Vasa and Rus 2012, Computer Graphics Forum 31(5)",
      .domain = Domain::Edge,
      .statistics = {{.name = "max", .aggregate = Aggregate::Max},
                     {.name = "rms", .aggregate = Aggregate::Rms}},
      .measure = measure,
      .change = angle_between,
      .difference = angle_between,
      .floors = floors,
      .undecidable = 30,
      .weights = rest_lengths,
  };
}

}  // namespace metrics
