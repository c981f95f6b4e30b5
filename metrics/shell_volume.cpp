#include "metrics/geometry.h"
#include "metrics/metric.h"
#include "metrics/volume.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <string>

namespace metrics {
namespace {

constexpr double kWidestCap = 0.25;
constexpr double kFlat = 1e-6;

struct Reason {
  Omission omission;
  const char* words;
};

constexpr std::array kReasons{
    Reason{Omission::NonManifold, "with faces turned both ways or more than two on an edge"},
    Reason{Omission::Unclosable, "with borders that meet in a vertex"},
    Reason{Omission::WideOpening, "with openings wider than a quarter of the faces' area"},
    Reason{Omission::Flat, "with no volume at rest"}};

// Tetrahedra are taken about the middle of the skin: about a far origin they would cancel digits.
Point middle(std::span<const Point> points) {
  if (points.empty()) {
    return Point::Zero();
  }
  Point low = points[0];
  Point high = points[0];
  for (const Point& p : points) {
    low = low.cwiseMin(p);
    high = high.cwiseMax(p);
  }
  return low + (high - low) / 2;
}

Point mean(std::span<const Point> points, const Loop& loop) {
  Point sum = Point::Zero();
  for (const Index i : loop) {
    sum += points[i];
  }
  return sum / static_cast<double>(loop.size());
}

// Calls visit(a, b, tip) for every triangle of the fan that closes a loop.
template <class Visit>
void for_each_cap(std::span<const Point> points, const Loop& loop, Visit visit) {
  const Point tip = mean(points, loop);
  for (std::size_t k = 0; k < loop.size(); ++k) {
    visit(points[loop[k]], points[loop[(k + 1) % loop.size()]], tip);
  }
}

double volume_inside(const Surface& surface, const Shell& shell, std::span<const Point> points,
                     const Point& centre) {
  std::vector<double> terms;
  terms.reserve(shell.faces.size());
  const auto add = [&](const Point& a, const Point& b, const Point& c) {
    terms.push_back((a - centre).dot((b - centre).cross(c - centre)));
  };
  for (const Index f : shell.faces) {
    const auto& [i, j, k] = surface.faces[f];
    add(points[i], points[j], points[k]);
  }
  for (const Loop& loop : shell.loops) {
    for_each_cap(points, loop, add);
  }
  return fixed_sum(terms) / 6;
}

ShellVolume shell_at_rest(const Surface& surface, const Shell& shell, const Point& centre) {
  std::vector<double> areas;
  areas.reserve(shell.faces.size());
  for (const Index f : shell.faces) {
    areas.push_back(surface.face_area[f]);
  }
  ShellVolume result{.area = fixed_sum(areas)};
  if (!shell.manifold || !shell.closable) {
    result.omission = shell.manifold ? Omission::Unclosable : Omission::NonManifold;
    return result;
  }
  areas.clear();
  for (const Loop& loop : shell.loops) {
    for_each_cap(surface.rest, loop, [&](const Point& a, const Point& b, const Point& tip) {
      areas.push_back((a - tip).cross(b - tip).norm() / 2);
    });
  }
  result.cap_area = fixed_sum(areas);
  result.volume = volume_inside(surface, shell, surface.rest, centre);
  if (result.cap_area > kWidestCap * result.area) {
    result.omission = Omission::WideOpening;
  } else if (!(std::abs(result.volume) > kFlat * result.area * std::sqrt(result.area))) {
    result.omission = Omission::Flat;
  }
  return result;
}

}  // namespace

std::vector<ShellVolume> shell_volumes(const Surface& surface) {
  const Point centre = middle(surface.rest);
  std::vector<ShellVolume> result;
  result.reserve(surface.shells.size());
  for (const Shell& shell : surface.shells) {
    result.push_back(shell_at_rest(surface, shell, centre));
  }
  return result;
}

std::vector<bool> measured_shells(const Surface& surface) {
  std::vector<bool> result;
  for (const ShellVolume& shell : shell_volumes(surface)) {
    result.push_back(shell.omission == Omission::None);
  }
  return result;
}

double rest_volume(std::span<const ShellVolume> shells) {
  double volume = 0;
  double magnitude = 0;
  for (const ShellVolume& shell : shells) {
    if (shell.omission == Omission::None) {
      volume += shell.volume;
      magnitude += std::abs(shell.volume);
    }
  }
  return std::abs(volume) > kFlat * magnitude ? volume : kUndefined;
}

double enclosed_volume(const Surface& surface, std::span<const ShellVolume> shells,
                       std::span<const Point> points) {
  const Point centre = middle(points);
  double sum = 0;
  for (std::size_t s = 0; s < shells.size(); ++s) {
    if (shells[s].omission == Omission::None) {
      sum += volume_inside(surface, surface.shells[s], points, centre);
    }
  }
  return sum;
}

double enclosed_volume(const Surface& surface, std::span<const Point> points) {
  return enclosed_volume(surface, shell_volumes(surface), points);
}

std::string volume_note(const Surface& surface) {
  const std::vector<ShellVolume> shells = shell_volumes(surface);
  std::size_t left_out = 0;
  std::string list;
  for (const Reason& reason : kReasons) {
    const auto has_reason = [&](const ShellVolume& s) { return s.omission == reason.omission; };
    const auto count = std::count_if(shells.begin(), shells.end(), has_reason);
    if (count == 0) {
      continue;
    }
    const auto first = std::find_if(shells.begin(), shells.end(), has_reason) - shells.begin();
    const Index face = surface.shells[static_cast<std::size_t>(first)].faces[0];
    list += (list.empty() ? "" : ", ") + std::to_string(count) + " " + reason.words +
            " (first at face " + std::to_string(face) + ")";
    left_out += static_cast<std::size_t>(count);
  }
  const bool undefined = std::isnan(rest_volume(shells));
  std::string note;
  if (shells.empty()) {
    note = "no face spans three separate vertices";
  } else if (left_out > 0) {
    note = std::to_string(left_out) + " of " + std::to_string(shells.size()) +
           " shells left out of volume: " + list;
  } else if (undefined) {
    note = "the volumes of the " + std::to_string(shells.size()) + " shells cancel at rest";
  }
  return note + (undefined ? "; volume.change is undefined" : "");
}

}  // namespace metrics
