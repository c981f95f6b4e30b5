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

// A face on an edge, and which of its sides the edge is.
struct Wing {
  const Triangle& face;
  std::size_t side;

  const Point& along() const { return face.sides[side]; }
};

// Calls visit(edge, first wing, second wing) for every edge with an angle.
template <typename Visit>
void for_each_hinge(const Surface& surface, const Posed& posed, Visit visit) {
  const std::vector<Triangle> faces = triangles(surface, posed);
  for (std::size_t e = 0; e < surface.edges.size(); ++e) {
    const Edge& edge = surface.edges[e];
    if (has_angle(edge)) {
      const auto [first, second] = edge.faces;
      visit(e, Wing{faces[first], side_on(surface, edge, first)},
            Wing{faces[second], side_on(surface, edge, second)});
    }
  }
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), kUndefined);
  for_each_hinge(surface, posed, [&](std::size_t e, const Wing& first, const Wing& second) {
    if (!first.face.collapsed() && !second.face.collapsed()) {
      // The second face runs the other way. On a seam that has opened the two sides differ, and
      // their mean does not depend on which face comes first.
      const Point along = first.along() - second.along();
      const Point& n = first.face.normal;
      const Point& m = second.face.normal;
      values[e] = arc_tangent(n.cross(m).dot(along), n.dot(m) * along.norm()) / kDegree;
    }
  });
}

// Angle in radians by which the noise may tilt a face about one of its sides: delta over the
// altitude h on that side, times |t| + |1 - t| with t the place along the side where h stands. The
// angle's derivatives by the ends of the side are t / h and (1 - t) / h; h stands beyond the ends
// where a side is short and the face leans over.
double tilt(const Wing& wing, double delta) {
  const double area = wing.face.normal.norm();
  if (!(area > 0)) {
    return std::numeric_limits<double>::infinity();
  }
  const Point& side = wing.along();
  const Point& next = wing.face.sides[(wing.side + 1) % 3];
  const double lean = next.dot(side);  // (t - 1) |side|^2
  const double length = side.norm();
  const double square = length * length;
  return delta * (std::abs(lean + square) + std::abs(lean)) / (length * area);
}

void floors(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.edges.size(), 0);
  for_each_hinge(surface, posed, [&](std::size_t e, const Wing& first, const Wing& second) {
    values[e] = (tilt(first, posed.delta) + tilt(second, posed.delta)) / kDegree;
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
