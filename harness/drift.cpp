#include "harness/drift.h"

#include "harness/check.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace harness {

using metrics::Aggregate;
using metrics::Metric;
using metrics::Values;
using model::Check;
using model::Verdict;

namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr double kFloorFactor = 4;

// Elements too small for the noise of positions. `slack` widens the bound: today's count uses a
// wider one than the golden's, so that an element on the edge of it never looks like growth.
std::size_t count_undecided(const Metric& metric, const Values& floors, double slack) {
  return static_cast<std::size_t>(std::count_if(floors.begin(), floors.end(), [&](double floor) {
    return kFloorFactor * floor > slack * metric.undecidable;
  }));
}

std::size_t count_undefined(const Values& values) {
  return static_cast<std::size_t>(
      std::count_if(values.begin(), values.end(), [](double value) { return std::isnan(value); }));
}

double allowance(const Plan& plan, double floor, double golden) {
  double bound = std::max(kFloorFactor * floor, plan.absolute);
  if (plan.relative > 0 && std::isfinite(golden))
    bound = std::max(bound, plan.relative * std::abs(golden));
  return bound;
}

double used_of_drift(double value, double bound) {
  if (value <= bound) return bound > 0 ? value / bound : 0;
  return bound > 0 ? value / bound : kInfinity;
}

}  // namespace

Drift drift_of(const Metric& metric, std::size_t index, const FrameEvidence& evidence) {
  constexpr double kSlack = 4;
  const Side& today = evidence.today;
  const Side& golden = evidence.reference;
  const metrics::Posed posed{today.points, {}, evidence.delta};
  const metrics::Posed posed_golden{golden.points, {}, evidence.delta};
  Drift drift;
  drift.golden = golden.measured->fields[index];
  if (metric.floors != nullptr) {
    metric.floors(*golden.surface, posed_golden, drift.floors);
    drift.undecided_count = count_undecided(metric, drift.floors, 1);
    if (std::isfinite(metric.undecidable)) {
      Values floors_today;
      metric.floors(*today.surface, posed, floors_today);
      drift.undecided_grew = count_undecided(metric, floors_today, kSlack) > drift.undecided_count;
    }
  }
  if (metric.compare != nullptr) {
    metric.compare(*golden.surface, posed, posed_golden, drift.amount);
    drift.floors.resize(drift.amount.size(), 0);
    if (metric.floors == nullptr && metric.domain != metrics::Domain::Frame) {
      // Without floors the comparison itself leaves out what is too thin: each skin with itself.
      drift.undecided_count = count_undefined(drift.amount);
      const metrics::Posed slack{today.points, {}, evidence.delta / kSlack};
      Values alone;
      metric.compare(*golden.surface, slack, slack, alone);
      const std::size_t thin_today = count_undefined(alone);
      metric.compare(*golden.surface, posed_golden, posed_golden, alone);
      drift.undecided_grew = thin_today > count_undefined(alone);
    }
    return drift;
  }
  const Values& current = today.measured->fields[index];
  drift.amount.assign(current.size(), std::numeric_limits<double>::quiet_NaN());
  drift.floors.resize(current.size(), 0);
  for (std::size_t i = 0; i < current.size(); ++i) {
    const double a = current[i];
    const double b = drift.golden[i];
    if (kFloorFactor * drift.floors[i] > metric.undecidable) continue;
    drift.amount[i] = metric.difference != nullptr ? metric.difference(a, b) : std::abs(a - b);
    if (std::isnan(a) != std::isnan(b)) {
      ++drift.lone;
      drift.lone_element = std::min(drift.lone_element, i);
    }
  }
  return drift;
}

Check judge_drift(const Plan& plan, const FrameEvidence& evidence, const Drift& drift) {
  Check check = blank_check(plan, evidence);
  const Metric& metric = *plan.ref->metric;
  const Aggregate how = plan.ref->statistic->aggregate;
  check.undecided = drift.undecided_count;
  const bool flagged = how == Aggregate::Count || how == Aggregate::Share;

  Values allowances(drift.amount.size(), std::numeric_limits<double>::quiet_NaN());
  std::size_t worst = metrics::kNone;
  double most = -1;
  for (std::size_t i = 0; i < drift.amount.size(); ++i) {
    if (std::isnan(drift.amount[i])) continue;
    const double golden =
        i < drift.golden.size() ? drift.golden[i] : std::numeric_limits<double>::quiet_NaN();
    allowances[i] = allowance(plan, drift.floors[i], golden);
    const double used = used_of_drift(drift.amount[i], allowances[i]);
    if (drift.amount[i] > (flagged ? 0 : allowances[i])) ++check.failing;
    // Where nothing is allowed, the largest of those over is the worst.
    const bool larger =
        used == kInfinity && most == kInfinity && drift.amount[i] > drift.amount[worst];
    if (used > most || larger) {
      most = used;
      worst = i;
    }
  }

  if (how == Aggregate::Max || how == Aggregate::Sum) {
    if (worst != metrics::kNone) {
      check.value = drift.amount[worst];
      check.allowance = allowances[worst];
      if (worst < drift.golden.size() && !std::isnan(drift.golden[worst]))
        check.golden = drift.golden[worst];
    }
  } else {
    const std::span<const double> weights = metric.weights == nullptr
                                                ? std::span<const double>()
                                                : metric.weights(*evidence.reference.surface);
    const double value = metrics::aggregate(how, drift.amount, weights, 0).value;
    if (!std::isnan(value)) {
      check.value = value;
      check.allowance =
          flagged ? allowance(plan, 0, 0) : metrics::aggregate(how, allowances, weights, 0).value;
    }
    if (how == Aggregate::Rms) check.failing = 0;
  }
  if (check.value) {
    set_used(check, used_of_drift(*check.value, *check.allowance));
    if (*check.value > *check.allowance) check.verdict = Verdict::Beyond;
    if (flagged && check.verdict == Verdict::Within) check.failing = 0;
    place_check(check, evidence, worst);
  }
  if (drift.lone > 0) {
    place_check(check, evidence, drift.lone_element);
    return undefined_check(
        std::move(check),
        fmt::format("defined in only one of golden and result on {} {}{}", drift.lone,
                    metrics::domain_name(metric.domain), drift.lone == 1 ? "" : "s"));
  }
  if (drift.undecided_grew && check.verdict == Verdict::Within)
    return undefined_check(std::move(check),
                           "more elements than in the golden are too thin to be judged");
  return check;
}

}  // namespace harness
