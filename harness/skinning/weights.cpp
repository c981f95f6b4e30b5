#include "harness/skinning/skinning.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace skinning {
namespace {

using metrics::Index;
using metrics::kNone;
using model::Influences;

// glTF 2.0, section 3.7.3.1, for weights stored as floats.
constexpr double kSumTolerance = 2e-7;

std::span<const double> run_weights(const Influences& influences, std::size_t vertex) {
  const std::size_t begin = influences.first[vertex];
  return std::span(influences.weight).subspan(begin, influences.first[vertex + 1] - begin);
}

double sum(std::span<const double> weights) {
  return std::accumulate(weights.begin(), weights.end(), 0.0);
}

/// Influences of a vertex, counted from the start of its run, heaviest first, ties by rank.
std::vector<std::size_t> heaviest_first(const Influences& influences, std::size_t vertex,
                                        std::span<const int> joint_rank) {
  const std::span<const double> weights = run_weights(influences, vertex);
  const std::size_t begin = influences.first[vertex];
  std::vector<std::size_t> order(weights.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    if (weights[a] != weights[b]) return weights[a] > weights[b];
    return joint_rank[influences.joint[begin + a]] < joint_rank[influences.joint[begin + b]];
  });
  return order;
}

/// The same runs with other weights; zeros are dropped.
Influences with_weights(const Influences& influences, const std::vector<double>& weight) {
  Influences result;
  result.first.reserve(influences.first.size());
  for (std::size_t v = 0; v < influences.first.size(); ++v) {
    const std::size_t begin = v == 0 ? 0 : influences.first[v - 1];
    for (std::size_t i = begin; i < influences.first[v]; ++i) {
      if (weight[i] == 0) continue;
      result.joint.push_back(influences.joint[i]);
      result.weight.push_back(weight[i]);
    }
    result.first.push_back(static_cast<Index>(result.joint.size()));
  }
  return result;
}

/// Repeated joints of a vertex added up where they occur first.
Influences merged(const Influences& influences, std::size_t joint_count) {
  std::vector<double> weight = influences.weight;
  std::vector<std::size_t> place(joint_count, 0);
  std::vector<Index> seen_at(joint_count, kNone);
  for (Index v = 0; v + 1 < influences.first.size(); ++v) {
    for (std::size_t i = influences.first[v]; i < influences.first[v + 1]; ++i) {
      const Index joint = influences.joint[i];
      if (seen_at[joint] == v) {
        weight[place[joint]] += weight[i];
        weight[i] = 0;
      } else {
        seen_at[joint] = v;
        place[joint] = i;
      }
    }
  }
  return with_weights(influences, weight);
}

/// Throws InputError unless all weights are as the glTF specification wants them.
void refuse_offences(const model::Rig& rig, const Influences& merged) {
  std::size_t sums = 0, negative = 0, unowned = 0, repeated = 0;
  std::string first;
  const auto offence = [&](std::size_t& counter, std::size_t vertex, const std::string& what) {
    ++counter;
    if (first.empty()) first = fmt::format("vertex {} {}", vertex, what);
  };
  for (std::size_t v = 0; v + 1 < rig.influences.first.size(); ++v) {
    const std::span<const double> weights = run_weights(rig.influences, v);
    if (weights.empty()) {
      offence(unowned, v, "has no weight at all");
      continue;
    }
    const double total = sum(weights);
    if (std::abs(total - 1) > kSumTolerance * static_cast<double>(weights.size())) {
      offence(sums, v, fmt::format("has weights that sum to {} instead of 1", total));
    }
    if (*std::min_element(weights.begin(), weights.end()) < 0) {
      offence(negative, v, "has a negative weight");
    }
    if (run_weights(merged, v).size() < weights.size()) offence(repeated, v, "names a joint twice");
  }
  if (first.empty()) return;
  throw base::InputError(
      fmt::format("{}. Vertices in all: {} with another sum than 1, {} with a negative weight, {} "
                  "without any, {} with a joint twice. Mend the weights of the asset, or set "
                  "\"weights\" of the suite to \"normalize\" or \"as_is\"",
                  first, sums, negative, unowned, repeated),
      rig.file);
}

/// Weights of a vertex in whole units of 1 / `steps` whose sum is that of the vertex, rounded:
/// all rounded down, what is missing to those with the largest remainders.
std::vector<double> rounded(const Influences& influences, std::size_t vertex, double steps,
                            std::span<const int> joint_rank) {
  const std::span<const double> weights = run_weights(influences, vertex);
  const std::size_t begin = influences.first[vertex];
  std::vector<double> units;
  std::vector<double> remainder;
  for (const double weight : weights) {
    units.push_back(std::floor(weight * steps));
    remainder.push_back(weight * steps - units.back());
  }
  std::vector<std::size_t> order(weights.size());
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    if (remainder[a] != remainder[b]) return remainder[a] > remainder[b];
    return joint_rank[influences.joint[begin + a]] < joint_rank[influences.joint[begin + b]];
  });
  double missing = std::floor(sum(weights) * steps + 0.5) - sum(units);
  for (const std::size_t i : order) {
    if (missing < 1) break;
    units[i] += 1;
    missing -= 1;
  }
  return units;
}

}  // namespace

Influences resolve_weights(const model::Rig& rig, model::WeightRule rule) {
  if (!rig.has_skin()) {
    Influences none;
    none.first.assign(rig.positions.size() + 1, 0);
    return none;
  }
  Influences result = merged(rig.influences, rig.joints.size());
  if (rule == model::WeightRule::Refuse) refuse_offences(rig, result);
  if (rule != model::WeightRule::Normalize) return result;
  for (std::size_t v = 0; v + 1 < result.first.size(); ++v) {
    const double total = sum(run_weights(result, v));
    if (!(total > 0)) continue;
    for (std::size_t i = result.first[v]; i < result.first[v + 1]; ++i) result.weight[i] /= total;
  }
  return result;
}

Influences keep_influences(const Influences& influences, std::size_t count,
                           std::span<const int> joint_rank) {
  if (count == 0) return influences;
  std::vector<double> weight = influences.weight;
  for (std::size_t v = 0; v + 1 < influences.first.size(); ++v) {
    const std::span<const double> weights = run_weights(influences, v);
    if (weights.size() <= count) continue;
    const std::span<double> kept = std::span(weight).subspan(influences.first[v], weights.size());
    const std::vector<std::size_t> order = heaviest_first(influences, v, joint_rank);
    for (std::size_t i = count; i < order.size(); ++i) kept[order[i]] = 0;
    const double total = sum(weights);
    const double left = sum(kept);
    if (left == 0) continue;
    for (double& one : kept) one = one * total / left;
  }
  return with_weights(influences, weight);
}

Influences round_weights(const Influences& influences, int bits, std::span<const int> joint_rank) {
  if (bits == 0) return influences;
  const double steps = static_cast<double>((std::uint64_t{1} << bits) - 1);
  std::vector<double> weight;
  weight.reserve(influences.weight.size());
  for (std::size_t v = 0; v + 1 < influences.first.size(); ++v) {
    for (const double units : rounded(influences, v, steps, joint_rank)) {
      weight.push_back(units / steps);
    }
  }
  return with_weights(influences, weight);
}

Index heaviest(const Influences& influences, std::size_t vertex, std::span<const int> joint_rank) {
  const std::span<const double> weights = run_weights(influences, vertex);
  const std::size_t begin = influences.first[vertex];
  Index best = kNone;
  for (Index i = 0; i < weights.size(); ++i) {
    if (best != kNone && weights[i] < weights[best]) continue;
    const bool tie = best != kNone && weights[i] == weights[best];
    if (tie &&
        joint_rank[influences.joint[begin + i]] >= joint_rank[influences.joint[begin + best]]) {
      continue;
    }
    best = i;
  }
  return best;
}

}  // namespace skinning
