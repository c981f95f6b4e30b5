#include "metrics/surface.h"

#include "metrics/disjoint_sets.h"
#include "metrics/weld.h"

#include <Eigen/Geometry>

#include <algorithm>
#include <cmath>
#include <tuple>
#include <utility>

namespace metrics {
namespace {

// A side of a face between welded vertices a < b; `forward`: the face walks it from a to b.
struct HalfEdge {
  Index a = 0, b = 0, face = 0;
  bool forward = true;
};

bool same_ends(const HalfEdge& one, const HalfEdge& other) {
  return one.a == other.a && one.b == other.b;
}

double bounding_diagonal(const Points& points) {
  if (points.empty()) {
    return 0;
  }
  Point low = points[0];
  Point high = points[0];
  for (const Point& p : points) {
    low = low.cwiseMin(p);
    high = high.cwiseMax(p);
  }
  // Scaled, so that squares of very large or small extents stay in range.
  const Point extent = high - low;
  const double largest = extent.maxCoeff();
  return largest > 0 && std::isfinite(largest) ? largest * (extent / largest).norm() : largest;
}

void fill_twins(Surface& surface) {
  const auto count = static_cast<Index>(surface.rest.size());
  std::vector<Index> size(count, 0);
  for (const Index lowest : surface.welded) {
    ++size[lowest];
  }
  std::vector<Index> group(count, kNone);
  for (Index i = 0; i < count; ++i) {
    const Index lowest = surface.welded[i];
    surface.welded_count += lowest == i ? 1 : 0;
    if (size[lowest] < 2) {
      continue;
    }
    if (lowest == i) {
      group[i] = static_cast<Index>(surface.twins.size());
      surface.twins.emplace_back();
    }
    surface.twins[group[lowest]].push_back(i);
  }
}

// All sides of all faces whose ends are two different welded vertices, degenerate faces included.
std::vector<HalfEdge> sorted_half_edges(const Surface& surface) {
  std::vector<HalfEdge> result;
  result.reserve(3 * surface.faces.size());
  for (std::size_t f = 0; f < surface.faces.size(); ++f) {
    for (std::size_t corner = 0; corner < 3; ++corner) {
      const Index from = surface.welded[surface.faces[f][corner]];
      const Index to = surface.welded[surface.faces[f][(corner + 1) % 3]];
      if (from != to) {
        result.push_back(
            {std::min(from, to), std::max(from, to), static_cast<Index>(f), from < to});
      }
    }
  }
  std::sort(result.begin(), result.end(), [](const HalfEdge& x, const HalfEdge& y) {
    return std::tie(x.a, x.b, x.face, x.forward) < std::tie(y.a, y.b, y.face, y.forward);
  });
  return result;
}

std::vector<std::array<Index, 2>> sorted_cuts(const Surface& surface,
                                              std::span<const std::array<Index, 2>> diagonals) {
  std::vector<std::array<Index, 2>> result;
  result.reserve(diagonals.size());
  for (const auto& [i, j] : diagonals) {
    const auto [a, b] = std::minmax({surface.welded[i], surface.welded[j]});
    result.push_back({a, b});
  }
  std::sort(result.begin(), result.end());
  return result;
}

// One edge of a run of half-edges with the same ends; unites the faces on it.
void add_edge(Surface& surface, std::span<const HalfEdge> run, std::size_t cuts,
              DisjointSets& pieces) {
  Edge edge{.a = run[0].a, .b = run[0].b};
  std::array<bool, 2> forward{};
  for (const HalfEdge& half : run) {
    if (surface.degenerate[half.face]) {
      continue;
    }
    if (edge.face_count < 2) {
      edge.faces[edge.face_count] = half.face;
      forward[edge.face_count] = half.forward;
    }
    pieces.unite(edge.faces[0], half.face);
    ++edge.face_count;
  }
  if (edge.face_count == 0) {
    return;
  }
  edge.consistent = edge.face_count == 1 || (edge.face_count == 2 && forward[0] != forward[1]);
  // A cut makes two sides of two faces; any further side is one of a polygon of the asset. Sides of
  // degenerate faces count: they may be what is left of a polygon's own edge.
  edge.diagonal = run.size() <= 2 * cuts;
  surface.edges.push_back(edge);
  surface.edge_length.push_back((surface.rest[edge.a] - surface.rest[edge.b]).norm());
}

void fill_edges(Surface& surface, const std::vector<HalfEdge>& halves,
                const std::vector<std::array<Index, 2>>& cuts, DisjointSets& pieces) {
  auto cut = cuts.begin();
  for (auto first = halves.begin(); first != halves.end();) {
    const auto last = std::find_if_not(
        first, halves.end(), [&](const HalfEdge& half) { return same_ends(half, *first); });
    const std::array<Index, 2> ends{first->a, first->b};
    cut =
        std::find_if_not(cut, cuts.end(), [&](const std::array<Index, 2>& c) { return c < ends; });
    const auto cut_end =
        std::find_if_not(cut, cuts.end(), [&](const std::array<Index, 2>& c) { return c == ends; });
    add_edge(surface, {first, last}, static_cast<std::size_t>(cut_end - cut), pieces);
    first = last;
  }
}

Index corner_of(const Surface& surface, Index face, Index vertex) {
  const Face& corners = surface.faces[face];
  const Index at = surface.welded[corners[0]] == vertex   ? 0
                   : surface.welded[corners[1]] == vertex ? 1
                                                          : 2;
  return 3 * face + at;
}

void fill_border(Surface& surface) {
  surface.border.assign(surface.rest.size(), false);
  // Corners of the faces around a vertex, united across edges: one set is one fan.
  DisjointSets corners(3 * surface.faces.size());
  for (const Edge& edge : surface.edges) {
    for (const Index vertex : {edge.a, edge.b}) {
      if (edge.face_count == 2) {
        corners.unite(corner_of(surface, edge.faces[0], vertex),
                      corner_of(surface, edge.faces[1], vertex));
      } else {
        surface.border[vertex] = true;
      }
    }
  }
  std::vector<Index> fan(surface.rest.size(), kNone);
  for (Index f = 0; f < surface.faces.size(); ++f) {
    for (Index corner = 0; corner < 3 && !surface.degenerate[f]; ++corner) {
      const Index vertex = surface.welded[surface.faces[f][corner]];
      const Index root = corners.root(3 * f + corner);
      if (fan[vertex] == kNone) {
        fan[vertex] = root;
      } else if (fan[vertex] != root) {
        surface.border[vertex] = true;
      }
    }
  }
  for (std::size_t i = 0; i < surface.rest.size(); ++i) {
    const Index lowest = surface.welded[i];
    surface.border[i] = surface.border[lowest] || fan[lowest] == kNone;
  }
}

using Step = std::pair<Index, Index>;  // from, to along a hole

// Joins the steps of one shell into loops; false if some are on no loop that passes its vertices
// once. Where several steps leave a vertex any pairing would be a guess, so none is made.
bool join_loops(std::vector<Step>& steps, std::vector<Loop>& loops) {
  std::sort(steps.begin(), steps.end());
  std::vector<bool> walked(steps.size(), false);
  const auto only_step_from = [&](Index vertex) {
    const auto at = std::lower_bound(steps.begin(), steps.end(), Step{vertex, 0});
    const bool one = at != steps.end() && at->first == vertex &&
                     (at + 1 == steps.end() || (at + 1)->first != vertex);
    return one ? static_cast<std::size_t>(at - steps.begin()) : steps.size();
  };
  bool closed = true;
  for (std::size_t first = 0; first < steps.size(); ++first) {
    if (walked[first]) {
      continue;
    }
    Loop loop;
    std::size_t at = only_step_from(steps[first].first);
    while (at < steps.size() && !walked[at]) {
      walked[at] = true;
      loop.push_back(steps[at].first);
      at = only_step_from(steps[at].second);
    }
    if (at == first && !loop.empty()) {
      loops.push_back(std::move(loop));
    } else {
      closed = false;
    }
  }
  return closed;
}

void fill_shells(Surface& surface, DisjointSets& pieces) {
  std::vector<Index> shell_of(surface.faces.size(), kNone);  // by the lowest face of a piece
  for (Index f = 0; f < surface.faces.size(); ++f) {
    if (surface.degenerate[f]) {
      continue;
    }
    Index& shell = shell_of[pieces.root(f)];
    if (shell == kNone) {
      shell = static_cast<Index>(surface.shells.size());
      surface.shells.emplace_back();
    }
    surface.shells[shell].faces.push_back(f);
  }
  std::vector<std::vector<Step>> steps(surface.shells.size());
  for (const Edge& edge : surface.edges) {
    const Index number = shell_of[pieces.root(edge.faces[0])];
    Shell& shell = surface.shells[number];
    shell.manifold = shell.manifold && edge.consistent;
    if (edge.face_count == 1) {
      const Index corner = corner_of(surface, edge.faces[0], edge.a) % 3;
      const Face& face = surface.faces[edge.faces[0]];
      const bool forward = surface.welded[face[(corner + 1) % 3]] == edge.b;
      steps[number].push_back(forward ? Step{edge.b, edge.a} : Step{edge.a, edge.b});
    }
  }
  for (std::size_t i = 0; i < steps.size(); ++i) {
    surface.shells[i].closable = join_loops(steps[i], surface.shells[i].loops);
  }
}

}  // namespace

Surface make_surface(Points rest, std::vector<Face> faces,
                     std::span<const std::array<Index, 2>> diagonals, double weld) {
  Surface surface;
  surface.rest = std::move(rest);
  surface.faces = std::move(faces);
  surface.weld = weld;
  surface.diagonal = bounding_diagonal(surface.rest);
  surface.welded = weld_points(surface.rest, surface.diagonal, weld);
  fill_twins(surface);
  for (const auto& [i, j, k] : surface.faces) {
    const Index a = surface.welded[i];
    const Index b = surface.welded[j];
    const Index c = surface.welded[k];
    const Point& p = surface.rest[i];
    surface.degenerate.push_back(a == b || b == c || c == a);
    surface.face_area.push_back((surface.rest[j] - p).cross(surface.rest[k] - p).norm() / 2);
  }
  DisjointSets pieces(surface.faces.size());
  fill_edges(surface, sorted_half_edges(surface), sorted_cuts(surface, diagonals), pieces);
  fill_border(surface);
  fill_shells(surface, pieces);
  return surface;
}

bool same_topology(const Surface& a, const Surface& b) {
  return a.faces == b.faces && a.welded == b.welded;  // the edges follow from these
}

}  // namespace metrics
