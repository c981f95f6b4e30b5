#pragma once

#include "harness/measure.h"
#include "harness/model/result.h"
#include "harness/model/statistic.h"
#include "harness/model/suite.h"

#include <map>
#include <span>
#include <string>
#include <vector>

namespace harness {

/// One bound that a case is held against in every frame.
struct Plan {
  const model::StatisticRef* ref = nullptr;
  bool drift = false;
  bool implied = false;  ///< set always, not by the suite: skipped where it is undefined
  model::LimitBound limit;
  double absolute = 0, relative = 0;  ///< of a drift
};

/// What a suite asks of a case, and what is always asked. Drift only where there is something to
/// compare with; bounds of joints only where there are some.
std::vector<Plan> plan_checks(const model::CaseSpec& spec, bool has_skin, bool has_reference);

/// One skin in one frame, as judging sees it.
struct Side {
  const metrics::Surface* surface = nullptr;
  std::span<const metrics::Point> points;
  const Measured* measured = nullptr;
};

/// One frame of a case, today's skin and what it is compared with.
struct FrameEvidence {
  std::size_t frame = 0;
  double time = 0;
  Side today;
  const Measured* rest = nullptr;  ///< today's rest shape, measured
  Side reference;                  ///< surface null: nothing to compare with
  double delta = 0;                ///< position noise for drift, file units
};

struct FrameVerdict {
  std::vector<model::Check> checks;      ///< one per plan of a frame measurement, same order
  std::map<std::string, double> series;  ///< every statistic as limit
};

/// Holds one frame against all plans whose statistic is not of the asset.
FrameVerdict judge_frame(std::span<const Plan> plans, const FrameEvidence& evidence);

/// Holds measurements of the asset against the plans that bound them.
std::vector<model::Check> judge_asset(std::span<const Plan> plans, const metrics::Surface& surface,
                                      const metrics::Binding& binding);

/// Whether `a` is worse than `b`: worse verdict, then over its bound without measure, then used.
bool worse(const model::Check& a, const model::Check& b);

/// How much of a limit a value uses (README, "used"); negative infinity never occurs.
double used_of_limit(double value, double neutral, const model::LimitBound& limit);

}  // namespace harness
