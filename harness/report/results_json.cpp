#include "harness/report/findings.h"
#include "harness/report/formats.h"
#include "harness/report/json_writer.h"

#include <array>
#include <limits>

namespace report {
namespace {

using model::CaseResult;
using model::Check;
using model::SuiteResult;

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

bool is_absolute(const std::string& file) {
  return file.starts_with('/') || file.starts_with('\\') || (file.size() > 1 && file[1] == ':');
}

// A file that the user named by its whole path goes by its last part: results hold for any folder.
base::Problem portable(base::Problem problem) {
  if (!is_absolute(problem.file)) return problem;
  const std::string whole = problem.file;
  problem.file = whole.substr(whole.find_last_of("/\\:") + 1);
  for (std::size_t at = problem.message.find(whole); at != std::string::npos;
       at = problem.message.find(whole, at + problem.file.size()))
    problem.message.replace(at, whole.size(), problem.file);
  return problem;
}

void write_problem(JsonWriter& out, std::string_view key, const base::Problem& original) {
  const base::Problem problem = portable(original);
  out.open_object(key);
  out.text("message", problem.message);
  out.text("file", problem.file);
  out.count("line", static_cast<std::size_t>(problem.line));
  out.count("column", static_cast<std::size_t>(problem.column));
  out.text("pointer", problem.pointer);
  out.close();
}

void write_optional(JsonWriter& out, const std::optional<base::Problem>& problem) {
  if (problem)
    write_problem(out, "problem", *problem);
  else
    out.null("problem");
}

void write_check(JsonWriter& out, const Check& check) {
  out.open_object();
  out.text("statistic", check.statistic);
  out.text("kind", check.kind);
  out.text("domain", metrics::domain_name(check.domain));
  out.number("value", check.value);
  out.number("golden", check.golden);
  out.number("allowance", check.allowance);
  if (check.low || check.high)
    out.numbers("bound", std::array{check.low.value_or(kNaN), check.high.value_or(kNaN)});
  out.number("used", check.used);
  out.text("verdict", model::verdict_name(check.verdict));
  out.count("frame", check.frame);
  out.number("time", check.time);
  out.count("element", check.element);
  out.indices("vertices", check.vertices);
  if (check.place)
    out.numbers("place", *check.place);
  else
    out.null("place");
  if (check.joint.empty())
    out.null("joint");
  else
    out.text("joint", check.joint);
  out.count("failing", check.failing);
  out.count("undecided", check.undecided);
  if (!check.reason.empty()) out.text("reason", check.reason);
  out.close();
}

void write_inputs(JsonWriter& out, model::Fingerprints inputs) {
  out.open_object("inputs");
  for (const char* group : {"positions", "faces", "weights", "joints", "bind", "motion", "method"})
    if (const auto found = inputs.extract(group)) out.text(group, found.mapped());
  for (const auto& [group, hash] : inputs) out.text(group, hash);
  out.close();
}

void write_case(JsonWriter& out, const CaseResult& result) {
  out.open_object();
  out.text("name", result.name);
  out.text("rig", result.rig);
  out.text("motion", result.motion);
  out.text("method", result.method);
  if (!result.against.empty()) out.text("against", result.against);
  out.count("frames", result.frames);
  out.count("vertices", result.vertices);
  out.text("verdict", model::verdict_name(result.verdict));
  write_inputs(out, result.inputs);
  out.texts("changed", result.changed);
  out.texts("notes", result.notes);
  out.open_list("checks");
  for (const Check& check : result.checks) write_check(out, check);
  out.close();
  out.open_object("series");
  for (const auto& [statistic, values] : result.series) out.numbers(statistic, values);
  out.close();
  write_optional(out, result.problem);
  out.close();
}

void write_suite(JsonWriter& out, const SuiteResult& suite) {
  out.open_object();
  out.text("suite", suite.suite);
  out.text("verdict", model::verdict_name(suite.verdict));
  write_optional(out, suite.problem);
  if (!suite.problems.empty()) {
    out.open_list("problems");
    for (const base::Problem& problem : suite.problems) write_problem(out, {}, problem);
    out.close();
  }
  out.open_list("cases");
  for (const CaseResult& result : suite.cases) write_case(out, result);
  out.close();
  out.close();
}

}  // namespace

std::string results_json(const model::RunResult& run) {
  JsonWriter out;
  out.open_object();
  out.text("skinfold", "results 1");
  out.text("version", SKINFOLD_VERSION);
  out.text("verdict", model::verdict_name(run.verdict));
  out.open_object("counts");
  const VerdictCounts counts = count_verdicts(run);
  for (std::size_t i = 0; i < counts.size(); ++i)
    out.count(model::verdict_name(static_cast<model::Verdict>(i)), counts[i]);
  out.close();
  out.open_list("suites");
  for (const SuiteResult& suite : run.suites) write_suite(out, suite);
  out.close();
  out.close();
  return std::move(out).finish();
}

Format results_json_format() {
  return {.name = "results_json",
          .file = "results.json",
          .summary = "verdicts, checks and series, the same bytes for the same results",
          .write = [](const model::RunResult& run, const RunInfo&) { return results_json(run); }};
}

}  // namespace report
