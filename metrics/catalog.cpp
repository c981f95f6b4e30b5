#include "metrics/catalog.h"

namespace metrics {

const std::vector<Metric>& catalog() {
  static const std::vector<Metric> metrics = {
#define METRIC(name) name(),
#define ASSET_METRIC(name)
#include "metrics/catalog.def"
#undef METRIC
#undef ASSET_METRIC
  };
  return metrics;
}

const std::vector<AssetMetric>& asset_catalog() {
  static const std::vector<AssetMetric> metrics = {
#define METRIC(name)
#define ASSET_METRIC(name) name(),
#include "metrics/catalog.def"
#undef METRIC
#undef ASSET_METRIC
  };
  return metrics;
}

}  // namespace metrics
