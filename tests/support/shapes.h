#pragma once

#include "metrics/surface.h"

#include <Eigen/Core>

#include <cstdint>
#include <vector>

namespace tests {

using metrics::Face;
using metrics::Index;
using metrics::Point;
using metrics::Points;

/// A triangle mesh; closed ones are turned outwards.
struct Shape {
  Points points;
  std::vector<Face> faces;
};

/// How the quads of a grid are cut: by the parity of row + column, or all the same way.
enum class Diagonals { Alternating, Uniform };
enum class Ends { Open, Capped };

/// Corner tetrahedron: origin and the three unit vectors.
Shape tetra();

/// Cube [0, edge]^3 of 8 vertices and 12 faces; face f is half f % 2 of side f / 2.
Shape cube(double edge = 1);

/// The same cube with 4 vertices of its own on each side, as an asset with hard edges has it.
Shape split_cube(double edge = 1);

/// Radius 1, 12 vertices, 20 faces.
Shape icosahedron();

/// The icosahedron, `levels` times subdivided at the midpoints and normalized: 20 * 4^levels faces.
Shape icosphere(int levels);

/// Around z, `rings` * `sides` vertices: ring i at angle 2 pi i / rings, vertex i * sides + j.
Shape torus(double big_radius, double small_radius, int rings, int sides,
            Diagonals diagonals = Diagonals::Alternating);

struct TubeOptions {
  int rings = 2;   ///< of vertices, from z = -length / 2 to length / 2
  int sides = 16;  ///< vertices of a ring; vertex ring * sides + side at angle 2 pi side / sides
  double radius = 1;
  double length = 2;
  Diagonals diagonals = Diagonals::Alternating;
  Ends ends =
      Ends::Open;  ///< Capped: fans to two more vertices, the centres of first and last ring
};

/// Prism around z on a regular polygon.
Shape tube(const TubeOptions& options);

/// Closed cone around z, base in z = 0, its centre and the tip the last two vertices.
Shape cone(int sides, double radius, double height);

/// Plane z = 0 turned to +z: columns * rows vertices, vertex row * columns + column at
/// (column, row) * spacing.
Shape grid(int columns, int rows, double spacing = 1, Diagonals diagonals = Diagonals::Uniform);

/// Every face cut into four at the midpoints of its edges, which are appended; nothing moves.
Shape subdivided(const Shape& shape);

/// Both shapes in one mesh, `b` behind `a`; no vertex is shared.
Shape joined(const Shape& a, const Shape& b);

/// The same points with every face turned around.
Shape reversed(const Shape& shape);

/// Three vertices of its own for every face.
Shape exploded(const Shape& shape);

/// linear * p + translation of every point.
Points moved(const Points& points, const Eigen::Matrix3d& linear,
             const Point& translation = Point::Zero());

/// Rotation by `radians` about the line through the origin along `axis` (any length but 0).
Eigen::Matrix3d rotation(const Point& axis, double radians);

/// Weight of the upper bone at height z: 0 below -half_width, 1 above half_width, linear between;
/// half_width 0: a step, 1/2 at z = 0.
double upper_weight(double z, double half_width);

/// Linear blend of two bones that meet at the origin: the one along +z turns about x.
Points bent(const Points& points, double radians, double half_width);

/// Linear blend of two bones that meet at the origin: the one along +z turns about z.
Points twisted(const Points& points, double radians, double half_width);

/// Numbers that look random and are the same everywhere. Source: Vigna, SplitMix64 (from memory).
class Random {
 public:
  explicit Random(std::uint64_t seed) : state_(seed) {}
  std::uint64_t bits();
  double uniform(double low, double high);
  Point point(double low, double high);  ///< three of `uniform`

 private:
  std::uint64_t state_;
};

}  // namespace tests
