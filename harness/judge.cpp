#include "harness/judge.h"

#include "harness/check.h"
#include "harness/drift.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace harness {

using metrics::Aggregate;
using metrics::Metric;
using metrics::Reading;
using metrics::Values;
using model::Check;
using model::Verdict;

namespace {

const std::string kNonFinite = "undefined in this frame: some coordinates are no finite numbers";

bool within(double value, const model::LimitBound& limit) {
  return (!limit.low || value >= *limit.low) && (!limit.high || value <= *limit.high);
}

// The absolute part of a profile for a statistic, in its unit (README, "profiles").
double profile_bound(model::Profile profile, const std::string& metric) {
  if (profile != model::Profile::Reexport) return 0;
  static const std::map<std::string, double> kReexport{
      {"position", 5e-5}, {"seam_gap", 5e-5}, {"edge_stretch", 5e-3},
      {"dihedral", 0.5},  {"volume", 5e-5},   {"defect", 2e-3 * 180 / 3.14159265358979323846}};
  const auto found = kReexport.find(metric);
  return found == kReexport.end() ? 0 : found->second;
}

// Element that a statistic of many is shown at: for a percentile the one that uses most of the
// bound, else the one farthest from the centre.
std::size_t farthest(const Values& values, double centre, const model::LimitBound& limit,
                     Aggregate how) {
  std::size_t best = metrics::kNone;
  double most = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    if (std::isnan(values[i])) continue;
    const double away = how == Aggregate::P99 ? used_of_limit(values[i], centre, limit)
                                              : std::abs(values[i] - centre);
    if (away > most) {
      most = away;
      best = i;
    }
  }
  return best;
}

Check judge_limit(const Plan& plan, const FrameEvidence& evidence, const Values& values,
                  const Reading& reading) {
  Check check = blank_check(plan, evidence);
  const Metric& metric = *plan.ref->metric;
  if (std::isnan(reading.value)) {
    if (plan.implied) return check;
    return undefined_check(std::move(check),
                           evidence.today.measured->finite
                               ? fmt::format("undefined in this frame: {}", metric.undefined)
                               : kNonFinite);
  }
  const double neutral = plan.ref->statistic->neutral;
  check.value = reading.value;
  set_used(check, used_of_limit(reading.value, neutral, plan.limit));
  if (!within(reading.value, plan.limit)) check.verdict = Verdict::Beyond;

  const Aggregate how = plan.ref->statistic->aggregate;
  const bool single = how == Aggregate::Max || how == Aggregate::Min;
  const double centre = how == Aggregate::Rms ? metric.centre : neutral;
  place_check(check, evidence,
              single ? reading.element : farthest(values, centre, plan.limit, how));
  const Values& rest = evidence.rest->fields[plan.ref->index];
  for (std::size_t i = 0; i < values.size(); ++i) {
    const bool flagged = how == Aggregate::Count || how == Aggregate::Share;
    if (std::isnan(values[i])) {
      if (i < rest.size() && !std::isnan(rest[i])) ++check.undecided;
    } else if (flagged ? values[i] != 0 && check.verdict == Verdict::Beyond
                       : !within(values[i], plan.limit)) {
      ++check.failing;
    }
  }
  if (how == Aggregate::Rms) check.failing = 0;  // a mean has no failing elements
  return check;
}

}  // namespace

std::vector<Plan> plan_checks(const model::CaseSpec& spec, bool has_skin, bool has_reference) {
  std::vector<Plan> plans;
  const auto removed = [](const std::vector<std::string>& names, const std::string& name) {
    return std::find(names.begin(), names.end(), name) != names.end();
  };
  for (const model::StatisticRef& ref : model::statistics()) {
    Plan plan;
    plan.ref = &ref;
    if (const auto found = spec.limits.find(ref.name); found != spec.limits.end()) {
      plan.limit = found->second;
    } else {
      plan.implied = true;
      if (ref.asset != nullptr && has_skin) plan.limit.high = ref.asset->always[ref.position];
      if (ref.name == "finite.bad") plan.limit.high = 0;
    }
    const bool bounded = plan.limit.low || plan.limit.high;
    if (bounded && !removed(spec.removed_limits, ref.name)) plans.push_back(plan);
  }
  if (!has_reference) return plans;
  for (const model::StatisticRef& ref : model::statistics()) {
    if (ref.asset != nullptr || !ref.statistic->drift || removed(spec.removed_drift, ref.name))
      continue;
    Plan plan;
    plan.ref = &ref;
    plan.drift = true;
    plan.absolute = profile_bound(spec.profile, std::string(ref.metric->name));
    const auto found = spec.drift.find(ref.name);
    if (found == spec.drift.end() && spec.profile == model::Profile::Exact) continue;
    if (found != spec.drift.end()) {
      if (found->second.at_most) plan.absolute = *found->second.at_most;
      plan.relative = found->second.relative;
    }
    plans.push_back(plan);
  }
  return plans;
}

FrameVerdict judge_frame(std::span<const Plan> plans, const FrameEvidence& evidence) {
  FrameVerdict out;
  const std::vector<Metric>& catalog = metrics::catalog();
  std::vector<Values> limits(catalog.size());
  std::vector<Reading> readings;
  for (std::size_t i = 0; i < catalog.size(); ++i)
    if (catalog[i].measure != nullptr)
      limits[i] = limit_values(i, *evidence.today.measured, *evidence.rest);
  for (const model::StatisticRef& ref : model::statistics()) {
    if (ref.asset != nullptr) continue;
    Reading reading;
    const bool measured = evidence.today.measured->finite || ref.metric->name == "finite";
    if (ref.statistic->limit && measured)
      reading = limit_reading(*evidence.today.surface, ref.index, ref.position, limits[ref.index]);
    if (ref.statistic->limit) out.series[ref.name] = reading.value;
    readings.push_back(reading);
  }
  std::vector<std::optional<Drift>> drifts(catalog.size());
  for (const Plan& plan : plans) {
    if (plan.ref->asset != nullptr) continue;
    const std::size_t i = plan.ref->index;
    if (!plan.drift) {
      const auto at = static_cast<std::size_t>(plan.ref - model::statistics().data());
      out.checks.push_back(judge_limit(plan, evidence, limits[i], readings[at]));
      continue;
    }
    const bool finite_today = evidence.today.measured->finite;
    const bool finite_golden = evidence.reference.measured->finite;
    if (catalog[i].name != "finite" && !(finite_today && finite_golden)) {
      Check check = blank_check(plan, evidence);
      out.checks.push_back(finite_today == finite_golden  // undefined in both: nothing to compare
                               ? check
                               : undefined_check(check, kNonFinite));
      continue;
    }
    if (!drifts[i]) drifts[i] = drift_of(catalog[i], i, evidence);
    out.checks.push_back(judge_drift(plan, evidence, *drifts[i]));
  }
  return out;
}

std::vector<Check> judge_asset(std::span<const Plan> plans, const metrics::Surface& surface,
                               const metrics::Binding& binding) {
  std::vector<Check> checks;
  std::map<std::string, std::vector<Reading>> measured;
  for (const Plan& plan : plans) {
    if (plan.ref->asset == nullptr) continue;
    Check check;
    check.statistic = plan.ref->name;
    check.kind = "limit";
    check.domain = metrics::Domain::Asset;
    check.low = plan.limit.low;
    check.high = plan.limit.high;
    std::vector<Reading>& readings = measured[std::string(plan.ref->asset->name)];
    if (readings.empty() && !binding.first.empty())
      readings = plan.ref->asset->measure(surface, binding);
    const Reading reading = readings.empty() ? Reading{} : readings[plan.ref->position];
    if (std::isnan(reading.value)) {
      if (!plan.implied)
        checks.push_back(undefined_check(std::move(check),
                                         fmt::format("undefined: {}", plan.ref->asset->undefined)));
      continue;
    }
    check.value = reading.value;
    set_used(check, used_of_limit(reading.value, plan.ref->statistic->neutral, plan.limit));
    if (!within(reading.value, plan.limit)) check.verdict = Verdict::Beyond;
    if (reading.element != metrics::kNone) {
      check.vertices = {static_cast<metrics::Index>(reading.element)};
      const metrics::Point& at = surface.rest[reading.element];
      check.place = {at.x(), at.y(), at.z()};
    }
    checks.push_back(std::move(check));
  }
  return checks;
}

}  // namespace harness
