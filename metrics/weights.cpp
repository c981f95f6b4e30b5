#include "metrics/catalog.h"

#include <cmath>

namespace metrics {
namespace {

std::vector<Reading> measure(const Surface& /*surface*/, const Binding& binding) {
  Reading sum_error{0, kNone};
  Reading unowned{0, kNone};
  Reading negative{0, kNone};
  double lowest = 0;
  for (std::size_t v = 0; v < binding.positions.size(); ++v) {
    double sum = 0;
    bool owned = false;
    for (Index i = binding.first[v]; i < binding.first[v + 1]; ++i) {
      const double weight = binding.weight[i];
      sum += weight;
      owned = owned || weight != 0;
      if (weight < 0) {
        negative.value += 1;
      }
      if (weight < lowest) {
        lowest = weight;
        negative.element = v;
      }
    }
    if (!owned) {
      unowned.value += 1;
      unowned.element = std::min<std::size_t>(unowned.element, v);
    } else if (std::abs(1 - sum) > sum_error.value) {
      sum_error = {std::abs(1 - sum), v};
    }
  }
  return {sum_error, unowned, negative};
}

}  // namespace

AssetMetric weights() {
  return {
      .name = "weights",
      .unit = "1",
      .summary =
          "of the weights as in the file: largest distance of a vertex's sum from 1, "
          "vertices without any weight, negative weights",
      .undefined = "nowhere; vertices without any weight have no sum and are counted by .unowned",
      .cannot_see = "weights to the wrong joint",
      .source = "common practice, no source",
      .statistics = {{.name = "sum_error", .aggregate = Aggregate::Max, .drift = false},
                     {.name = "unowned", .aggregate = Aggregate::Count, .drift = false},
                     {.name = "negative", .aggregate = Aggregate::Count, .drift = false}},
      .always = {1e-3, 0, 0},
      .measure = measure,
  };
}

}  // namespace metrics
