#pragma once

#include "harness/report/report.h"

#include <limits>
#include <string>
#include <vector>

/// Results made up for the tests of reports.
namespace sample {

inline constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

/// Names as a hostile file may hold them: control characters, right-to-left override, markup, ends
/// of CDATA and JSON, characters that XML cannot hold, 300 letters.
inline const std::vector<std::string>& hostile_names() {
  static const std::vector<std::string> names = {std::string("nul\0and\x01\x1b[31m\x7f", 13),
                                                 "line\nfeed\r\ttab",
                                                 "\u202Egnp.exe\u202C",
                                                 "\u2066\u200Bhidden\uFEFF",
                                                 R"("quoted" 'single' \ back)",
                                                 "<script>alert(1)</script>",
                                                 "]]>&amp;<!--",
                                                 "\uFFFE\uFFFF",
                                                 "骨盤.L",
                                                 std::string(300, 'x'),
                                                 ""};
  return names;
}

inline model::Check drift(std::string statistic, double value, double allowance) {
  model::Check check;
  check.statistic = std::move(statistic);
  check.kind = "drift";
  check.domain = metrics::Domain::Edge;
  check.value = value;
  check.golden = 1.21;
  check.allowance = allowance;
  check.used = value / allowance;
  check.verdict = value > allowance ? model::Verdict::Beyond : model::Verdict::Within;
  check.frame = 9;
  check.time = 0.375;
  check.element = 1204;
  check.vertices = {88, 91};
  check.place = {0.1, 0.8, -0.25};
  check.joint = "shin.L";
  check.failing = value > allowance ? 14 : 0;
  check.undecided = 2;
  return check;
}

inline model::Check limit(std::string statistic, double value, std::optional<double> low,
                          std::optional<double> high, double used) {
  model::Check check;
  check.statistic = std::move(statistic);
  check.kind = "limit";
  check.value = value;
  check.low = low;
  check.high = high;
  check.used = used;
  check.verdict = used > 1 ? model::Verdict::Beyond : model::Verdict::Within;
  check.frame = 3;
  check.time = 0.125;
  return check;
}

inline model::CaseResult result(std::string motion, model::Verdict verdict) {
  model::CaseResult out;
  out.rig = "lod0";
  out.motion = std::move(motion);
  out.method = "ship";
  out.name = out.rig + '/' + out.motion + '/' + out.method;
  out.frames = 14;
  out.vertices = 6120;
  out.verdict = verdict;
  return out;
}

/// A case beyond with every field set.
inline model::CaseResult beyond() {
  model::CaseResult out = result("knee", model::Verdict::Beyond);
  out.inputs = {{"positions", "aa11"}, {"faces", "bb22"}, {"weights", "cc33"}, {"method", "dd44"}};
  out.changed = {"weights"};
  out.notes = {"the joint 'shin.L' was called 'shin_L'"};
  out.checks = {
      drift("edge_stretch.max", 0.031, 0.005), limit("volume.change", -0.3, -0.1, 0.1, 3.0),
      limit("edge_stretch.p99", 1.3, {}, 1.6, 0.5), limit("edge_stretch.min", 0.9, 0.5, {}, 0.2)};
  model::Check undefined;
  undefined.statistic = "dihedral.max";
  undefined.kind = "drift";
  undefined.domain = metrics::Domain::Edge;
  undefined.allowance = 2;
  undefined.over = true;
  undefined.verdict = model::Verdict::Beyond;
  undefined.reason = "undefined in frame 4, where the golden has a value";
  out.checks.insert(out.checks.begin() + 1, undefined);
  out.series = {{"volume.change", {0.0, -0.004, kNaN}}, {"position.max", {}}};
  out.seconds = 1.5;
  return out;
}

/// Every verdict once, and a suite that could not be read.
inline model::RunResult run() {
  using model::Verdict;
  model::SuiteResult suite;
  suite.suite = "mire-strider";
  suite.file = "suites/mire.json";
  suite.golden_folder = "golden/mire-strider";
  suite.verdict = Verdict::Broken;
  suite.cases = {result("walk", Verdict::Within), result("nod", Verdict::Waived),
                 result("shrug", Verdict::Unsigned), beyond(), result("turn", Verdict::Broken)};
  suite.cases[0].checks = {drift("position.max", 0.0024, 0.005)};
  suite.cases[1].notes = {"known until the new rig"};
  suite.cases[4].problem = base::Problem{"ends after 12 bytes", "strider.glb", 3, 7, "/nodes/2"};
  suite.cases[4].frames = 0;

  model::SuiteResult unread;
  unread.suite = "house";
  unread.file = "suites/house.json";
  unread.verdict = Verdict::Broken;
  unread.problems = {{"unknown key 'rigz'", "suites/house.json", 4, 3, "/rigz"},
                     {"the key 'motions' is missing", "suites/house.json", 1, 1, ""}};
  unread.problem = unread.problems.front();

  model::RunResult run;
  run.verdict = Verdict::Broken;
  run.suites = {suite, unread};
  return run;
}

/// A run in which every text that comes from outside is `name`. Names of suites and cases are plain
/// where `paths` must be made of them.
inline model::RunResult hostile(const std::string& name, bool whole) {
  model::RunResult run = sample::run();
  for (model::SuiteResult& suite : run.suites) {
    if (whole) suite.suite = name;
    for (base::Problem& problem : suite.problems) problem = {name, name, 1, 1, name};
    if (suite.problem) suite.problem = suite.problems.front();
    for (model::CaseResult& one : suite.cases) {
      if (whole) one.name = one.rig = one.motion = one.method = name;
      one.changed = {name};
      one.notes = {name, name};
      one.inputs["weights"] = name;
      if (one.problem) one.problem = {name, name, 1, 1, name};
      if (!name.empty()) one.series[name] = {1.0};
      for (model::Check& check : one.checks) {
        check.statistic = check.joint = check.reason = name;
        if (whole) check.kind = name;
      }
    }
  }
  return run;
}

}  // namespace sample
