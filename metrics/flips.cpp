#include "metrics/catalog.h"
#include "metrics/geometry.h"

#include <optional>

namespace metrics {
namespace {

using Quaternion = Eigen::Vector4d;  // x, y, z, w

// A face thinner than this many position noises has no normal to speak of.
constexpr double kThinnest = 16;
// Quaternions further apart than this have no mean to speak of.
constexpr double kSmallestDot = 1e-3;

bool has_normal(const Triangle& face, double delta) {
  return !face.collapsed() && !(face.altitude() < kThinnest * delta);
}

// Sum of the rotations of the corners, each turned to the hemisphere of the first; not normalized.
// Every pair has to be near enough, so that it does not matter which corner is the first.
std::optional<Quaternion> mean_rotation(std::span<const Quaternion> carried, const Face& face) {
  const Quaternion& first = carried[face[0]];
  const double second_dot = first.dot(carried[face[1]]);
  const double third_dot = first.dot(carried[face[2]]);
  const Quaternion second = second_dot < 0 ? Quaternion(-carried[face[1]]) : carried[face[1]];
  const Quaternion third = third_dot < 0 ? Quaternion(-carried[face[2]]) : carried[face[2]];
  // A NaN compares false and is undecided as well.
  if (std::abs(second_dot) >= kSmallestDot && std::abs(third_dot) >= kSmallestDot &&
      second.dot(third) >= kSmallestDot) {
    return first + second + third;
  }
  return std::nullopt;
}

// The vector turned, times |q|^2: only its direction is wanted.
Point turned(const Quaternion& q, const Point& vector) {
  const Point axis = q.head<3>();
  const double w = q.w();
  return (w * w - axis.squaredNorm()) * vector + 2 * axis.dot(vector) * axis +
         2 * w * axis.cross(vector);
}

void measure(const Surface& surface, const Posed& posed, Values& values) {
  values.assign(surface.faces.size(), kUndefined);
  if (posed.carried.empty()) {
    return;
  }
  for (std::size_t f = 0; f < values.size(); ++f) {
    const Face& face = surface.faces[f];
    const Triangle now = triangle(posed.points, face);
    const Triangle rest = triangle(surface.rest, face);
    if (!has_normal(now, posed.delta) || !has_normal(rest, posed.delta)) {
      continue;
    }
    if (const auto rotation = mean_rotation(posed.carried, face)) {
      values[f] = turned(*rotation, rest.normal).dot(now.normal) < 0 ? 1 : 0;
    }
  }
}

void compare(const Surface& golden_surface, const Posed& current, const Posed& golden,
             Values& drift) {
  const double delta = std::max(current.delta, golden.delta);
  drift.assign(golden_surface.faces.size(), kUndefined);
  for (std::size_t f = 0; f < drift.size(); ++f) {
    const Triangle now = triangle(current.points, golden_surface.faces[f]);
    const Triangle then = triangle(golden.points, golden_surface.faces[f]);
    if (has_normal(now, delta) && has_normal(then, delta)) {
      drift[f] = now.normal.dot(then.normal) < 0 ? 1 : 0;
    }
  }
}

const std::vector<double>& rest_areas(const Surface& surface) {
  return surface.face_area;
}

}  // namespace

Metric flips() {
  return {
      .name = "flips",
      .unit = "1",
      .summary =
          "1 for a face turned against its rest normal as the joints carry it, else 0; as "
          "drift 1 where its normal turned by more than 90 degrees from the golden's",
      .undefined =
          "on faces without area or with an altitude below 16 delta, posed or at rest, and "
          "where the rotations of the corners have no mean; as limit everywhere on a mesh "
          "without joints",
      .cannot_see =
          "faces squeezed but not turned over, a skin mirrored together with its joints, "
          "parts that pass through one another",
      .source =
          "common practice, no source; held against the angles at which a bent limb starts "
          "to turn over, derived beside the tests",
      .domain = Domain::Face,
      .statistics = {{.name = "count", .aggregate = Aggregate::Count},
                     {.name = "area", .aggregate = Aggregate::Share}},
      .measure = measure,
      .compare = compare,
      .weights = rest_areas,
  };
}

}  // namespace metrics
