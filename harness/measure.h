#pragma once

#include "metrics/metric.h"

#include <vector>

namespace harness {

/// The values of every measurement of the catalog in one frame, in its order. With non-finite
/// coordinates only `finite` is measured, the others are empty.
struct Measured {
  bool finite = true;
  std::vector<metrics::Values> fields;
};

Measured measure(const metrics::Surface& surface, const metrics::Posed& posed);

/// The rest shape measured as a frame: what a change against rest starts from.
Measured measure_rest(const metrics::Surface& surface);

/// What a limit bounds, per element: the values of metric `index`, as change against rest where the
/// metric says so. Empty when it was not measured.
metrics::Values limit_values(std::size_t index, const Measured& measured, const Measured& rest);

/// A statistic of such values, as it stands in series and limits.
metrics::Reading limit_reading(const metrics::Surface& surface, std::size_t index,
                               std::size_t position, const metrics::Values& values);

}  // namespace harness
