#include "metrics/volume.h"

#include "metrics/catalog.h"
#include "tests/support/shapes.h"

#include <Eigen/LU>
#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <vector>

using metrics::enclosed_volume;
using metrics::make_surface;
using metrics::Omission;
using metrics::Point;
using metrics::Points;
using metrics::Surface;
using tests::Shape;

namespace {

constexpr double kPi = 3.14159265358979323846;

Surface surface_of(const Shape& shape) {
  return make_surface(shape.points, shape.faces);
}

double volume_of(const Shape& shape) {
  return enclosed_volume(surface_of(shape), shape.points);
}

double change(const Surface& surface, const Points& posed) {
  metrics::Values values;
  metrics::volume().measure(surface, {.points = posed, .carried = {}, .delta = 0}, values);
  REQUIRE(values.size() == 1);
  return values[0];
}

double area_of(const Shape& shape) {
  return metrics::fixed_sum(surface_of(shape).face_area);
}

bool near(double value, double expected, double relative) {
  return std::abs(value - expected) <= relative * std::abs(expected);
}

Eigen::Matrix3d some_map() {
  Eigen::Matrix3d F;
  F << 1.2, 0.3, -0.1, 0.2, 0.9, 0.4, -0.5, 0.1, 1.1;
  return F;
}

}  // namespace

// Catches a wrong factor, a turned builder, lost digits. Checks 1, 2, 3, 5 and 13c, elementary.
TEST_CASE("volumes of polyhedra") {
  CHECK(near(volume_of(tests::tetra()), 1.0 / 6, 1e-15));
  CHECK(near(volume_of(tests::cube(1.7)), 1.7 * 1.7 * 1.7, 1e-14));
  CHECK(volume_of(tests::split_cube()) == 1);
  const double sine = std::sin(2 * kPi / 5);
  CHECK(near(volume_of(tests::icosahedron()),
             5.0 / 12 * (3 + std::sqrt(5.0)) / (sine * sine * sine), 1e-14));
  CHECK(near(volume_of(tests::cone(50, 1, 2)), 25 * std::sin(2 * kPi / 50) * 2 / 3, 1e-13));
}

// Catches tetrahedra about a far origin. Check 4, elementary.
TEST_CASE("a far cube keeps its volume") {
  Shape shape = tests::cube();
  shape.points = tests::moved(shape.points, Eigen::Matrix3d::Identity(), Point(1e6, 1e6, 1e6));
  CHECK(near(volume_of(shape), 1, 1e-9));
}

// Catches caps and sides that are not switched together. Check 3, elementary: a cube whose sides
// are not welded is six open quads, each cancelled by its own cap, not a volume of 1.
TEST_CASE("sides that are not welded enclose nothing") {
  Shape apart = tests::split_cube();
  for (std::size_t i = 0; i < apart.points.size(); ++i) {
    const std::size_t side = i / 4;
    apart.points[i].x() += 10 * static_cast<double>(side);
  }
  const Surface surface = surface_of(apart);
  REQUIRE(surface.shells.size() == 6);
  for (const metrics::ShellVolume& shell : metrics::shell_volumes(surface)) {
    CHECK(near(shell.area, 1, 1e-12));
    CHECK(near(shell.cap_area, 1, 1e-12));
    CHECK(std::abs(shell.volume) < 1e-12);
    CHECK(shell.omission == Omission::WideOpening);
  }
  CHECK(enclosed_volume(surface, apart.points) == 0);
  CHECK(std::isnan(change(surface, apart.points)));
}

// Catches a change of the sphere's builder, which other checks stand on. Check 6: measured with an
// independent implementation; levels 2 to 4 by CGAL too.
TEST_CASE("volumes of subdivided icosahedra") {
  const std::vector<double> expected{2.536150710120, 3.658712208512, 4.047044679979,
                                     4.152740817093, 4.179738947995, 4.186524949279};
  for (std::size_t level = 0; level < expected.size(); ++level) {
    CHECK(near(volume_of(tests::icosphere(static_cast<int>(level))), expected[level], 1e-11));
  }
}

// Catches an error that refinement does not remove. Check 7, elementary: volume and area of an
// inscribed sphere converge with order 2. The errors at level 5 are measured.
TEST_CASE("spheres converge with order two") {
  const Shape coarse = tests::icosphere(4);
  const Shape fine = tests::icosphere(5);
  const double volume = 4 * kPi / 3;
  const double area = 4 * kPi;
  const double order = std::log2((volume - volume_of(coarse)) / (volume - volume_of(fine)));
  CHECK((order > 1.9 && order < 2.1));
  const double area_order = std::log2((area - area_of(coarse)) / (area - area_of(fine)));
  CHECK((area_order > 1.9 && area_order < 2.1));
  CHECK(near(1 - volume_of(fine) / volume, 5.408e-4, 1e-3));
  CHECK(near(1 - area_of(fine) / area, 2.990e-4, 1e-3));
}

// Catches a wrong handling of a hole through the solid. Check 12, elementary (Pappus).
TEST_CASE("tori converge to Pappus' volume and area") {
  const double big = 3;
  const double small = 1;
  std::vector<double> volumes;
  std::vector<double> areas;
  for (const int n : {32, 64}) {
    const Shape shape = tests::torus(big, small, 2 * n, n);
    volumes.push_back(2 * kPi * kPi * big * small * small - volume_of(shape));
    areas.push_back(4 * kPi * kPi * big * small - area_of(shape));
  }
  for (const auto& errors : {volumes, areas}) {
    const double order = std::log2(errors[0] / errors[1]);
    CHECK((order > 1.9 && order < 2.1));
  }
}

// Catches a cap that is missing or turned inwards. Checks 13 and 13b, elementary.
TEST_CASE("a prism has its volume, closed by its own ends or by caps") {
  for (const auto diagonals : {tests::Diagonals::Alternating, tests::Diagonals::Uniform}) {
    tests::TubeOptions options{
        .rings = 9, .sides = 11, .radius = 0.8, .length = 5, .diagonals = diagonals};
    const double exact = 5.5 * std::sin(2 * kPi / 11) * 0.8 * 0.8 * 5;
    const Surface open = surface_of(tests::tube(options));
    CHECK(open.shells.at(0).loops.size() == 2);
    CHECK(near(volume_of(tests::tube(options)), exact, 1e-13));
    options.ends = tests::Ends::Capped;
    CHECK(near(volume_of(tests::tube(options)), exact, 1e-13));
  }
}

// Catches shells whose sign is dropped. Check 14, elementary.
TEST_CASE("an inward shell inside is subtracted") {
  const Shape sphere = tests::icosphere(2);
  Shape inner = tests::reversed(sphere);
  inner.points = tests::moved(inner.points, Eigen::Matrix3d::Identity() / 2);
  const Shape both = tests::joined(sphere, inner);
  CHECK(surface_of(both).shells.size() == 2);
  CHECK(near(volume_of(both), volume_of(sphere) * 7 / 8, 1e-13));
}

// Catches a formula that is not a volume. Checks 15 and 37, elementary: a linear map multiplies by
// its determinant, whatever the translation; open shapes keep their flat caps.
TEST_CASE("a linear map multiplies the volume by its determinant") {
  const Eigen::Matrix3d F = some_map();
  const Point shift(3, -2, 5);
  for (const Shape& shape : {tests::icosphere(2), tests::torus(3, 1, 14, 9), tests::split_cube(),
                             tests::tube({.rings = 4, .sides = 9, .length = 8})}) {
    const Surface surface = surface_of(shape);
    const Points mapped = tests::moved(shape.points, F, shift);
    CHECK(near(enclosed_volume(surface, mapped),
               F.determinant() * enclosed_volume(surface, shape.points), 1e-13));
    CHECK(near(change(surface, mapped), F.determinant() - 1, 1e-12));
    CHECK(near(change(surface, tests::moved(shape.points, Eigen::Matrix3d::Identity() * 3)), 26,
               1e-13));
  }
}

// Catches a change that is not exactly 0 at rest or that takes a mirrored skin for a sound one.
// Check 15, elementary: mirrored, the volume is that of the inside out, -2 of change.
TEST_CASE("rest is 0, rigid motion next to 0, a mirrored skin -2") {
  for (const Shape& shape :
       {tests::icosphere(3), tests::tube({.rings = 4, .sides = 9, .length = 8})}) {
    const Surface surface = surface_of(shape);
    CHECK(change(surface, shape.points) == 0);
    const Points turned =
        tests::moved(shape.points, tests::rotation(Point(1, 2, 3), kPi), Point(10, -20, 30));
    CHECK(std::abs(change(surface, turned)) < 1e-13);
    const Points mirrored =
        tests::moved(shape.points, Eigen::Vector3d(-1, 1, 1).asDiagonal().toDenseMatrix());
    CHECK(near(change(surface, mirrored), -2, 1e-13));
  }
}

// Catches a gain reported as a loss where the asset is turned inwards: by |rest volume|, a cube
// inside out of twice the edge has -8 against -1.
TEST_CASE("an inverted asset is measured against the size of its volume") {
  const Shape shape = tests::reversed(tests::cube());
  CHECK(near(change(surface_of(shape), tests::moved(shape.points, 2 * Eigen::Matrix3d::Identity())),
             -7, 1e-13));
}

// Catches caps left at rest, and twins of a rim of which another than the welded vertex is taken.
TEST_CASE("caps move with the pose and hang on the welded vertices") {
  const tests::TubeOptions options{.rings = 3, .sides = 8, .length = 4};
  const Shape shape = tests::tube(options);
  const Surface surface = surface_of(shape);
  Points posed = shape.points;
  for (std::size_t i = 16; i < 24; ++i) {
    posed[i].z() += 2;  // the last ring: a prism of twice the upper half
  }
  CHECK(near(change(surface, posed), 0.5, 1e-13));

  // A cube without lid whose corners are tripled; what the copies that lead no twin group do adds
  // to their faces alone.
  const Shape split = tests::split_cube();
  const Surface box = make_surface(split.points, {split.faces.begin(), split.faces.end() - 2});
  REQUIRE(box.shells.at(0).loops.size() == 1);
  Points torn = split.points;
  torn[20] += Point(7, 7, 7);  // a corner of the lid, which has no faces
  CHECK(change(box, torn) == 0);
}

// Catches a candy wrapper whose loss is misjudged. Check 22, derived by hand: with weights linear
// over the length of the blend the section shrinks by sqrt(1 - 4 w (1 - w) sin^2(t / 2)), whose
// square averages 1 - 2/3 sin^2(t / 2); diagonals that alternate make the mesh follow exactly.
TEST_CASE("a linear twist leaves 1 - 2/3 sin^2 of half the angle") {
  for (const int sides : {6, 15, 16}) {
    for (const int segments : {2, 6}) {
      // The mesh is the blend itself: rings lie on both of its ends.
      const Shape shape = tests::tube(
          {.rings = segments + 1, .sides = sides, .length = 2, .ends = tests::Ends::Capped});
      const Surface surface = surface_of(shape);
      for (const double degrees : {60.0, 90.0, 180.0}) {
        const double angle = degrees * kPi / 180;
        Points posed;
        for (const Point& p : shape.points) {
          const double weight = (1 + p.z()) / 2;
          const Point turned(std::cos(angle) * p.x() - std::sin(angle) * p.y(),
                             std::sin(angle) * p.x() + std::cos(angle) * p.y(), p.z());
          posed.emplace_back((1 - weight) * p + weight * turned);
        }
        const double half = std::sin(angle / 2);
        CAPTURE(sides, segments, degrees);
        CHECK(std::abs(1 + change(surface, posed) - (1 - 2.0 / 3 * half * half)) < 1e-12);
      }
    }
  }
}

// Catches a drift of the bent skin itself. Check 36: CGAL and OpenMesh agree on these.
TEST_CASE("volumes of a bent cylinder") {
  const Shape shape =
      tests::tube({.rings = 61, .sides = 32, .length = 6, .ends = tests::Ends::Capped});
  const Surface surface = surface_of(shape);
  const std::vector<std::pair<double, double>> expected{{60, 18.2058288505452},
                                                        {90, 17.682986787542},
                                                        {120, 17.1601447245387},
                                                        {150, 16.7773977700861}};
  for (const auto& [degrees, volume] : expected) {
    CHECK(near(enclosed_volume(surface, tests::bent(shape.points, degrees * kPi / 180, 1)), volume,
               1e-12));
  }
}

// Catches shells that pass though their volume means nothing, and sound ones left out with them.
TEST_CASE("shells without a meaning are left out and named") {
  const Shape sound = tests::icosphere(1);

  Shape doubled = tests::cube();
  doubled.faces.push_back(doubled.faces[0]);  // unflagged, its volume reads 1.0833
  Shape pinched = tests::grid(6, 6);
  pinched.faces.erase(pinched.faces.begin() + 24, pinched.faces.begin() + 26);  // quad (2, 2)
  pinched.faces.erase(pinched.faces.begin() + 12, pinched.faces.begin() + 14);  // quad (1, 1)
  const Shape sheet = tests::grid(3, 3);
  Shape wafer = tests::cube();
  wafer.points =
      tests::moved(wafer.points, Eigen::Vector3d(1, 1, 2e-6).asDiagonal().toDenseMatrix());

  const std::vector<std::pair<Shape, Omission>> cases{{doubled, Omission::NonManifold},
                                                      {pinched, Omission::Unclosable},
                                                      {sheet, Omission::WideOpening},
                                                      {wafer, Omission::Flat}};
  for (const auto& [bad, omission] : cases) {
    Shape apart = bad;
    apart.points = tests::moved(bad.points, Eigen::Matrix3d::Identity(), Point(2, 0, 0));
    const Shape both = tests::joined(apart, sound);
    const Surface surface = surface_of(both);
    REQUIRE(surface.shells.size() == 2);
    CHECK(metrics::shell_volumes(surface)[0].omission == omission);
    CHECK(metrics::measured_shells(surface) == std::vector<bool>{false, true});
    CHECK(near(enclosed_volume(surface, both.points), volume_of(sound), 1e-12));
    CHECK_THAT(metrics::volume_note(surface),
               Catch::StartsWith("1 of 2 shells left out of volume: 1 with ") &&
                   Catch::EndsWith(" (first at face 0)"));

    const Surface alone = surface_of(bad);
    CHECK(std::isnan(change(alone, bad.points)));
    CHECK(enclosed_volume(alone, bad.points) == 0);
    CHECK_THAT(metrics::volume_note(alone), Catch::EndsWith("; volume.change is undefined"));
  }
  CHECK(metrics::volume_note(surface_of(sound)).empty());
}

// Catches a limit on openings that is off. Elementary: the caps of an open prism of n sides over
// its sides are r cos(pi / n) / h, which is 1/4 at h = 4 r cos(pi / n).
TEST_CASE("caps may have a quarter of the faces' area") {
  const double limit = 4 * std::cos(kPi / 12);
  for (const double factor : {0.999, 1.001}) {
    const Shape shape = tests::tube({.rings = 3, .sides = 12, .length = limit * factor});
    CHECK(metrics::measured_shells(surface_of(shape)) == std::vector<bool>{factor > 1});
  }
}

// Catches a division by a volume that is nothing but the rounding of two that cancel.
TEST_CASE("shells that cancel have no change") {
  const Shape sphere = tests::icosphere(1);
  Shape other = tests::reversed(sphere);
  other.points = tests::moved(other.points, Eigen::Matrix3d::Identity(), Point(0.1, 5, 0));
  const Shape both = tests::joined(sphere, other);
  const Surface surface = surface_of(both);
  CHECK(std::isnan(change(surface, tests::moved(both.points, some_map()))));
  CHECK(metrics::volume_note(surface) ==
        "the volumes of the 2 shells cancel at rest; volume.change is undefined");
  CHECK(metrics::volume_note(make_surface(sphere.points, {})) ==
        "no face spans three separate vertices; volume.change is undefined");
}

// Catches a floor of the wrong size. The formula's source is its derivation (independent rounding
// of n vertices); the numbers are elementary: a split cube has area 6, volume 1 and 8 places.
TEST_CASE("the noise floor follows area, vertices and volume") {
  const Surface surface = surface_of(tests::split_cube());
  metrics::Values floors;
  const auto look = [&](const Surface& on, double delta) {
    metrics::volume().floors(on, {.points = on.rest, .carried = {}, .delta = delta}, floors);
    REQUIRE(floors.size() == 1);
    return floors[0];
  };
  CHECK(near(look(surface, 1e-3), 1e-3 * 6 / std::sqrt(8.0), 1e-14));
  CHECK(look(surface, 1e-9) == 2.5e-7);
  CHECK(look(surface_of(tests::grid(3, 3)), 1e-3) == 2.5e-7);  // no volume, no floor of its own
}

// Catches a change of what suites can name.
TEST_CASE("volume is one number of a frame") {
  const metrics::Metric metric = metrics::volume();
  CHECK(metric.name == "volume");
  CHECK(metric.domain == metrics::Domain::Frame);
  REQUIRE(metric.statistics.size() == 1);
  CHECK(metric.statistics[0].name == "change");
  CHECK(metric.statistics[0].aggregate == metrics::Aggregate::Sum);
  CHECK(metric.statistics[0].neutral == 0);
  CHECK((metric.statistics[0].limit && metric.statistics[0].drift));
}
