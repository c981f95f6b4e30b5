#include "harness/model/statistic.h"

#include <algorithm>

namespace model {

namespace {

std::string whole_name(std::string_view metric, std::string_view statistic) {
  return std::string(metric) + "." + std::string(statistic);
}

std::vector<StatisticRef> collected() {
  std::vector<StatisticRef> all;
  for (std::size_t i = 0; i < metrics::catalog().size(); ++i) {
    const metrics::Metric& metric = metrics::catalog()[i];
    for (std::size_t k = 0; k < metric.statistics.size(); ++k)
      all.push_back({whole_name(metric.name, metric.statistics[k].name), &metric, nullptr,
                     &metric.statistics[k], i, k});
  }
  for (std::size_t i = 0; i < metrics::asset_catalog().size(); ++i) {
    const metrics::AssetMetric& asset = metrics::asset_catalog()[i];
    for (std::size_t k = 0; k < asset.statistics.size(); ++k)
      all.push_back({whole_name(asset.name, asset.statistics[k].name), nullptr, &asset,
                     &asset.statistics[k], i, k});
  }
  return all;
}

}  // namespace

const std::vector<StatisticRef>& statistics() {
  static const std::vector<StatisticRef> all = collected();
  return all;
}

const StatisticRef* find_statistic(const std::string& name) {
  const auto& all = statistics();
  const auto found =
      std::find_if(all.begin(), all.end(), [&](const StatisticRef& s) { return s.name == name; });
  return found == all.end() ? nullptr : &*found;
}

}  // namespace model
