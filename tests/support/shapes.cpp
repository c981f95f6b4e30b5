#include "tests/support/shapes.h"

#include <Eigen/Geometry>

#include <algorithm>
#include <cmath>
#include <map>
#include <utility>

namespace tests {
namespace {

constexpr double kTurn = 6.283185307179586476925;

Index index(int value) {
  return static_cast<Index>(value);
}

// Two faces of the quad a b c d, cut from a to c or from b to d.
void add_quad(Shape& shape, const std::array<Index, 4>& q, bool from_second) {
  if (from_second) {
    shape.faces.push_back({q[0], q[1], q[3]});
    shape.faces.push_back({q[1], q[2], q[3]});
  } else {
    shape.faces.push_back({q[0], q[1], q[2]});
    shape.faces.push_back({q[0], q[2], q[3]});
  }
}

bool cut_from_second(Diagonals diagonals, int row, int column) {
  return diagonals == Diagonals::Alternating && (row + column) % 2 != 0;
}

// Corners of the unit cube by bits x, y, z; sides turned outwards.
constexpr std::array<std::array<Index, 4>, 6> kCubeSides{
    {{0, 4, 6, 2}, {1, 3, 7, 5}, {0, 1, 5, 4}, {2, 6, 7, 3}, {0, 2, 3, 1}, {4, 5, 7, 6}}};

Point cube_corner(Index corner, double edge) {
  return edge * Point(corner & 1U, (corner >> 1U) & 1U, (corner >> 2U) & 1U);
}

Point ring_point(int side, int sides, double radius, double z) {
  const double angle = kTurn * side / sides;
  return {radius * std::cos(angle), radius * std::sin(angle), z};
}

}  // namespace

Shape tetra() {
  return {{{0, 0, 0}, {1, 0, 0}, {0, 1, 0}, {0, 0, 1}},
          {{0, 2, 1}, {0, 1, 3}, {0, 3, 2}, {1, 2, 3}}};
}

Shape cube(double edge) {
  Shape shape;
  for (Index corner = 0; corner < 8; ++corner) {
    shape.points.push_back(cube_corner(corner, edge));
  }
  for (const auto& side : kCubeSides) {
    add_quad(shape, side, false);
  }
  return shape;
}

Shape split_cube(double edge) {
  Shape shape;
  for (const auto& side : kCubeSides) {
    const auto first = static_cast<Index>(shape.points.size());
    for (const Index corner : side) {
      shape.points.push_back(cube_corner(corner, edge));
    }
    add_quad(shape, {first, first + 1, first + 2, first + 3}, false);
  }
  return shape;
}

Shape icosahedron() {
  const double golden = (1 + std::sqrt(5.0)) / 2;
  Shape shape;
  shape.points = {{-1, golden, 0}, {1, golden, 0}, {-1, -golden, 0}, {1, -golden, 0},
                  {0, -1, golden}, {0, 1, golden}, {0, -1, -golden}, {0, 1, -golden},
                  {golden, 0, -1}, {golden, 0, 1}, {-golden, 0, -1}, {-golden, 0, 1}};
  for (Point& p : shape.points) {
    p.normalize();
  }
  shape.faces = {{0, 11, 5}, {0, 5, 1},  {0, 1, 7},   {0, 7, 10}, {0, 10, 11},
                 {1, 5, 9},  {5, 11, 4}, {11, 10, 2}, {10, 7, 6}, {7, 1, 8},
                 {3, 9, 4},  {3, 4, 2},  {3, 2, 6},   {3, 6, 8},  {3, 8, 9},
                 {4, 9, 5},  {2, 4, 11}, {6, 2, 10},  {8, 6, 7},  {9, 8, 1}};
  return shape;
}

Shape icosphere(int levels) {
  Shape shape = icosahedron();
  for (int level = 0; level < levels; ++level) {
    shape = subdivided(shape);
    for (Point& p : shape.points) {
      p.normalize();
    }
  }
  return shape;
}

Shape torus(double big_radius, double small_radius, int rings, int sides, Diagonals diagonals) {
  Shape shape;
  for (int ring = 0; ring < rings; ++ring) {
    const double around = kTurn * ring / rings;
    for (int side = 0; side < sides; ++side) {
      const Point p = ring_point(side, sides, small_radius, 0);
      const double distance = big_radius + p.x();
      shape.points.emplace_back(distance * std::cos(around), distance * std::sin(around), p.y());
    }
  }
  for (int ring = 0; ring < rings; ++ring) {
    for (int side = 0; side < sides; ++side) {
      const int next_ring = (ring + 1) % rings;
      const int next_side = (side + 1) % sides;
      add_quad(shape,
               {index(ring * sides + side), index(next_ring * sides + side),
                index(next_ring * sides + next_side), index(ring * sides + next_side)},
               cut_from_second(diagonals, ring, side));
    }
  }
  return shape;
}

Shape tube(const TubeOptions& options) {
  const int sides = options.sides;
  Shape shape;
  for (int ring = 0; ring < options.rings; ++ring) {
    // From the middle outwards, so that the two halves mirror each other exactly.
    const double z =
        options.length * (2 * ring - (options.rings - 1)) / (2.0 * (options.rings - 1));
    for (int side = 0; side < sides; ++side) {
      shape.points.push_back(ring_point(side, sides, options.radius, z));
    }
  }
  for (int ring = 0; ring + 1 < options.rings; ++ring) {
    for (int side = 0; side < sides; ++side) {
      const int next = (side + 1) % sides;
      add_quad(shape,
               {index(ring * sides + side), index(ring * sides + next),
                index((ring + 1) * sides + next), index((ring + 1) * sides + side)},
               cut_from_second(options.diagonals, ring, side));
    }
  }
  if (options.ends == Ends::Capped) {
    const auto bottom = static_cast<Index>(shape.points.size());
    shape.points.emplace_back(0, 0, -options.length / 2);
    shape.points.emplace_back(0, 0, options.length / 2);
    const int last = (options.rings - 1) * sides;
    for (int side = 0; side < sides; ++side) {
      const int next = (side + 1) % sides;
      shape.faces.push_back({bottom, index(next), index(side)});
      shape.faces.push_back({bottom + 1, index(last + side), index(last + next)});
    }
  }
  return shape;
}

Shape cone(int sides, double radius, double height) {
  Shape shape;
  for (int side = 0; side < sides; ++side) {
    shape.points.push_back(ring_point(side, sides, radius, 0));
  }
  shape.points.emplace_back(0, 0, 0);
  shape.points.emplace_back(0, 0, height);
  for (int side = 0; side < sides; ++side) {
    const int next = (side + 1) % sides;
    shape.faces.push_back({index(sides), index(next), index(side)});
    shape.faces.push_back({index(sides + 1), index(side), index(next)});
  }
  return shape;
}

Shape grid(int columns, int rows, double spacing, Diagonals diagonals) {
  Shape shape;
  for (int row = 0; row < rows; ++row) {
    for (int column = 0; column < columns; ++column) {
      shape.points.emplace_back(column * spacing, row * spacing, 0);
    }
  }
  for (int row = 0; row + 1 < rows; ++row) {
    for (int column = 0; column + 1 < columns; ++column) {
      const int corner = row * columns + column;
      add_quad(
          shape,
          {index(corner), index(corner + 1), index(corner + columns + 1), index(corner + columns)},
          cut_from_second(diagonals, row, column));
    }
  }
  return shape;
}

Shape subdivided(const Shape& shape) {
  Shape result{shape.points, {}};
  std::map<std::pair<Index, Index>, Index> middles;
  const auto middle = [&](Index a, Index b) {
    const auto [place, added] =
        middles.try_emplace(std::minmax(a, b), static_cast<Index>(result.points.size()));
    if (added) {
      result.points.push_back((shape.points[a] + shape.points[b]) / 2);
    }
    return place->second;
  };
  for (const auto& [a, b, c] : shape.faces) {
    const Index ab = middle(a, b);
    const Index bc = middle(b, c);
    const Index ca = middle(c, a);
    result.faces.insert(result.faces.end(), {{a, ab, ca}, {ab, b, bc}, {ca, bc, c}, {ab, bc, ca}});
  }
  return result;
}

Shape joined(const Shape& a, const Shape& b) {
  Shape result = a;
  const auto first = static_cast<Index>(a.points.size());
  result.points.insert(result.points.end(), b.points.begin(), b.points.end());
  for (const auto& [i, j, k] : b.faces) {
    result.faces.push_back({first + i, first + j, first + k});
  }
  return result;
}

Shape reversed(const Shape& shape) {
  Shape result = shape;
  for (Face& face : result.faces) {
    std::swap(face[1], face[2]);
  }
  return result;
}

Shape exploded(const Shape& shape) {
  Shape result;
  for (const Face& face : shape.faces) {
    const auto first = static_cast<Index>(result.points.size());
    for (const Index corner : face) {
      result.points.push_back(shape.points[corner]);
    }
    result.faces.push_back({first, first + 1, first + 2});
  }
  return result;
}

Points moved(const Points& points, const Eigen::Matrix3d& linear, const Point& translation) {
  Points result;
  for (const Point& p : points) {
    result.emplace_back(linear * p + translation);
  }
  return result;
}

Eigen::Matrix3d rotation(const Point& axis, double radians) {
  return Eigen::AngleAxisd(radians, axis.normalized()).toRotationMatrix();
}

double upper_weight(double z, double half_width) {
  if (half_width == 0) {
    return z < 0 ? 0 : z > 0 ? 1 : 0.5;
  }
  return std::clamp((z + half_width) / (2 * half_width), 0.0, 1.0);
}

namespace {

Points blended(const Points& points, const Eigen::Matrix3d& upper, double half_width) {
  Points result;
  for (const Point& p : points) {
    const double w = upper_weight(p.z(), half_width);
    result.emplace_back((1 - w) * p + w * (upper * p));
  }
  return result;
}

}  // namespace

Points bent(const Points& points, double radians, double half_width) {
  return blended(points, rotation(Point::UnitX(), radians), half_width);
}

Points twisted(const Points& points, double radians, double half_width) {
  return blended(points, rotation(Point::UnitZ(), radians), half_width);
}

std::uint64_t Random::bits() {
  std::uint64_t z = (state_ += 0x9e3779b97f4a7c15U);
  z = (z ^ (z >> 30U)) * 0xbf58476d1ce4e5b9U;
  z = (z ^ (z >> 27U)) * 0x94d049bb133111ebU;
  return z ^ (z >> 31U);
}

double Random::uniform(double low, double high) {
  return low + (high - low) * (static_cast<double>(bits() >> 11U) * 0x1p-53);
}

Point Random::point(double low, double high) {
  const double x = uniform(low, high);
  const double y = uniform(low, high);
  const double z = uniform(low, high);
  return {x, y, z};
}

}  // namespace tests
