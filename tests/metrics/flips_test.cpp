#include "metrics/catalog.h"
#include "metrics/elementary.h"
#include "tests/support/limb.h"

#include <Eigen/Geometry>
#include <catch2/catch.hpp>

#include <cmath>

using metrics::flips;
using metrics::kDegree;
using metrics::kPi;
using metrics::Point;
using tests::Blend;
using tests::Quaternion;

namespace {

double flipped(const metrics::Surface& surface, const metrics::Posed& posed) {
  return tests::limit_of(flips(), "count", surface, posed);
}

// A plane of 9 x 9 vertices of which the middle one is pushed past its neighbour.
metrics::Points pushed(const metrics::Surface& plane) {
  metrics::Points points = plane.rest;
  points[40].x() += 0.2;
  return points;
}

metrics::Surface plane_of_nine() {
  return tests::surface_of(tests::grid(9, 9, 0.125));
}

Point normal(const metrics::Points& points, const metrics::Face& face) {
  return (points[face[1]] - points[face[0]]).cross(points[face[2]] - points[face[0]]);
}

// What a comparison with the rest normal as it is would call flipped.
std::size_t turned_away(const metrics::Surface& surface, const metrics::Points& points) {
  std::size_t count = 0;
  for (const metrics::Face& face : surface.faces) {
    count += normal(points, face).dot(normal(surface.rest, face)) < 0 ? 1U : 0U;
  }
  return count;
}

}  // namespace

// Catches: comparing with the rest normal as it is, which calls most of a turned sphere flipped.
// Source: 896 of 1280 faces with the naive comparison, measured by an independent implementation.
TEST_CASE("flips does not see a rigid turn") {
  const auto surface = tests::surface_of(tests::icosphere(3));
  const auto half_turn = tests::turned(surface.rest, tests::quaternion({0, 0, 1}, kPi));
  CHECK(turned_away(surface, half_turn.points) == 896);
  CHECK(flipped(surface, half_turn.posed()) == 0);
  tests::Random random(1);
  for (int i = 0; i < 10; ++i) {
    const Quaternion q = tests::quaternion(random.point(-1, 1), random.uniform(-kPi, kPi));
    const auto skin = tests::turned(surface.rest, q, random.point(-5, 5));
    CHECK(flipped(surface, skin.posed()) == 0);
    CHECK(tests::limit_of(flips(), "area", surface, skin.posed()) == 0);
  }
}

// Catches: a flip that depends on the orientation of the model; a share that is not of the area.
// Source: the orientation of the faces in the plane, elementary.
TEST_CASE("flips finds the two faces a vertex is pushed over") {
  const auto surface = plane_of_nine();
  const auto points = pushed(surface);
  REQUIRE(turned_away(surface, points) == 2);
  tests::Random random(7);
  for (int i = 0; i < 4; ++i) {
    const Quaternion q = tests::quaternion(random.point(-1, 1), i * random.uniform(0, kPi));
    const auto skin = tests::turned(points, q);
    CHECK(flipped(surface, skin.posed()) == 2);
    CHECK(tests::limit_of(flips(), "area", surface, skin.posed()) ==
          Approx(2 / 128.0).epsilon(1e-14));
  }
}

// Catches: an area that counts faces. The flipped face has 3 of the 4 units of area.
TEST_CASE("flips.area weighs faces by their rest area") {
  const metrics::Points rest = {{0, 0, 0}, {3, 0, 0}, {0, 2, 0}, {-1, 0, 0}};
  const auto surface = metrics::make_surface(rest, {{0, 1, 2}, {0, 2, 3}});
  auto skin = tests::resting(rest);
  skin.points[1] = {-3, 0, 0};
  CHECK(flipped(surface, skin.posed()) == 1);
  CHECK(tests::limit_of(flips(), "area", surface, skin.posed()) == Approx(0.75).epsilon(1e-14));
}

// Catches: a test by neighbours, which cannot see that the whole inside of an elbow has turned
// over, and a rest normal carried by the wrong mean. Source: derived here. With linear weights over
// [-a, a] the line on the inside, at distance r from the joint, runs backwards at the joint as soon
// as cos(t/2) < (r/a) sin(t/2): linear blending from t = 2 atan(a/r). Dual quaternions turn it by
// the angle phi(w) whose largest slope is 4 tan(t/4): from t = 4 atan(a/(2r)).
TEST_CASE("flips begin on the inside of an elbow where theory says") {
  const auto surface = tests::surface_of(tests::tube({.rings = 401, .sides = 16, .length = 8}));
  for (const double a : {0.5, 1.0, 2.0}) {
    const auto count = [&](double degrees, Blend blend) {
      const auto skin = tests::limb(surface.rest, Point::UnitX(), degrees * kDegree, a, blend);
      return flipped(surface, skin.posed(1e-9));
    };
    const double linear = 2 * std::atan(a) / kDegree;
    CHECK(count(linear - 0.5, Blend::Linear) == 0);
    CHECK(count(linear + 0.5, Blend::Linear) > 0);
    const double dual = 4 * std::atan(a / 2) / kDegree;
    CHECK(count(dual - 0.5, Blend::DualQuaternion) == 0);
    if (dual < 179) {  // at 180 degrees the two bones have no mean
      CHECK(count(dual + 0.5, Blend::DualQuaternion) > 0);
    }
    CHECK(count(20, Blend::Linear) == 0);
  }
}

// Catches: rotations added up without regard to q and -q being the same rotation.
TEST_CASE("flips does not depend on the sign of the rotations") {
  const auto surface = plane_of_nine();
  auto skin = tests::turned(pushed(surface), tests::quaternion({1, 2, 3}, 2));
  const auto values = tests::measured(flips(), surface, skin.posed());
  tests::Random random(4);
  for (auto& q : skin.carried) {
    q *= random.uniform(0, 1) < 0.5 ? -1 : 1;
  }
  CHECK(tests::measured(flips(), surface, skin.posed()) == values);
  CHECK(flipped(surface, skin.posed()) == 2);
}

// Catches: a guess where nothing is known. Faces around one vertex have no rotation; without any
// rotation no face has one.
TEST_CASE("flips is undecided where the rotations have no mean") {
  const auto surface = plane_of_nine();
  const auto undefined = [&](const metrics::Posed& posed) {
    const auto values = tests::measured(flips(), surface, posed);
    return std::count_if(values.begin(), values.end(), [](double v) { return std::isnan(v); });
  };
  auto skin = tests::resting(surface.rest);
  CHECK(undefined(skin.posed()) == 0);
  skin.carried[40].setConstant(std::numeric_limits<double>::quiet_NaN());
  CHECK(undefined(skin.posed()) == 6);
  CHECK(flipped(surface, skin.posed()) == 0);
  skin.carried[40] = {1, 0, 0, 0};  // half a turn from its neighbours
  CHECK(undefined(skin.posed()) == 6);
  skin.carried[39] = {std::sqrt(0.5), 0, 0, std::sqrt(0.5)};  // in the middle of two of them
  CHECK(undefined(skin.posed()) == 6);
  CHECK(undefined({skin.points, {}, 0}) == 128);
  CHECK(std::isnan(flipped(surface, {skin.points, {}, 0})));
}

// Catches: rounding that is reported as a flip. Below 16 delta of altitude a face is undecided.
TEST_CASE("flips is undecided on slivers, whichever shape has them") {
  const metrics::Points wide = {{0, 0, 0}, {2, 0, 0}, {1, 1, 0}};
  const metrics::Points thin = {{0, 0, 0}, {2, 0, 0}, {1, -1e-3, 0}};
  const auto value = [](const metrics::Points& rest, const metrics::Points& posed, double delta) {
    const auto surface = metrics::make_surface(rest, {{0, 1, 2}});
    const auto skin = tests::resting(posed);
    return tests::measured(flips(), surface, skin.posed(delta))[0];
  };
  CHECK(value(wide, thin, 1e-3 / 16.1) == 1);
  CHECK(std::isnan(value(wide, thin, 1e-3 / 15.9)));
  CHECK(value(thin, wide, 1e-3 / 16.1) == 1);
  CHECK(std::isnan(value(thin, wide, 1e-3 / 15.9)));

  const metrics::Points flat = {{0, 0, 0}, {2, 0, 0}, {1, -1e-13, 0}};
  CHECK(std::isnan(value(wide, flat, 0)));  // collapsed, and no flip
  CHECK(std::isnan(value(wide, metrics::Points(3, Point(1, 1, 1)), 0)));
}

// Catches: a drift that wants joints, that reports a turned model, or that judges slivers.
TEST_CASE("flips drifts where a normal turns against the golden's") {
  const auto surface = plane_of_nine();
  const auto golden = tests::resting(surface.rest);
  const metrics::Points points = pushed(surface);
  const auto count = [&](const metrics::Points& current, double delta) {
    return tests::drift_of(flips(), "count", surface, {current, {}, delta},
                           {golden.points, {}, delta});
  };
  CHECK(count(points, 0) == 2);
  CHECK(count(surface.rest, 0) == 0);
  CHECK(tests::drift_of(flips(), "area", surface, {points, {}, 0}, golden.posed()) ==
        Approx(2 / 128.0).epsilon(1e-14));
  const auto nearly = tests::turned(surface.rest, tests::quaternion({1, 0, 0}, 89 * kDegree));
  const auto past = tests::turned(surface.rest, tests::quaternion({1, 0, 0}, 91 * kDegree));
  CHECK(count(nearly.points, 0) == 0);
  CHECK(count(past.points, 0) == 128);
  CHECK(std::isnan(count(past.points, 0.125)));  // all altitudes below 16 delta
}
