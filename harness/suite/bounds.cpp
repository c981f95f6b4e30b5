#include "harness/model/statistic.h"
#include "harness/suite/sections.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace suite {

using base::Json;
using base::JsonView;

namespace {

enum class Use { Limit, Drift };

bool fits(const model::StatisticRef& ref, Use use) {
  return use == Use::Limit ? ref.statistic->limit : ref.statistic->drift;
}

// The statistic a key names, or null and a problem.
const model::StatisticRef* statistic(const JsonView& view, const std::string& key, Use use) {
  const model::StatisticRef* ref = model::find_statistic(key);
  if (ref != nullptr && fits(*ref, use)) return ref;
  if (ref != nullptr) {
    view.fail(
        key,
        use == Use::Limit
            ? fmt::format("'{}' exists only as drift: it has no meaning without a golden", key)
            : fmt::format("'{}' exists only as a limit: it is not compared with a golden", key));
    return nullptr;
  }
  std::vector<std::string> known;
  for (const auto& each : model::statistics())
    if (fits(each, use)) known.push_back(each.name);
  view.fail(key, fmt::format("unknown statistic '{}'{}", key, base::hint(key, known)));
  return nullptr;
}

std::optional<double> bound(JsonView& view, const std::string& key) {
  const Json* value = view.member(key, Json::Kind::Number);
  return value == nullptr ? std::nullopt : std::optional(value->number);
}

model::LimitBound read_limit(JsonView view, const metrics::Statistic& statistic) {
  model::LimitBound limit;
  limit.low = bound(view, "at_least");
  limit.high = bound(view, "at_most");
  if (limit.high && *limit.high < statistic.neutral)
    view.fail("at_most", fmt::format("{} is below {}, the value of an undeformed skin: every frame "
                                     "would be beyond",
                                     *limit.high, statistic.neutral));
  if (limit.low && *limit.low > statistic.neutral)
    view.fail("at_least",
              fmt::format("{} is above {}, the value of an undeformed skin: every frame "
                          "would be beyond",
                          *limit.low, statistic.neutral));
  if (view.member("between") != nullptr) {
    if (limit.low || limit.high)
      view.fail("between", "\"between\" stands alone, without \"at_most\" or \"at_least\"");
    const std::vector<double> ends = view.numbers("between", 2);
    if (!ends.empty()) {
      limit = {ends[0], ends[1], true};
      if (!(ends[0] <= ends[1]))
        view.fail("between", "the first number must not exceed the second");
    }
  } else if (view.is_object() && !limit.low && !limit.high) {
    view.fail("a limit needs \"at_most\", \"at_least\" or \"between\"");
  }
  view.close();
  return limit;
}

model::DriftBound read_drift(JsonView view, const metrics::Statistic& statistic) {
  model::DriftBound drift;
  drift.at_most = bound(view, "at_most");
  if (drift.at_most && *drift.at_most < 0)
    view.fail("at_most", "a drift is never negative: 0 or more was expected");
  drift.relative = view.number("relative", 0, {0, 1e6});
  const bool counts = statistic.aggregate == metrics::Aggregate::Count ||
                      statistic.aggregate == metrics::Aggregate::Share;
  if (counts && drift.relative > 0)
    view.fail("relative", "what is counted has no relative part; say \"at_most\"");
  if (view.is_object() && !drift.at_most && view.json().find("relative") == nullptr)
    view.fail("a drift bound needs \"at_most\" or \"relative\"");
  view.close();
  return drift;
}

model::Profile read_profile(JsonView& view) {
  const Json* value = view.member("profile", Json::Kind::String);
  if (value == nullptr || value->string == "rounding") return model::Profile::Rounding;
  if (value->string == "exact") return model::Profile::Exact;
  if (value->string == "reexport") return model::Profile::Reexport;
  const std::vector<std::string> known{"exact", "rounding", "reexport"};
  const bool later = value->string == "compressed" || value->string == "visible";
  view.fail("profile", later ? fmt::format("not in this version: profile '{}'", value->string)
                             : fmt::format("unknown profile '{}'{}", value->string,
                                           base::hint(value->string, known)));
  return model::Profile::Rounding;
}

}  // namespace

Bounds read_bounds(JsonView& object) {
  Bounds bounds;
  if (const Json* limits = object.member("limits", Json::Kind::Object)) {
    const JsonView view = object.child("limits", *limits);
    for (const auto& [key, value] : limits->members) {
      const model::StatisticRef* ref = statistic(view, key, Use::Limit);
      if (ref == nullptr) continue;
      bounds.limits[key] = value.kind == Json::Kind::Null
                               ? std::nullopt
                               : std::optional(read_limit(view.child(key, value), *ref->statistic));
    }
  }
  if (const Json* drift = object.member("drift", Json::Kind::Object)) {
    JsonView view = object.child("drift", *drift);
    if (drift->find("profile") != nullptr) bounds.profile = read_profile(view);
    for (const auto& [key, value] : drift->members) {
      if (key == "profile") continue;
      const model::StatisticRef* ref = statistic(view, key, Use::Drift);
      if (ref == nullptr) continue;
      bounds.drift[key] = value.kind == Json::Kind::Null
                              ? std::nullopt
                              : std::optional(read_drift(view.child(key, value), *ref->statistic));
    }
  }
  return bounds;
}

void apply_bounds(const Bounds& bounds, model::CaseSpec& spec) {
  const auto lay = [](const auto& from, auto& kept, std::vector<std::string>& removed) {
    for (const auto& [key, bound] : from) {
      std::erase(removed, key);
      if (bound) {
        kept[key] = *bound;
      } else {
        kept.erase(key);
        removed.push_back(key);
      }
    }
  };
  lay(bounds.limits, spec.limits, spec.removed_limits);
  lay(bounds.drift, spec.drift, spec.removed_drift);
  if (bounds.profile) spec.profile = *bounds.profile;
}

}  // namespace suite
