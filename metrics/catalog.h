#pragma once

#include "metrics/metric.h"

namespace metrics {

// One function per line of catalog.def, defined in the file of that name.
#define METRIC(name) Metric name();
#define ASSET_METRIC(name) AssetMetric name();
#include "metrics/catalog.def"
#undef METRIC
#undef ASSET_METRIC

}  // namespace metrics
