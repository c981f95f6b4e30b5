#include "metrics/metric.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <cmath>
#include <limits>
#include <numeric>
#include <vector>

using metrics::Aggregate;
using metrics::Domain;
using metrics::kNone;

namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();

metrics::Reading plain(Aggregate how, const std::vector<double>& values, double neutral = 0) {
  return metrics::aggregate(how, values, {}, neutral);
}

constexpr Aggregate kAll[] = {Aggregate::Max,   Aggregate::Min,   Aggregate::P99, Aggregate::Rms,
                              Aggregate::Count, Aggregate::Share, Aggregate::Sum};

}  // namespace

// Catches an extreme of the wrong kind, a tie that goes to a later element, a NaN that wins.
TEST_CASE("extremes name the lowest element that has them") {
  const std::vector<double> values{kNan, 2, -3, 7, 7, -3, kNan};
  CHECK(plain(Aggregate::Max, values).value == 7);
  CHECK(plain(Aggregate::Max, values).element == 3);
  CHECK(plain(Aggregate::Min, values).value == -3);
  CHECK(plain(Aggregate::Min, values).element == 2);
}

// Catches an index that is off by one or interpolates. Elementary: of the numbers 0 ... n - 1 the
// value is the index itself.
TEST_CASE("the percentile is the fixed order statistic") {
  for (const auto& [count, index] : std::vector<std::pair<int, double>>{
           {1, 0}, {2, 1}, {99, 98}, {100, 99}, {101, 99}, {102, 100}, {1000, 990}, {1001, 990}}) {
    std::vector<double> values(static_cast<std::size_t>(count));
    std::iota(values.begin(), values.end(), 0.0);
    std::reverse(values.begin(), values.end());
    CAPTURE(count);
    CHECK(plain(Aggregate::P99, values).value == index);
    CHECK(plain(Aggregate::P99, values).element == kNone);
    values.resize(values.size() + 300, kNan);  // undefined ones do not move the rank
    CHECK(plain(Aggregate::P99, values).value == index);
  }
}

// Catches a rank over all elements and a sign left to chance: the two zeros compare equal.
TEST_CASE("a percentile of zero is +0") {
  CHECK_FALSE(std::signbit(plain(Aggregate::P99, {-0.0, -0.0}).value));
}

// Catches a mean over all elements, a neutral value not taken off, weights not used in both sums.
// Elementary: ((3 - 1)^2 * 1 + (2 - 1)^2 * 4) / 5 = 8 / 5.
TEST_CASE("the rms is weighted and about the neutral value") {
  const std::vector<double> values{3, kNan, 2};
  const std::vector<double> weights{1, 100, 4};
  CHECK(metrics::aggregate(Aggregate::Rms, values, weights, 1).value == std::sqrt(8.0 / 5));
  CHECK(plain(Aggregate::Rms, {3, -4, kNan}).value == std::sqrt(12.5));
}

// Catches a share of the defined weights only: an undecided element still has its area.
TEST_CASE("counts, shares and sums leave undefined elements out") {
  const std::vector<double> values{1, 0, kNan, 1};
  const std::vector<double> weights{2, 3, 10, 5};
  CHECK(plain(Aggregate::Count, values).value == 2);
  CHECK(metrics::aggregate(Aggregate::Count, values, weights, 0).value == 2);
  CHECK(metrics::aggregate(Aggregate::Share, values, weights, 0).value == 7.0 / 20);
  CHECK(plain(Aggregate::Share, values).value == 0.5);
  CHECK(plain(Aggregate::Sum, {-0.25}).value == -0.25);
}

// Catches a NaN or a zero where there is nothing to measure, and a number where nothing is defined.
TEST_CASE("no element is neutral, only undefined ones are undefined") {
  for (const Aggregate how : kAll) {
    // Rms has the neutral value taken off already.
    CHECK(plain(how, {}, 1).value == (how == Aggregate::Rms ? 0 : 1));
    CHECK(plain(how, {}, 1).element == kNone);
    CHECK(std::isnan(plain(how, {kNan, kNan}, 1).value));
    CHECK(plain(how, {kNan, kNan}, 1).element == kNone);
  }
}

// Catches a plain running sum, whose error grows with the count: a million times 0.1 is off by
// 1e-6 there, pairwise by 1e-10. Elementary.
TEST_CASE("long sums keep their digits") {
  const std::vector<double> tenths(1000000, 0.1);
  CHECK(std::abs(metrics::fixed_sum(tenths) - 1e5) < 1e-9);
}

// Catches a sum whose blocks shift: a block of 128 values is added on its own, so what it swallows
// is decided by its own values. 1 beside 2^53 is lost in one block and kept across two.
TEST_CASE("sums run over blocks of 128") {
  std::vector<double> values(256, 0.0);
  values[0] = 0x1p53;
  for (std::size_t i = 64; i < 192; ++i) {
    values[i] = 1;
  }
  // The first block loses its 64 ones one by one, the second adds up 64 before it is joined.
  CHECK(metrics::fixed_sum(values) == 0x1p53 + 64);
  CHECK(metrics::fixed_sum({}) == 0);
}

// Catches blocks that are left out where their number is odd. Elementary: sum of 0 ... n - 1.
TEST_CASE("sums of any length are complete") {
  for (std::size_t count = 0; count < 1400; count += 37) {
    std::vector<double> values(count);
    std::iota(values.begin(), values.end(), 0.0);
    const auto n = static_cast<double>(count);
    CHECK(metrics::fixed_sum(values) == (count == 0 ? 0 : n * (n - 1) / 2));
  }
}

// Catches domains that are mixed up where a result is traced back to the mesh.
TEST_CASE("elements name their vertices") {
  const tests::Shape shape = tests::cube();
  const metrics::Surface surface = metrics::make_surface(shape.points, shape.faces);
  CHECK(metrics::element_count(surface, Domain::Frame) == 1);
  CHECK(metrics::element_count(surface, Domain::Asset) == 1);
  CHECK(metrics::element_count(surface, Domain::Vertex) == 8);
  CHECK(metrics::element_count(surface, Domain::Edge) == 18);
  CHECK(metrics::element_count(surface, Domain::Face) == 12);
  using Indices = std::vector<metrics::Index>;
  CHECK(metrics::element_vertices(surface, Domain::Frame, 0).empty());
  CHECK(metrics::element_vertices(surface, Domain::Asset, 0).empty());
  CHECK(metrics::element_vertices(surface, Domain::Vertex, 5) == Indices{5});
  CHECK(metrics::element_vertices(surface, Domain::Edge, 0) == Indices{0, 1});
  CHECK(metrics::element_vertices(surface, Domain::Face, 0) == Indices{0, 4, 6});
  CHECK(metrics::domain_name(Domain::Frame) == "frame");
  CHECK(metrics::domain_name(Domain::Vertex) == "vertex");
  CHECK(metrics::domain_name(Domain::Edge) == "edge");
  CHECK(metrics::domain_name(Domain::Face) == "face");
  CHECK(metrics::domain_name(Domain::Asset) == "asset");
}
