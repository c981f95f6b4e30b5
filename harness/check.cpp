#include "harness/check.h"

#include <algorithm>
#include <cmath>

namespace harness {

using model::Check;
using model::Verdict;

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

void place_check(Check& check, const FrameEvidence& evidence, std::size_t element) {
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
  check.used.reset();
  check.reason = std::move(reason);
  return check;
}

double used_of_limit(double value, double neutral, const model::LimitBound& limit) {
  if (limit.between && (neutral < *limit.low || neutral > *limit.high)) {
    const double half = (*limit.high - *limit.low) / 2;
    const double away = std::abs(value - (*limit.low + half));
    return half > 0 ? away / half : (away > 0 ? std::numeric_limits<double>::infinity() : 0);
  }
  if (value == neutral) return 0;
  const std::optional<double>& bound = value > neutral ? limit.high : limit.low;
  if (!bound) return 0;
  const double room = std::abs(*bound - neutral);
  return room > 0 ? std::abs(value - neutral) / room : std::numeric_limits<double>::infinity();
}

namespace {

// How far a value lies outside its bounds, in its own unit.
double excess(const Check& check) {
  if (!check.value) return std::numeric_limits<double>::infinity();
  const double above = *check.value - check.high.value_or(check.allowance.value_or(*check.value));
  const double below = check.low.value_or(*check.value) - *check.value;
  return std::max(above, below);
}

}  // namespace

bool worse(const Check& a, const Check& b) {
  if (a.verdict != b.verdict) return a.verdict > b.verdict;
  if (a.over != b.over) return a.over;
  if (a.over) return excess(a) > excess(b);
  return a.used.value_or(-1) > b.used.value_or(-1);
}

}  // namespace harness
