#include "metrics/catalog.h"

#include "metrics/elementary.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <numeric>
#include <set>
#include <string>

using metrics::Index;
using metrics::Metric;
using metrics::Point;
using tests::Blend;

namespace {

// A closed limb with a seam: an uneven tube joined with a cube of hard edges, both around the
// joint.
tests::Shape character() {
  tests::Random random(11);
  auto shape = tests::tube({.rings = 13, .sides = 12, .length = 5, .ends = tests::Ends::Capped});
  for (Point& p : shape.points) {
    p += random.point(-0.05, 0.05);
  }
  auto box = tests::split_cube(0.8);
  box.points = tests::moved(box.points, tests::rotation({1, 1, 0}, 0.3), {2, 0, -0.5});
  return tests::joined(shape, box);
}

// Twins move apart in `skin`, so that seams count as well.
tests::Skinned opened(tests::Skinned skin) {
  tests::Random random(5);
  for (Point& p : skin.points) {
    p += random.point(-0.01, 0.01);
  }
  return skin;
}

tests::Skinned skin_of(const metrics::Points& rest, double radians, Blend blend) {
  return opened(tests::limb(rest, {1, 0.2, 0.3}, radians, 0.7, blend));
}

// The same mesh with vertices and faces in another order, faces from another corner.
struct Order {
  std::vector<Index> vertex, face;  // old number by new number

  explicit Order(const tests::Shape& shape, std::uint64_t seed)
      : vertex(shape.points.size()), face(shape.faces.size()) {
    tests::Random random(seed);
    for (auto* numbers : {&vertex, &face}) {
      std::iota(numbers->begin(), numbers->end(), Index{0});
      for (std::size_t i = numbers->size(); i > 1; --i) {
        std::swap((*numbers)[i - 1], (*numbers)[random.bits() % i]);
      }
    }
  }

  template <typename Value>
  std::vector<Value> vertices(const std::vector<Value>& values) const {
    std::vector<Value> result;
    for (const Index old : vertex) {
      result.push_back(values[old]);
    }
    return result;
  }

  tests::Shape shape(const tests::Shape& old) const {
    std::vector<Index> number(vertex.size());
    for (std::size_t i = 0; i < vertex.size(); ++i) {
      number[vertex[i]] = static_cast<Index>(i);
    }
    tests::Shape result{vertices(old.points), {}};
    for (std::size_t f = 0; f < face.size(); ++f) {
      metrics::Face corners = old.faces[face[f]];
      std::rotate(corners.begin(), corners.begin() + f % 3, corners.end());
      for (Index& corner : corners) {
        corner = number[corner];
      }
      result.faces.push_back(corners);
    }
    return result;
  }

  tests::Skinned skin(const tests::Skinned& old) const {
    return {vertices(old.points), vertices(old.carried)};
  }
};

std::string full_name(const Metric& metric, const metrics::Statistic& statistic) {
  return std::string(metric.name) + "." + std::string(statistic.name);
}

}  // namespace

// Catches: a measurement that is forgotten, listed twice or out of order, a word left out of it.
TEST_CASE("catalog describes every measurement once") {
  std::set<std::string> names;
  for (const Metric& metric : metrics::catalog()) {
    CAPTURE(metric.name);
    for (const auto text : {metric.name, metric.unit, metric.summary, metric.undefined,
                            metric.cannot_see, metric.source}) {
      CHECK_FALSE(text.empty());
    }
    CHECK((metric.measure != nullptr || metric.compare != nullptr));
    CHECK_FALSE(metric.statistics.empty());
    for (const auto& statistic : metric.statistics) {
      CHECK(names.insert(full_name(metric, statistic)).second);
      CHECK((statistic.limit || statistic.drift));
      CHECK((metric.measure != nullptr || !statistic.limit));
      CHECK((metric.domain == metrics::Domain::Frame) ==
            (statistic.aggregate == metrics::Aggregate::Sum));
    }
  }
  for (const metrics::AssetMetric& metric : metrics::asset_catalog()) {
    CAPTURE(metric.name);
    for (const auto text : {metric.name, metric.unit, metric.summary, metric.undefined,
                            metric.cannot_see, metric.source}) {
      CHECK_FALSE(text.empty());
    }
    CHECK(metric.measure != nullptr);
    CHECK(metric.always.size() == metric.statistics.size());
    for (const auto& statistic : metric.statistics) {
      CHECK(names.insert(std::string(metric.name) + "." + std::string(statistic.name)).second);
      CHECK(statistic.limit);
      CHECK_FALSE(statistic.drift);
    }
  }
  // What users write into suites: a name that disappears breaks them.
  const std::set<std::string> known = {
      "position.max",     "position.p99",     "position.rms",     "volume.change",
      "edge_stretch.max", "edge_stretch.min", "edge_stretch.p99", "edge_stretch.rms",
      "flips.count",      "flips.area",       "dihedral.max",     "dihedral.rms",
      "defect.max",       "seam_gap.max",     "finite.bad",       "weights.sum_error",
      "weights.unowned",  "weights.negative", "bind.residual"};
  CHECK(std::includes(names.begin(), names.end(), known.begin(), known.end()));
}

// Catches: a value, floor or drift of another size than the domain has elements.
TEST_CASE("every measurement has one value per element") {
  const auto surface = tests::surface_of(character());
  const auto skin = skin_of(surface.rest, 1, Blend::Linear);
  for (const Metric& metric : metrics::catalog()) {
    CAPTURE(metric.name);
    const std::size_t count = metrics::element_count(surface, metric.domain);
    metrics::Values values(3, 7);  // as left over from another mesh
    if (metric.measure != nullptr) {
      metric.measure(surface, skin.posed(1e-6), values);
      CHECK(values.size() == count);
    }
    if (metric.floors != nullptr) {
      metric.floors(surface, skin.posed(1e-6), values);
      CHECK(values.size() == count);
      CHECK(std::all_of(values.begin(), values.end(), [](double v) { return v >= 0; }));
    }
    CHECK(tests::drifts(metric, surface, skin.posed(), skin.posed()).size() == count);
    if (metric.weights != nullptr) {
      CHECK(metric.weights(surface).size() == count);
    }
  }
}

// Catches: a neutral value that a skin at rest does not have, a drift from itself.
TEST_CASE("every statistic of the rest pose is neutral") {
  const auto surface = tests::surface_of(character());
  const auto rest = tests::resting(surface.rest);
  for (const Metric& metric : metrics::catalog()) {
    for (const auto& statistic : metric.statistics) {
      CAPTURE(full_name(metric, statistic));
      if (statistic.limit) {
        CHECK(tests::limit_of(metric, statistic.name, surface, rest.posed()) == statistic.neutral);
      }
      if (statistic.drift) {
        CHECK(tests::drift_of(metric, statistic.name, surface, rest.posed(), rest.posed()) == 0);
      }
    }
  }
}

// Catches: a measurement that depends on where the character stands or which way it looks.
TEST_CASE("every limit statistic of a rigid motion is neutral") {
  const auto surface = tests::surface_of(character());
  tests::Random random(2);
  for (const double radians : {0.5, 2.0, metrics::kPi}) {
    const auto skin = tests::turned(surface.rest, tests::quaternion(random.point(-1, 1), radians),
                                    random.point(-9, 9));
    for (const Metric& metric : metrics::catalog()) {
      for (const auto& statistic : metric.statistics) {
        CAPTURE(full_name(metric, statistic), radians);
        if (statistic.limit) {
          CHECK(tests::limit_of(metric, statistic.name, surface, skin.posed()) ==
                Approx(statistic.neutral).margin(1e-11));
        }
      }
    }
  }
}

// Catches: a result that depends on the numbering of vertices and faces, e.g. a representative of
// twins, a face's first corner or an order of sums.
TEST_CASE("every statistic is the same in another order of vertices and faces") {
  const auto shape = character();
  const auto surface = tests::surface_of(shape);
  const auto golden = skin_of(shape.points, 0.5, Blend::Linear);
  const auto skin = skin_of(shape.points, 2.5, Blend::Linear);
  for (std::uint64_t seed = 1; seed <= 3; ++seed) {
    const Order order(shape, seed);
    const auto other_surface = tests::surface_of(order.shape(shape));
    const auto other_golden = order.skin(golden);
    const auto other_skin = order.skin(skin);
    for (const Metric& metric : metrics::catalog()) {
      for (const auto& statistic : metric.statistics) {
        CAPTURE(full_name(metric, statistic), seed);
        if (statistic.limit) {
          const double one = tests::limit_of(metric, statistic.name, surface, skin.posed());
          const double other =
              tests::limit_of(metric, statistic.name, other_surface, other_skin.posed());
          CHECK(other == Approx(one).epsilon(1e-12).margin(1e-13));
          CHECK((metric.name == "finite" || one != statistic.neutral));
        }
        if (statistic.drift) {
          const double one =
              tests::drift_of(metric, statistic.name, surface, skin.posed(), golden.posed());
          const double other = tests::drift_of(metric, statistic.name, other_surface,
                                               other_skin.posed(), other_golden.posed());
          CHECK(other == Approx(one).epsilon(1e-12).margin(1e-13));
        }
      }
    }
  }
}

// Catches: a measurement that gives a non-finite number instead of NaN, or reads beyond its mesh,
// on meshes that are hardly any.
TEST_CASE("no measurement stumbles over poor meshes") {
  const std::vector<tests::Shape> shapes = {
      {},
      {{{1, 2, 3}}, {}},
      {{{1, 2, 3}, {1, 2, 3}, {1, 2, 3}}, {{0, 1, 2}, {0, 0, 0}}},
      {{{0, 0, 0}, {1, 0, 0}, {2, 0, 0}}, {{0, 1, 2}}},
      {tests::tetra().points, {{0, 1, 2}, {0, 1, 2}, {2, 1, 0}, {0, 1, 3}}},
      tests::exploded(tests::tetra())};
  for (std::size_t i = 0; i < shapes.size(); ++i) {
    const auto surface = tests::surface_of(shapes[i]);
    auto skin = tests::resting(surface.rest);
    for (Point& p : skin.points) {
      p.x() = 0;  // and flattened
    }
    const auto rest = tests::resting(surface.rest);
    for (const Metric& metric : metrics::catalog()) {
      for (const auto& statistic : metric.statistics) {
        CAPTURE(full_name(metric, statistic), i);
        if (statistic.limit) {
          CHECK_FALSE(
              std::isinf(tests::limit_of(metric, statistic.name, surface, skin.posed(1e-6))));
        }
        if (statistic.drift) {
          CHECK_FALSE(std::isinf(tests::drift_of(metric, statistic.name, surface, skin.posed(1e-6),
                                                 rest.posed(1e-6))));
        }
      }
    }
  }
}
