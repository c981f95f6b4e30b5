#include "metrics/volume.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <CGAL/Exact_predicates_inexact_constructions_kernel.h>
#include <CGAL/Polygon_mesh_processing/border.h>
#include <CGAL/Polygon_mesh_processing/connected_components.h>
#include <CGAL/Polygon_mesh_processing/measure.h>
#include <CGAL/Polygon_mesh_processing/orient_polygon_soup.h>
#include <CGAL/Polygon_mesh_processing/polygon_soup_to_polygon_mesh.h>
#include <CGAL/Polygon_mesh_processing/repair_polygon_soup.h>
#include <CGAL/Surface_mesh.h>
#include <CGAL/boost/graph/helpers.h>
#include <cmath>
#include <iterator>
#include <string>
#include <vector>

// Source of all values here: CGAL, Polygon Mesh Processing. It welds equal points by itself.

namespace {

namespace pmp = CGAL::Polygon_mesh_processing;
using Kernel = CGAL::Exact_predicates_inexact_constructions_kernel;
using Mesh = CGAL::Surface_mesh<Kernel::Point_3>;
using metrics::Index;
using metrics::Point;
using metrics::Points;
using tests::Ends;
using tests::Shape;

constexpr double kPi = 3.14159265358979323846;

struct Soup {
  std::vector<Kernel::Point_3> points;
  std::vector<std::vector<std::size_t>> polygons;
};

Soup soup_of(const Shape& shape, const Points& points) {
  Soup soup;
  for (const Point& p : points) {
    soup.points.emplace_back(p.x(), p.y(), p.z());
  }
  for (const auto& [i, j, k] : shape.faces) {
    soup.polygons.push_back({i, j, k});
  }
  pmp::merge_duplicate_points_in_polygon_soup(soup.points, soup.polygons);
  return soup;
}

Mesh mesh_of(const Shape& shape, const Points& points) {
  const Soup soup = soup_of(shape, points);
  REQUIRE(pmp::is_polygon_soup_a_polygon_mesh(soup.polygons));
  Mesh mesh;
  pmp::polygon_soup_to_polygon_mesh(soup.points, soup.polygons, mesh);
  return mesh;
}

std::size_t component_count(Mesh& mesh) {
  auto component = mesh.add_property_map<Mesh::Face_index, std::size_t>("f:component", 0).first;
  return pmp::connected_components(mesh, component);
}

std::size_t border_count(const Mesh& mesh) {
  std::vector<Mesh::Halfedge_index> cycles;
  pmp::extract_boundary_cycles(mesh, std::back_inserter(cycles));
  return cycles.size();
}

struct Case {
  std::string name;
  Shape shape;
  Points posed;
};

Case at_rest(std::string name, const Shape& shape) {
  return {std::move(name), shape, shape.points};
}

Shape cylinder(int rings, int sides, double length) {
  return tests::tube({.rings = rings, .sides = sides, .length = length, .ends = Ends::Capped});
}

Points shaken(const Points& points, double by) {
  tests::Random random(11);
  Points result;
  for (const Point& p : points) {
    result.emplace_back(p + random.point(-by, by));
  }
  return result;
}

Shape nested() {
  Shape inner = tests::reversed(tests::icosphere(2));
  inner.points = tests::moved(inner.points, Eigen::Matrix3d::Identity() / 2, Point(0.1, 0, 0));
  return tests::joined(tests::icosphere(3), inner);
}

// The shape without two of its faces, `high` the later one.
Shape without(Shape shape, std::ptrdiff_t high, std::ptrdiff_t low) {
  shape.faces.erase(shape.faces.begin() + high);
  shape.faces.erase(shape.faces.begin() + low);
  return shape;
}

std::vector<Case> closed_cases() {
  const Shape limb = cylinder(61, 32, 6);
  const Shape sphere = tests::icosphere(3);
  Eigen::Matrix3d F;
  F << 1.2, 0.3, -0.1, 0.2, 0.9, 0.4, -0.5, 0.1, 1.1;
  return {at_rest("tetrahedron", tests::tetra()),
          at_rest("cube", tests::cube(1.7)),
          at_rest("split cube", tests::split_cube()),
          at_rest("icosphere", tests::icosphere(4)),
          at_rest("exploded icosphere", tests::exploded(tests::icosphere(2))),
          at_rest("torus", tests::torus(3, 1, 24, 13)),
          at_rest("exploded torus", tests::exploded(tests::torus(3, 1, 24, 13))),
          at_rest("cone", tests::cone(50, 1, 2)),
          at_rest("nested spheres", nested()),
          {"limb bent by 60", limb, tests::bent(limb.points, kPi / 3, 1)},
          {"limb bent by 120", limb, tests::bent(limb.points, 2 * kPi / 3, 1)},
          {"limb bent by 150", limb, tests::bent(limb.points, 5 * kPi / 6, 1)},
          {"limb twisted by 90", limb, tests::twisted(limb.points, kPi / 2, 1)},
          {"mapped sphere", sphere, tests::moved(sphere.points, F)},
          {"mirrored sphere", sphere,
           tests::moved(sphere.points, Eigen::Vector3d(-1, 1, 1).asDiagonal().toDenseMatrix())},
          {"shaken sphere", sphere, shaken(sphere.points, 0.05)}};
}

}  // namespace

// Catches any difference in welding, shells or the sum itself on closed meshes, posed or not.
TEST_CASE("closed meshes have CGAL's volume and topology") {
  for (const Case& test : closed_cases()) {
    CAPTURE(test.name);
    const metrics::Surface surface = metrics::make_surface(test.shape.points, test.shape.faces);
    Mesh mesh = mesh_of(test.shape, test.posed);
    REQUIRE(CGAL::is_closed(mesh));
    CHECK(surface.shells.size() == component_count(mesh));
    CHECK(surface.welded_count == mesh.number_of_vertices());
    CHECK(surface.edges.size() == mesh.number_of_edges());
    for (const metrics::Shell& shell : surface.shells) {
      CHECK((shell.manifold && shell.closable && shell.loops.empty()));
    }
    const double expected = pmp::volume(mesh);
    CHECK(std::abs(metrics::enclosed_volume(surface, test.posed) - expected) <=
          1e-12 * std::abs(expected));
  }
}

// Catches borders that are overlooked or invented.
TEST_CASE("open meshes have CGAL's borders") {
  const Shape window = without(tests::icosphere(2), 300, 7);
  for (const Case& test : {at_rest("grid", tests::grid(7, 5)),
                           at_rest("tube", tests::tube({.rings = 9, .sides = 12, .length = 8})),
                           at_rest("exploded grid", tests::exploded(tests::grid(7, 5))),
                           at_rest("sphere with two windows", window)}) {
    CAPTURE(test.name);
    const metrics::Surface surface = metrics::make_surface(test.shape.points, test.shape.faces);
    const Mesh mesh = mesh_of(test.shape, test.posed);
    CHECK_FALSE(CGAL::is_closed(mesh));
    REQUIRE(surface.shells.size() == 1);
    CHECK(surface.shells[0].closable);
    CHECK(surface.shells[0].loops.size() == border_count(mesh));
  }
}

// Catches a surface taken for sound that CGAL refuses: two windows with a corner in common, a face
// there twice, a face turned around.
TEST_CASE("what CGAL refuses has no volume here") {
  const Shape pinched = without(tests::icosphere(2), 100, 7);
  Shape doubled = tests::cube();
  doubled.faces.push_back(doubled.faces[0]);
  Shape turned = tests::cube();
  std::swap(turned.faces[5][0], turned.faces[5][1]);
  for (const Case& test :
       {at_rest("pinched", pinched), at_rest("doubled", doubled), at_rest("turned", turned)}) {
    CAPTURE(test.name);
    CHECK_FALSE(pmp::is_polygon_soup_a_polygon_mesh(soup_of(test.shape, test.posed).polygons));
    const metrics::Surface surface = metrics::make_surface(test.shape.points, test.shape.faces);
    CHECK(metrics::measured_shells(surface) == std::vector<bool>{false});
  }
}

// Catches caps that are turned inwards or do not follow the pose: CGAL measures the same tube with
// its fans in the mesh.
TEST_CASE("capped openings have CGAL's volume of the closed mesh") {
  const tests::TubeOptions options{.rings = 41, .sides = 15, .length = 8};
  const Shape open = tests::tube(options);
  const metrics::Surface surface = metrics::make_surface(open.points, open.faces);
  for (const double degrees : {0.0, 70.0, 130.0}) {
    Points posed = shaken(tests::bent(open.points, degrees * kPi / 180, 1), 0.02);
    const double ours = metrics::enclosed_volume(surface, posed);
    for (const std::size_t first : {std::size_t{0}, std::size_t{40} * 15}) {
      Point sum = Point::Zero();
      for (std::size_t i = 0; i < 15; ++i) {
        sum += posed[first + i];
      }
      posed.emplace_back(sum / 15);
    }
    const Mesh mesh = mesh_of(cylinder(41, 15, 8), posed);
    REQUIRE(CGAL::is_closed(mesh));
    const double expected = pmp::volume(mesh);
    CAPTURE(degrees);
    CHECK(std::abs(ours - expected) <= 1e-12 * expected);
  }
}
