#pragma once

#include <Eigen/Core>

#include <array>
#include <cstdint>
#include <span>
#include <vector>

namespace metrics {

/// What a value belongs to. (Declared before the type Face, which it would otherwise shadow.)
enum class Domain { Frame, Vertex, Edge, Face, Asset };

using Point = Eigen::Vector3d;
using Points = std::vector<Point>;
using Index = std::uint32_t;
using Face = std::array<Index, 3>;
inline constexpr Index kNone = ~Index{0};

/// Edge of the welded surface, between the lowest file vertices of its two ends, a < b.
struct Edge {
  Index a = 0, b = 0;
  std::array<Index, 2> faces{kNone, kNone};  ///< the first two faces on it, by index
  Index face_count = 0;
  bool consistent = true;  ///< two faces pass it in opposite directions; false beyond two faces
  bool diagonal = false;   ///< made by fanning a polygon: no edge of the asset
};

/// A closed walk along a hole of the surface, as welded vertices, against the direction of its
/// faces.
using Loop = std::vector<Index>;

/// Edge-connected piece of the welded surface.
struct Shell {
  std::vector<Index> faces;
  std::vector<Loop> loops;
  bool manifold = true;  ///< no edge with more than two faces, all faces turned the same way
  bool closable = true;  ///< every border edge lies on a loop that passes each vertex once
};

/// What is derived once from a rest shape: welded topology and rest sizes. Positions stay those of
/// the file's vertices; only connectivity is welded.
struct Surface {
  Points rest;              ///< per file vertex, file units
  std::vector<Face> faces;  ///< per file face, file vertices
  double diagonal = 0;      ///< D: diagonal of the bounding box of `rest`
  double weld = 0;          ///< fraction of D below which vertices were welded

  std::vector<Index> welded;              ///< per file vertex: the lowest vertex it is welded to
  std::vector<std::vector<Index>> twins;  ///< groups of two and more vertices welded, ascending
  Index welded_count = 0;                 ///< number of different values in `welded`
  std::vector<bool> degenerate;           ///< per face: two corners welded; on no edge, in no shell
  std::vector<Edge> edges;                ///< sorted by (a, b)
  std::vector<double> edge_length;        ///< per edge, at rest
  std::vector<double> face_area;          ///< per face, at rest
  /// Per file vertex, twins alike: its faces do not form exactly one closed fan (or it has none).
  std::vector<bool> border;
  std::vector<Shell> shells;  ///< by lowest face
};

/// Derives a surface. `diagonals`: pairs of file vertices joined by fanning polygons, one per cut.
/// Precondition: every index < rest.size(); all coordinates finite; fewer than 2^32 / 3 faces.
/// `weld`: fraction of D; vertices nearer than that are one (linked transitively), 0: equal only.
Surface make_surface(Points rest, std::vector<Face> faces,
                     std::span<const std::array<Index, 2>> diagonals = {}, double weld = 1e-7);

/// Whether the elements of two surfaces correspond one to one: same faces, welding and edges.
bool same_topology(const Surface& a, const Surface& b);

}  // namespace metrics
