#include "harness/report/findings.h"

#include "harness/report/text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace report {
namespace {

using model::CaseResult;
using model::Check;
using model::Verdict;

constexpr std::size_t kMostRows = 6;
constexpr std::size_t kJointWidth = 20;
constexpr std::size_t kStatisticWidth = 24;

std::string with_unit(double value, std::string_view statistic, int digits = 4) {
  return number_text(value, digits) + unit_text(statistic);
}

std::string place_text(const Check& check) {
  if (!check.place) return "";
  const auto& [x, y, z] = *check.place;
  return fmt::format("{}, {}, {}", number_text(x, 3), number_text(y, 3), number_text(z, 3));
}

std::string time_text(const Check& check) {
  return check.time ? number_text(*check.time) + " s" : "";
}

// How many elements exceed the bound, e.g. "14 edges".
std::string failing_text(const Check& check) {
  using metrics::Domain;
  if (check.failing == 0) return "";
  switch (check.domain) {
    case Domain::Vertex:
      return check.failing == 1 ? "1 vertex" : fmt::format("{} vertices", check.failing);
    case Domain::Edge:
      return counted(check.failing, "edge");
    case Domain::Face:
      return counted(check.failing, "face");
    case Domain::Frame:
    case Domain::Asset:
      break;
  }
  return "";
}

}  // namespace

VerdictCounts count_verdicts(const model::SuiteResult& suite) {
  VerdictCounts counts{};
  for (const CaseResult& result : suite.cases) ++counts[static_cast<std::size_t>(result.verdict)];
  return counts;
}

VerdictCounts count_verdicts(const model::RunResult& run) {
  VerdictCounts counts{};
  for (const model::SuiteResult& suite : run.suites) {
    const VerdictCounts part = count_verdicts(suite);
    for (std::size_t i = 0; i < counts.size(); ++i) counts[i] += part[i];
  }
  return counts;
}

std::string counts_text(const VerdictCounts& counts) {
  std::string text;
  for (std::size_t i = 0; i < counts.size(); ++i)
    if (counts[i] > 0)
      text += fmt::format("{}{} {}", text.empty() ? "" : ", ", counts[i],
                          model::verdict_name(static_cast<Verdict>(i)));
  return text;
}

std::string unit_text(std::string_view statistic) {
  const std::string_view name = statistic.substr(0, statistic.find('.'));
  std::string_view unit;
  for (const metrics::Metric& metric : metrics::catalog())
    if (metric.name == name) unit = metric.unit;
  for (const metrics::AssetMetric& metric : metrics::asset_catalog())
    if (metric.name == name) unit = metric.unit;
  return unit == "D" ? " D" : unit == "deg" ? "°" : "";
}

std::string bound_text(const Check& check) {
  const auto with = [&](double value) { return with_unit(value, check.statistic); };
  if (check.low && check.high) return with(*check.low) + " … " + with(*check.high);
  if (check.high) return "≤ " + with(*check.high);
  if (check.low) return "≥ " + with(*check.low);
  if (check.allowance) return "≤ " + with(*check.allowance);
  return check.golden ? "= " + with(*check.golden) : "";
}

std::string value_text(const Check& check) {
  if (!check.value) return check.kind == "limit" || check.kind == "drift" ? "undefined" : "";
  int digits = 4;
  std::string text = with_unit(*check.value, check.statistic, digits);
  for (const std::optional<double>& bound : {check.low, check.high, check.allowance})
    while (check.verdict == Verdict::Beyond && bound && *bound != *check.value && digits < 17 &&
           text == with_unit(*bound, check.statistic, digits))
      text = with_unit(*check.value, check.statistic, ++digits);
  return text;
}

std::string used_text(const Check& check) {
  if (!check.used) return check.verdict == Verdict::Beyond ? "over" : "";
  const double used = *check.used;
  if (used > 99999) return ">99999x";
  if (used > 1) {
    if (used < 1.1) return fmt::format("{:.3f}x", std::ceil(used * 1000) / 1000);
    return used < 10 ? fmt::format("{:.1f}x", used) : fmt::format("{:.0f}x", used);
  }
  if (used == 0) return "0 %";
  if (used < 0.001) return "<0.1 %";
  // Only what is on its bound is 100 %.
  return used < 0.01 ? fmt::format("{:.1f} %", used * 100)
                     : fmt::format("{:.0f} %", used < 1 ? std::min(used * 100, 99.0) : 100.0);
}

std::string sentence(const Check& check) {
  const std::string name = base::visible(check.statistic);
  const std::string used = used_text(check);
  std::string text;
  if (check.kind == "limit") {
    text = fmt::format("{} is {}, bound {}", name, value_text(check), bound_text(check));
  } else if (check.kind == "drift") {
    text = fmt::format("{} drifted by {} from the golden, allowed {}", name, value_text(check),
                       bound_text(check));
  } else {
    text = fmt::format("{} ({})", name, base::visible(check.kind));
    if (check.value) text += fmt::format(": {}", value_text(check));
    if (const std::string bound = bound_text(check); !bound.empty())
      text += fmt::format(", expected {}", bound);
  }
  if (!used.empty()) text += fmt::format(" ({})", used);
  if (check.frame) text += fmt::format(", frame {}", *check.frame);
  if (check.time) text += fmt::format(" at {}", time_text(check));
  if (!check.joint.empty()) text += fmt::format(", joint {}", base::visible(check.joint));
  if (!check.reason.empty()) text += fmt::format("; {}", base::visible(check.reason));
  return text;
}

const Check* most_used(const CaseResult& result) {
  const Check* most = nullptr;
  double largest = -1;
  for (const Check& check : result.checks) {
    const bool over = !check.used && check.verdict == Verdict::Beyond;
    const double used = over ? HUGE_VAL : check.used.value_or(-1);
    if (used > largest) {
      most = &check;
      largest = used;
    }
  }
  return most;
}

std::vector<std::string> beyond_lines(const CaseResult& result, std::size_t width) {
  std::vector<Row> rows;
  std::vector<std::string> reasons;
  std::size_t beyond = 0;
  for (const Check& check : result.checks) {
    if (check.verdict != Verdict::Beyond || ++beyond > kMostRows) continue;
    const std::string statistic = shortened(base::visible(check.statistic), kStatisticWidth);
    rows.push_back({statistic, base::visible(check.kind), value_text(check), bound_text(check),
                    used_text(check), check.frame ? std::to_string(*check.frame) : "",
                    time_text(check), shortened(base::visible(check.joint), kJointWidth),
                    failing_text(check), place_text(check)});
    if (!check.reason.empty())
      reasons.push_back(fmt::format("{}: {}", statistic, base::visible(check.reason)));
  }
  if (rows.empty()) return {};
  std::vector<std::string> lines = table({{"statistic"},
                                          {"check"},
                                          {"value", Align::Right},
                                          {"bound", Align::Right},
                                          {"used", Align::Right},
                                          {"frame", Align::Right},
                                          {"time", Align::Right, 3},
                                          {"joint"},
                                          {"failing", Align::Right, 2},
                                          {"place", Align::Left, 1}},
                                         std::move(rows), width);
  if (beyond > kMostRows)
    lines.push_back(fmt::format("… and {} beyond", counted(beyond - kMostRows, "more check")));
  lines.insert(lines.end(), reasons.begin(), reasons.end());
  return lines;
}

std::string change_remark(const CaseResult& result) {
  const bool drifted = std::any_of(
      result.checks.begin(), result.checks.end(),
      [](const Check& check) { return check.verdict == Verdict::Beyond && check.kind != "limit"; });
  std::string changed;
  for (const std::string& group : result.changed)
    changed += (changed.empty() ? "" : ", ") + base::visible(group);
  if (!changed.empty()) return "changed since sign-off: " + changed;
  if (!drifted || !result.against.empty()) return "";
  return "no input changed since sign-off: the code did";
}

std::vector<std::string> remarks(const CaseResult& result) {
  std::vector<std::string> lines;
  if (std::string change = change_remark(result); !change.empty())
    lines.push_back(std::move(change));
  for (const std::string& note : result.notes) lines.push_back("note: " + base::visible(note));
  return lines;
}

}  // namespace report
