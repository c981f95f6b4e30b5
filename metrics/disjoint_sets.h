#pragma once

#include "metrics/surface.h"

#include <algorithm>
#include <numeric>
#include <utility>
#include <vector>

namespace metrics {

/// Sets of the numbers 0 … count - 1 that can be united; the lowest member stands for its set, so
/// the outcome does not depend on the order of the unions.
class DisjointSets {
 public:
  explicit DisjointSets(std::size_t count) : parent_(count) {
    std::iota(parent_.begin(), parent_.end(), Index{0});
  }

  Index root(Index i) {
    while (parent_[i] != i) {
      parent_[i] = parent_[parent_[i]];
      i = parent_[i];
    }
    return i;
  }

  bool same(Index a, Index b) { return root(a) == root(b); }

  void unite(Index a, Index b) {
    const auto [low, high] = std::minmax({root(a), root(b)});
    parent_[high] = low;
  }

  /// The lowest member of the set of every number.
  std::vector<Index> roots() {
    std::vector<Index> result(parent_.size());
    for (std::size_t i = 0; i < result.size(); ++i) {
      result[i] = root(static_cast<Index>(i));
    }
    return result;
  }

 private:
  std::vector<Index> parent_;
};

}  // namespace metrics
