#include "metrics/surface.h"

#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>
#include <set>
#include <vector>

using metrics::Edge;
using metrics::Face;
using metrics::Index;
using metrics::make_surface;
using metrics::Point;
using metrics::Points;
using metrics::Surface;

namespace {

Surface surface_of(const tests::Shape& shape, double weld = 1e-7) {
  return make_surface(shape.points, shape.faces, {}, weld);
}

// Vertices - edges + faces of the welded surface.
long euler(const Surface& surface) {
  std::set<Index> used;
  for (const Face& face : surface.faces) {
    for (const Index i : face) {
      used.insert(surface.welded[i]);
    }
  }
  return static_cast<long>(used.size()) - static_cast<long>(surface.edges.size()) +
         std::count(surface.degenerate.begin(), surface.degenerate.end(), false);
}

std::size_t loop_count(const Surface& surface) {
  std::size_t count = 0;
  for (const metrics::Shell& shell : surface.shells) {
    count += shell.loops.size();
  }
  return count;
}

bool all_closable(const Surface& surface) {
  return std::all_of(surface.shells.begin(), surface.shells.end(),
                     [](const metrics::Shell& s) { return s.manifold && s.closable; });
}

const Edge* find_edge(const Surface& surface, Index a, Index b) {
  for (const Edge& edge : surface.edges) {
    if (edge.a == a && edge.b == b) {
      return &edge;
    }
  }
  return nullptr;
}

}  // namespace

// Catches a weld that misses copies or joins corners. Check 3, elementary: a cube has 8 corners,
// 18 edges with the diagonals of its sides, and the Euler characteristic of a sphere.
TEST_CASE("a cube split along its edges is one closed shell") {
  const tests::Shape shape = tests::split_cube();
  const Surface surface = surface_of(shape);
  CHECK(surface.welded_count == 8);
  CHECK(surface.twins.size() == 8);
  for (const auto& group : surface.twins) {
    CHECK(group.size() == 3);
    CHECK(std::is_sorted(group.begin(), group.end()));
    for (const Index i : group) {
      CHECK(surface.welded[i] == group.front());
      CHECK(shape.points[i] == shape.points[group.front()]);
    }
  }
  CHECK(surface.edges.size() == 18);
  CHECK(surface.shells.size() == 1);
  CHECK(loop_count(surface) == 0);
  CHECK(all_closable(surface));
  CHECK(euler(surface) == 2);
  CHECK(std::none_of(surface.border.begin(), surface.border.end(), [](bool b) { return b; }));
}

// Catches an edge that is lost or counted twice. Check 10, theorem of Euler and Poincare: 2 for a
// sphere, 0 for a torus and for an open cylinder, 1 for a disc; a tube has two ends.
TEST_CASE("Euler characteristic and loops of known surfaces") {
  const auto look = [](const tests::Shape& shape, long characteristic, std::size_t loops) {
    const Surface surface = surface_of(shape);
    CHECK(euler(surface) == characteristic);
    CHECK(loop_count(surface) == loops);
    CHECK(surface.shells.size() == 1);
    CHECK(all_closable(surface));
    CHECK(std::is_sorted(surface.edges.begin(), surface.edges.end(), [](const auto& x, auto& y) {
      return std::pair(x.a, x.b) < std::pair(y.a, y.b);
    }));
  };
  look(tests::tetra(), 2, 0);
  look(tests::icosphere(3), 2, 0);
  look(tests::exploded(tests::icosphere(2)), 2, 0);
  look(tests::torus(3, 1, 12, 9), 0, 0);
  look(tests::exploded(tests::torus(3, 1, 12, 9)), 0, 0);
  look(tests::tube({.rings = 5, .sides = 7}), 0, 2);
  look(tests::tube({.rings = 5, .sides = 7, .ends = tests::Ends::Capped}), 2, 0);
  look(tests::cone(50, 1, 2), 2, 0);
  look(tests::grid(4, 6), 1, 1);
}

// Catches a loop that runs with its faces: a cap on it would then be turned inwards.
TEST_CASE("a loop walks against the faces on its edges") {
  const Surface surface = surface_of(tests::tetra());
  Surface open = make_surface(surface.rest, {surface.faces[1], surface.faces[2], surface.faces[3]});
  REQUIRE(open.shells.size() == 1);
  // The face left out is (0, 2, 1): it would close the hole in this direction.
  CHECK(open.shells[0].loops == std::vector<metrics::Loop>{{0, 2, 1}});
}

// Catches lengths and areas that belong to another element. Elementary.
TEST_CASE("rest sizes") {
  const Surface surface = surface_of(tests::grid(3, 2, 2.0));
  CHECK(surface.diagonal == std::sqrt(20.0));
  for (std::size_t e = 0; e < surface.edges.size(); ++e) {
    const Edge& edge = surface.edges[e];
    const bool straight = edge.b - edge.a == 1 || edge.b - edge.a == 3;
    CHECK(surface.edge_length[e] == (straight ? 2.0 : std::sqrt(8.0)));
    CHECK(edge.face_count == (edge.faces[1] == metrics::kNone ? 1 : 2));
  }
  for (const double area : surface.face_area) {
    CHECK(area == 2);
  }
}

// Catches topology that depends on the order of vertices: a permuted file has the same shells.
TEST_CASE("topology survives a permutation of the vertices") {
  const tests::Shape shape = tests::exploded(tests::torus(3, 1, 8, 6));
  std::vector<Index> order(shape.points.size());
  std::iota(order.begin(), order.end(), Index{0});
  tests::Random random(10);
  for (std::size_t i = order.size(); i-- > 1;) {
    std::swap(order[i], order[random.bits() % (i + 1)]);
  }
  tests::Shape other{Points(order.size()), shape.faces};
  for (std::size_t i = 0; i < order.size(); ++i) {
    other.points[order[i]] = shape.points[i];
  }
  for (Face& face : other.faces) {
    for (Index& corner : face) {
      corner = order[corner];
    }
  }
  const Surface a = surface_of(shape);
  const Surface b = surface_of(other);
  CHECK(a.welded_count == b.welded_count);
  CHECK(a.edges.size() == b.edges.size());
  CHECK(a.shells.size() == b.shells.size());
  CHECK(euler(b) == 0);
  for (std::size_t i = 0; i < order.size(); ++i) {
    CHECK(b.welded[order[i]] == b.welded[order[a.welded[i]]]);
  }
  CHECK(metrics::same_topology(a, a));
  CHECK_FALSE(metrics::same_topology(a, b));
}

// Catches a comparison that overlooks the welding, or one that looks at positions.
TEST_CASE("same topology means same faces and welding") {
  const tests::Shape shape = tests::split_cube();
  const Surface a = surface_of(shape);
  CHECK(metrics::same_topology(
      a, make_surface(tests::moved(shape.points, Eigen::Matrix3d::Identity() * 2), shape.faces)));
  Points torn = shape.points;
  torn[0] += Point(0.1, 0, 0);
  CHECK_FALSE(metrics::same_topology(a, make_surface(torn, shape.faces)));
  CHECK_FALSE(metrics::same_topology(a, surface_of(tests::reversed(shape))));
}

// Catches fans whose cuts are taken for edges of the asset, also where copies of the ends are
// welded, and edges that another polygon really has.
TEST_CASE("a diagonal is an edge no polygon has") {
  const std::vector<std::array<Index, 2>> cuts{{0, 2},   {4, 6},   {8, 10},
                                               {12, 14}, {18, 16}, {22, 20}};
  const tests::Shape shape = tests::split_cube();
  const Surface cube = make_surface(shape.points, shape.faces, cuts);
  CHECK(std::count_if(cube.edges.begin(), cube.edges.end(),
                      [](const Edge& e) { return e.diagonal; }) == 6);
  for (std::size_t e = 0; e < cube.edges.size(); ++e) {
    CHECK(cube.edges[e].diagonal == (cube.edge_length[e] > 1.1));
  }
  // The quad 0 1 2 3 cut from 0 to 2, and a triangle that has the edge 0-2 as its own.
  const Points points{{0, 0, 0}, {1, 0, 0}, {1, 1, 0}, {0, 1, 0}, {0.5, 0.5, 1}};
  const Surface fin = make_surface(points, {{0, 1, 2}, {0, 2, 3}, {2, 0, 4}}, {{{0, 2}}});
  REQUIRE(find_edge(fin, 0, 2) != nullptr);
  CHECK_FALSE(find_edge(fin, 0, 2)->diagonal);
  CHECK(find_edge(fin, 0, 2)->face_count == 3);
  // The same quad with corners 2 and 3 in one place: what is left of its side 3-0 is an edge.
  Points flat = points;
  flat[3] = flat[2];
  const Surface triangle = make_surface(flat, {{0, 1, 2}, {0, 2, 3}}, {{{0, 2}}});
  REQUIRE(find_edge(triangle, 0, 2) != nullptr);
  CHECK_FALSE(find_edge(triangle, 0, 2)->diagonal);
}

// Catches faces without area that tear or close a surface.
TEST_CASE("faces with welded corners are on no edge") {
  tests::Shape shape = tests::cube();
  shape.faces.insert(shape.faces.begin(), {0, 0, 1});
  shape.points.push_back(shape.points[3]);
  shape.faces.push_back({3, 8, 5});
  const Surface surface = surface_of(shape);
  CHECK(surface.degenerate.front());
  CHECK(surface.degenerate.back());
  CHECK(std::count(surface.degenerate.begin(), surface.degenerate.end(), true) == 2);
  CHECK(surface.face_area.front() == 0);
  CHECK(surface.edges.size() == 18);
  REQUIRE(surface.shells.size() == 1);
  CHECK(surface.shells[0].faces.size() == 12);
  CHECK(surface.shells[0].faces.front() == 1);
  CHECK(all_closable(surface));
}

// Catches shells in the wrong order and shells joined at a mere vertex.
TEST_CASE("shells are joined by edges and ordered by their lowest face") {
  tests::Shape two = tests::joined(tests::tetra(), tests::cube());
  // Faces of the two in turn, the cube's first.
  std::vector<Face> faces;
  for (std::size_t f = 0; f < 12; ++f) {
    faces.push_back(two.faces[4 + f]);
    if (f < 4) {
      faces.push_back(two.faces[f]);
    }
  }
  const Points& points = two.points;  // both have a corner at the origin
  const Surface surface = make_surface(tests::moved(points, Eigen::Matrix3d::Identity()), faces);
  // The tetrahedron's corners are the cube's, so edges coincide and it all is one piece ...
  CHECK(surface.shells.size() == 1);
  CHECK_FALSE(surface.shells[0].manifold);
  // ... but mirrored at the origin only that corner is shared.
  Points mirrored = points;
  std::for_each(mirrored.begin(), mirrored.begin() + 4, [](Point& p) { p = -p; });
  const Surface touching = make_surface(mirrored, faces);
  REQUIRE(touching.shells.size() == 2);
  CHECK(touching.shells[0].faces == std::vector<Index>{0, 2, 4, 6, 8, 9, 10, 11, 12, 13, 14, 15});
  CHECK(touching.shells[1].faces == std::vector<Index>{1, 3, 5, 7});
  CHECK(all_closable(touching));
  // Two fans meet in the corner; nowhere else is a border.
  for (Index i = 0; i < 12; ++i) {
    CHECK(touching.border[i] == (touching.welded[i] == 0));
  }
}

// Catches a surface that passes for manifold with a doubled face, a turned face or a twist.
TEST_CASE("edges of more than two faces and turned faces are seen") {
  tests::Shape doubled = tests::cube();
  doubled.faces.push_back(doubled.faces[0]);
  const Surface twice = surface_of(doubled);
  CHECK_FALSE(twice.shells[0].manifold);
  CHECK(std::count_if(twice.edges.begin(), twice.edges.end(),
                      [](const Edge& e) { return e.face_count == 3 && !e.consistent; }) == 3);

  tests::Shape turned = tests::cube();
  std::swap(turned.faces[5][0], turned.faces[5][1]);
  const Surface wrong = surface_of(turned);
  CHECK_FALSE(wrong.shells[0].manifold);
  CHECK(std::count_if(wrong.edges.begin(), wrong.edges.end(),
                      [](const Edge& e) { return !e.consistent; }) == 3);

  // A band of 8 quads closed with half a turn.
  tests::Shape band;
  for (Index i = 0; i < 8; ++i) {
    const double angle = i * 3.14159265358979 / 4;
    const Point around(std::cos(angle), std::sin(angle), 0);
    const Point up = std::cos(angle / 2) * Point::UnitZ() + std::sin(angle / 2) * around;
    band.points.emplace_back(3 * around - up);
    band.points.emplace_back(3 * around + up);
    const Index a = 2 * i;
    const Index c = i == 7 ? 1 : a + 2;
    const Index d = i == 7 ? 0 : a + 3;
    band.faces.push_back({a, c, d});
    band.faces.push_back({a, d, a + 1});
  }
  const Surface moebius = surface_of(band);
  CHECK(euler(moebius) == 0);
  CHECK_FALSE(moebius.shells[0].manifold);
}

// Catches loops that are guessed where two holes meet in a vertex.
TEST_CASE("a border that passes a vertex twice is not closable") {
  tests::Shape shape = tests::grid(6, 6);
  std::vector<Face> faces;
  for (std::size_t f = 0; f < shape.faces.size(); ++f) {
    const std::size_t quad = f / 2;
    if (quad != 1 * 5 + 1 && quad != 2 * 5 + 2) {
      faces.push_back(shape.faces[f]);
    }
  }
  const Surface surface = make_surface(shape.points, faces);
  REQUIRE(surface.shells.size() == 1);
  CHECK(surface.shells[0].manifold);
  CHECK_FALSE(surface.shells[0].closable);
  REQUIRE(surface.shells[0].loops.size() == 1);  // the outline is sound
  CHECK(surface.shells[0].loops[0].size() == 20);
  CHECK(surface.border[2 * 6 + 2]);
}

// Catches border flags that miss the rim or reach inside. Elementary: the rim of a grid; a vertex
// on no face belongs to no surface and counts as border.
TEST_CASE("border vertices") {
  tests::Shape shape = tests::grid(5, 4);
  shape.points.emplace_back(9, 9, 9);
  const Surface surface = surface_of(shape);
  for (Index i = 0; i < 20; ++i) {
    const Index column = i % 5;
    const Index row = i / 5;
    CHECK(surface.border[i] == (column == 0 || column == 4 || row == 0 || row == 3));
  }
  CHECK(surface.border[20]);
  // Copies share the flag of the vertex they are welded to.
  const Surface split = surface_of(tests::exploded(tests::grid(3, 3)));
  for (std::size_t i = 0; i < split.rest.size(); ++i) {
    CHECK(split.border[i] == (split.rest[i] != Point(1, 1, 0)));
  }
}
