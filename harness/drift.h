#pragma once

#include "harness/judge.h"

namespace harness {

/// Drift of one measurement in one frame, before any tolerance.
struct Drift {
  metrics::Values amount;  ///< per element; NaN: undefined in both, or undecided
  metrics::Values floors;  ///< per element, of the reference
  metrics::Values golden;  ///< values of the reference; empty where there are none
  std::size_t undecided_count = 0;
  bool undecided_grew = false;
  std::size_t lone = 0;  ///< elements defined in only one of the two
  std::size_t lone_element = metrics::kNone;
};

/// Both skins must be finite, unless the measurement is `finite`. `index`: in the catalog.
Drift drift_of(const metrics::Metric& metric, std::size_t index, const FrameEvidence& evidence);

/// Holds a drift against a plan: each element against max(4 floor, absolute, relative |golden|).
model::Check judge_drift(const Plan& plan, const FrameEvidence& evidence, const Drift& drift);

}  // namespace harness
