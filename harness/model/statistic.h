#pragma once

#include "metrics/metric.h"

#include <string>
#include <vector>

namespace model {

/// A statistic by its whole name; exactly one of `metric` and `asset` is set.
struct StatisticRef {
  std::string name;  ///< "edge_stretch.max"
  const metrics::Metric* metric = nullptr;
  const metrics::AssetMetric* asset = nullptr;
  const metrics::Statistic* statistic = nullptr;
  std::size_t index = 0;     ///< of the metric in its catalog
  std::size_t position = 0;  ///< of the statistic in the metric

  metrics::Domain domain() const { return asset ? metrics::Domain::Asset : metric->domain; }
};

/// Every statistic this build knows, measurements of the asset last.
const std::vector<StatisticRef>& statistics();

/// Null when there is none of that name.
const StatisticRef* find_statistic(const std::string& name);

}  // namespace model
