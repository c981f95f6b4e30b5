#include "metrics/volume.h"

#include "metrics/catalog.h"

#include <algorithm>
#include <cmath>

namespace metrics {
namespace {

constexpr double kLowestFloor = 2.5e-7;

void measure(const Surface& surface, const Posed& posed, Values& values) {
  const std::vector<ShellVolume> shells = shell_volumes(surface);
  const double rest = rest_volume(shells);
  values.assign(1, (enclosed_volume(surface, shells, posed.points) - rest) / std::abs(rest));
}

// Independent rounding of n vertices, each with its share of the area, moves the volume by
// delta * area / sqrt(n).
void floors(const Surface& surface, const Posed& posed, Values& values) {
  const std::vector<ShellVolume> shells = shell_volumes(surface);
  std::vector<bool> used(surface.rest.size(), false);
  double area = 0;
  for (std::size_t s = 0; s < shells.size(); ++s) {
    if (shells[s].omission != Omission::None) {
      continue;
    }
    area += shells[s].area;
    for (const Index f : surface.shells[s].faces) {
      for (const Index i : surface.faces[f]) {
        used[surface.welded[i]] = true;
      }
    }
  }
  const auto vertices = static_cast<double>(std::count(used.begin(), used.end(), true));
  const double noise = posed.delta * area / (std::sqrt(vertices) * std::abs(rest_volume(shells)));
  values.assign(1, noise > kLowestFloor ? noise : kLowestFloor);
}

}  // namespace

Metric volume() {
  return {
      .name = "volume",
      .unit = "1",
      .summary =
          "change of the enclosed volume over the volume at rest, positive for a gain; "
          "openings are capped by fans to the mean of their border",
      .undefined =
          "where no shell is left or the shells cancel: left out are those with faces "
          "turned both ways, more than two faces on an edge or borders that meet in a "
          "vertex, with caps above a quarter of their area, or without volume at rest",
      .cannot_see =
          "faults that add as much as they take, sliding along the surface, a single "
          "vertex of a dense skin; weak on small changes of weights",
      .source =
          "signed tetrahedra: Lien and Kajiya 1984, Zhang and Chen 2001 (from memory); caps: "
          "common practice, no source",
      .domain = Domain::Frame,
      .statistics = {{.name = "change", .aggregate = Aggregate::Sum}},
      .measure = measure,
      .floors = floors,
  };
}

}  // namespace metrics
