#include "metrics/catalog.h"
#include "tests/support/limb.h"

#include <catch2/catch.hpp>

using metrics::Index;
using metrics::Reading;

namespace {

using Row = std::vector<double>;  // weights of one vertex

std::vector<Reading> weigh(const std::vector<Row>& rows) {
  std::vector<Index> first = {0};
  std::vector<double> weight;
  for (const Row& row : rows) {
    weight.insert(weight.end(), row.begin(), row.end());
    first.push_back(static_cast<Index>(weight.size()));
  }
  const std::vector<Index> joint(weight.size(), 0);
  const metrics::Points positions(rows.size(), {0, 0, 0});
  const std::vector<double> scale(rows.size(), 1);
  return metrics::weights().measure(metrics::Surface{}, {.first = first,
                                                         .joint = joint,
                                                         .weight = weight,
                                                         .bind_scale = scale,
                                                         .positions = positions,
                                                         .bind_product = {}});
}

}  // namespace

// Catches: a sum of magnitudes, a sum error that cancels between vertices, the wrong vertex named.
TEST_CASE("weights.sum_error is the largest distance of a sum from 1") {
  const auto clean = weigh({{1}, {0.5, 0.5}, {0.25, 0.25, 0.5}});
  CHECK(clean[0].value == 0);
  CHECK(clean[0].element == metrics::kNone);
  const auto readings = weigh({{1}, {0.5, 0.375}, {0.5, 0.75}, {0.75}, {-0.25, 1.25}});
  CHECK(readings[0].value == 0.25);
  CHECK(readings[0].element == 2);  // the lowest of two
}

// Catches: a vertex without weight that is taken for a sum error of 1, or zeros taken for weights.
TEST_CASE("weights.unowned counts vertices without any weight") {
  const auto readings = weigh({{1}, {}, {0, 0}, {0.5, 0.5}});
  CHECK(readings[1].value == 2);
  CHECK(readings[1].element == 1);
  CHECK(readings[0].value == 0);
  CHECK(weigh({{1}})[1].value == 0);
}

// Catches: negative weights hidden by a sum of 1, vertices counted instead of weights.
TEST_CASE("weights.negative counts negative weights and names the lowest") {
  const auto readings = weigh({{1}, {-0.25, 1.5, -0.25}, {-0.5, 1.5}, {1, -0.0}, {-0.125, 1.125}});
  CHECK(readings[2].value == 4);
  CHECK(readings[2].element == 2);
  CHECK(readings[0].value == 0);
}
