#include "harness/judge.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace harness {

using metrics::Aggregate;
using metrics::Metric;
using metrics::Reading;
using metrics::Statistic;
using metrics::Values;
using model::Check;
using model::Verdict;

namespace {

constexpr double kInfinity = std::numeric_limits<double>::infinity();
constexpr double kFloorFactor = 4;
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

Check blank_check(const Plan& plan, const FrameEvidence& evidence) {
  Check check;
  check.statistic = plan.ref->name;
  check.kind = plan.drift ? "drift" : "limit";
  check.domain = plan.ref->domain();
  check.frame = evidence.frame;
  check.time = evidence.time;
  if (!plan.drift) {
    check.low = plan.limit.low;
    check.high = plan.limit.high;
  }
  return check;
}

// Names the element a check speaks of.
void place(Check& check, const FrameEvidence& evidence, std::size_t element) {
  if (element == metrics::kNone || check.domain == metrics::Domain::Frame) return;
  check.element = element;
  check.vertices = metrics::element_vertices(*evidence.today.surface, check.domain, element);
  Eigen::Vector3d sum = Eigen::Vector3d::Zero();
  for (const metrics::Index v : check.vertices) sum += evidence.today.points[v];
  sum /= static_cast<double>(std::max<std::size_t>(check.vertices.size(), 1));
  if (std::isfinite(sum.x()) && std::isfinite(sum.y()) && std::isfinite(sum.z()))
    check.place = {sum.x(), sum.y(), sum.z()};
}

void set_used(Check& check, double used) {
  if (std::isfinite(used))
    check.used = used;
  else
    check.over = true;
}

Check undefined_check(Check check, std::string reason) {
  check.verdict = Verdict::Beyond;
  check.over = true;
  check.reason = std::move(reason);
  return check;
}

// Element whose value lies farthest from neutral: what a percentile or mean is shown at.
std::size_t farthest(const Values& values, double neutral) {
  std::size_t best = metrics::kNone;
  double most = 0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    const double away = std::abs(values[i] - neutral);
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
  place(check, evidence, single ? reading.element : farthest(values, neutral));
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

// Drift of one measurement in one frame, before any tolerance.
struct Drift {
  Values amount;  // NaN: undefined in both, or undecided
  Values floors;  // of the reference
  Values golden;  // values of the reference; empty where there are none
  std::vector<bool> undecided;
  std::size_t undecided_count = 0;
  bool undecided_grew = false;
  std::size_t lone = 0;  // defined in only one of the two
  std::size_t lone_element = metrics::kNone;
};

// Elements too small for the noise of positions. `slack` widens the bound: today's count uses a
// wider one than the golden's, so that an element on the edge of it never looks like growth.
std::size_t count_undecided(const Metric& metric, const Values& floors, double slack) {
  return static_cast<std::size_t>(std::count_if(floors.begin(), floors.end(), [&](double floor) {
    return kFloorFactor * floor > slack * metric.undecidable;
  }));
}

Drift drift_of(const Metric& metric, std::size_t index, const FrameEvidence& evidence) {
  constexpr double kSlack = 4;
  const Side& today = evidence.today;
  const Side& golden = evidence.reference;
  const metrics::Posed posed{today.points, {}, evidence.delta};
  const metrics::Posed posed_golden{golden.points, {}, evidence.delta};
  Drift drift;
  drift.golden = golden.measured->fields[index];
  if (metric.compare != nullptr) {
    metric.compare(*golden.surface, posed, posed_golden, drift.amount);
  } else {
    const Values& current = today.measured->fields[index];
    drift.amount.resize(current.size());
    for (std::size_t i = 0; i < current.size(); ++i) {
      const double a = current[i];
      const double b = drift.golden[i];
      drift.amount[i] = metric.difference != nullptr ? metric.difference(a, b) : std::abs(a - b);
      if (std::isnan(a) != std::isnan(b)) {
        ++drift.lone;
        drift.lone_element = std::min(drift.lone_element, i);
      }
    }
  }
  drift.floors.assign(drift.amount.size(), 0);
  drift.undecided.assign(drift.amount.size(), false);
  if (metric.floors == nullptr) return drift;
  metric.floors(*golden.surface, posed_golden, drift.floors);
  for (std::size_t i = 0; i < drift.floors.size(); ++i) {
    if (!(kFloorFactor * drift.floors[i] > metric.undecidable)) continue;
    drift.undecided[i] = true;
    drift.amount[i] = std::numeric_limits<double>::quiet_NaN();
    ++drift.undecided_count;
  }
  if (std::isfinite(metric.undecidable)) {
    Values floors_today;
    metric.floors(*today.surface, posed, floors_today);
    drift.undecided_grew =
        count_undecided(metric, floors_today, kSlack) > count_undecided(metric, drift.floors, 1);
  }
  return drift;
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

Check judge_drift(const Plan& plan, const FrameEvidence& evidence, const Drift& drift) {
  Check check = blank_check(plan, evidence);
  const Metric& metric = *plan.ref->metric;
  const Aggregate how = plan.ref->statistic->aggregate;
  check.undecided = drift.undecided_count;

  Values allowances(drift.amount.size(), std::numeric_limits<double>::quiet_NaN());
  std::size_t worst = metrics::kNone;
  double most = -1;
  for (std::size_t i = 0; i < drift.amount.size(); ++i) {
    if (std::isnan(drift.amount[i])) continue;
    const double golden =
        i < drift.golden.size() ? drift.golden[i] : std::numeric_limits<double>::quiet_NaN();
    allowances[i] = allowance(plan, drift.floors[i], golden);
    const double used = used_of_drift(drift.amount[i], allowances[i]);
    if (drift.amount[i] > allowances[i]) ++check.failing;
    // Where nothing is allowed, the largest of those over is the worst.
    const bool larger =
        used == kInfinity && most == kInfinity && drift.amount[i] > drift.amount[worst];
    if (used > most || larger) {
      most = used;
      worst = i;
    }
  }

  const bool flagged = how == Aggregate::Count || how == Aggregate::Share;
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
    if (flagged) check.failing = value > *check.allowance ? check.failing : 0;
    if (how == Aggregate::Rms) check.failing = 0;
  }
  if (check.value) {
    set_used(check, used_of_drift(*check.value, *check.allowance));
    if (*check.value > *check.allowance) check.verdict = Verdict::Beyond;
    place(check, evidence, worst);
  }
  if (drift.lone > 0) {
    place(check, evidence, drift.lone_element);
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

}  // namespace

double used_of_limit(double value, double neutral, const model::LimitBound& limit) {
  if (limit.between && (neutral < *limit.low || neutral > *limit.high)) {
    const double half = (*limit.high - *limit.low) / 2;
    const double away = std::abs(value - (*limit.low + half));
    return half > 0 ? away / half : (away > 0 ? kInfinity : 0);
  }
  if (value == neutral) return 0;
  const std::optional<double>& bound = value > neutral ? limit.high : limit.low;
  if (!bound) return 0;
  const double room = std::abs(*bound - neutral);
  return room > 0 ? std::abs(value - neutral) / room : kInfinity;
}

bool worse(const Check& a, const Check& b) {
  if (a.verdict != b.verdict) return a.verdict > b.verdict;
  if (a.over != b.over) return a.over;
  if (a.over && a.value.has_value() != b.value.has_value()) return !a.value.has_value();
  if (a.over && a.value) return std::abs(*a.value) > std::abs(*b.value);
  return a.used.value_or(-1) > b.used.value_or(-1);
}

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
