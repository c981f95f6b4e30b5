#include "harness/base/file.h"
#include "harness/report/findings.h"
#include "harness/report/report.h"

#include <fmt/format.h>

#include <algorithm>
#include <limits>
#include <set>

namespace report {
namespace {

using base::Json;
using base::JsonView;
using Kind = base::Json::Kind;
using metrics::Domain;
using model::CaseResult;
using model::Check;
using model::SuiteResult;
using model::Verdict;

constexpr Verdict kVerdicts[] = {Verdict::Within, Verdict::Waived, Verdict::Unsigned,
                                 Verdict::Beyond, Verdict::Broken};
constexpr Domain kDomains[] = {Domain::Frame, Domain::Vertex, Domain::Edge, Domain::Face,
                               Domain::Asset};
constexpr base::Range kPlace{0, std::numeric_limits<int>::max()};  // lines and columns
constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

// A member that must be there, null or of `kind`; null pointer for null and for what is wrong.
const Json* nullable(JsonView& view, std::string_view key, Kind kind) {
  const Json* value = view.json().find(key);
  if (value == nullptr || value->kind != Kind::Null) return view.required(key, kind);
  return view.member(key), nullptr;
}

std::string text(JsonView& view, std::string_view key) {
  const Json* value = view.required(key, Kind::String);
  return value == nullptr ? "" : value->string;
}

std::size_t count(JsonView& view, std::string_view key) {
  view.required(key, Kind::Number);
  return static_cast<std::size_t>(view.integer(key, 0, {.low = 0}));
}

std::optional<double> optional_number(JsonView& view, std::string_view key) {
  const Json* value = nullable(view, key, Kind::Number);
  return value == nullptr ? std::nullopt : std::optional(value->number);
}

std::optional<std::size_t> optional_count(JsonView& view, std::string_view key) {
  if (nullable(view, key, Kind::Number) == nullptr) return std::nullopt;
  return static_cast<std::size_t>(view.integer(key, 0, {.low = 0}));
}

std::vector<std::string> texts(JsonView& view, std::string_view key) {
  view.required(key, Kind::Array);
  return view.texts(key);
}

// Numbers where null stands for NaN.
std::vector<double> numbers(const JsonView& parent, std::string_view key, const Json& array) {
  std::vector<double> out;
  out.reserve(array.items.size());
  for (const Json& item : array.items) {
    if (item.kind != Kind::Number && item.kind != Kind::Null) {
      parent.fail(key,
                  fmt::format("numbers or null were expected, not {}", base::kind_name(item.kind)));
      return {};
    }
    out.push_back(item.kind == Kind::Null ? kNaN : item.number);
  }
  return out;
}

// Calls read(view, index) for every item of a list.
template <class Read>
void each(const JsonView& parent, std::string_view key, const Json& list, Read read) {
  const std::string pointer = base::child_pointer(parent.pointer(), key);
  for (std::size_t i = 0; i < list.items.size(); ++i)
    read(JsonView(list.items[i], base::child_pointer(pointer, i), parent.problems()), i);
}

Verdict verdict(JsonView& view) {
  view.required("verdict", Kind::String);
  const std::string name =
      view.choice("verdict", {"within", "waived", "unsigned", "beyond", "broken"});
  return *std::find_if(std::begin(kVerdicts), std::end(kVerdicts),
                       [&](Verdict one) { return model::verdict_name(one) == name; });
}

Domain domain(JsonView& view) {
  view.required("domain", Kind::String);
  const std::string name = view.choice("domain", {"frame", "vertex", "edge", "face", "asset"});
  return *std::find_if(std::begin(kDomains), std::end(kDomains),
                       [&](Domain one) { return metrics::domain_name(one) == name; });
}

base::Problem problem(JsonView view) {
  base::Problem out;
  out.message = text(view, "message");
  out.file = text(view, "file");
  out.line = static_cast<int>(view.integer("line", 0, kPlace));
  out.column = static_cast<int>(view.integer("column", 0, kPlace));
  out.pointer = text(view, "pointer");
  view.close();
  return out;
}

std::optional<base::Problem> optional_problem(JsonView& view) {
  const Json* value = nullable(view, "problem", Kind::Object);
  return value == nullptr ? std::nullopt : std::optional(problem(view.child("problem", *value)));
}

void read_bound(JsonView& view, Check& check) {
  const Json* bound = view.member("bound", Kind::Array);
  if (bound == nullptr) return;
  const std::vector<double> ends = numbers(view, "bound", *bound);
  if (ends.size() != 2) return view.fail("bound", "two numbers or null were expected");
  if (ends[0] == ends[0]) check.low = ends[0];
  if (ends[1] == ends[1]) check.high = ends[1];
}

void read_vertices(JsonView& view, Check& check) {
  view.required("vertices", Kind::Array);
  for (const double vertex : view.numbers("vertices")) {
    if (vertex < 0 || vertex >= metrics::kNone || vertex != static_cast<metrics::Index>(vertex))
      return view.fail("vertices", fmt::format("{} is no index of a vertex", vertex));
    check.vertices.push_back(static_cast<metrics::Index>(vertex));
  }
}

Check read_check(JsonView view) {
  Check check;
  check.statistic = text(view, "statistic");
  view.required("kind", Kind::String);
  check.kind = view.choice("kind", {"limit", "drift", "shape", "bits"});
  check.domain = domain(view);
  check.value = optional_number(view, "value");
  check.golden = optional_number(view, "golden");
  check.allowance = optional_number(view, "allowance");
  read_bound(view, check);
  check.used = optional_number(view, "used");
  check.verdict = verdict(view);
  check.over = !check.used && check.verdict == Verdict::Beyond;
  check.frame = optional_count(view, "frame");
  check.time = optional_number(view, "time");
  check.element = optional_count(view, "element");
  read_vertices(view, check);
  if (nullable(view, "place", Kind::Array) != nullptr)
    if (const std::vector<double> place = view.numbers("place", 3); place.size() == 3)
      check.place = {place[0], place[1], place[2]};
  if (const Json* joint = nullable(view, "joint", Kind::String)) check.joint = joint->string;
  check.failing = count(view, "failing");
  check.undecided = count(view, "undecided");
  check.reason = view.text("reason");
  view.close();
  return check;
}

// What paths of goldens are made of: [A-Za-z0-9][A-Za-z0-9._-]{0,63}.
bool is_name(std::string_view name) {
  const auto alphanumeric = [](char c) {
    return (c >= 'A' && c <= 'Z') || (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9');
  };
  return !name.empty() && name.size() <= 64 && alphanumeric(name.front()) &&
         std::all_of(name.begin(), name.end(),
                     [&](char c) { return alphanumeric(c) || c == '.' || c == '_' || c == '-'; });
}

void read_names(JsonView& view, CaseResult& result) {
  result.name = text(view, "name");
  result.rig = text(view, "rig");
  result.motion = text(view, "motion");
  result.method = text(view, "method");
  result.against = view.text("against");
  if (!is_name(result.rig) || !is_name(result.motion) || !is_name(result.method))
    view.fail("name", "rig, motion and method must be names of letters, digits, '.', '_' and '-'");
  else if (result.name != result.rig + '/' + result.motion + '/' + result.method)
    view.fail("name", "the name of a case is RIG/MOTION/METHOD");
}

void read_inputs(JsonView view, CaseResult& result) {
  for (const auto& [group, value] : view.json().members)
    if (const Json* hash = view.member(group, Kind::String)) result.inputs[group] = hash->string;
}

CaseResult read_case(JsonView view) {
  CaseResult result;
  read_names(view, result);
  result.frames = count(view, "frames");
  result.vertices = count(view, "vertices");
  result.verdict = verdict(view);
  if (const Json* inputs = view.required("inputs", Kind::Object))
    read_inputs(view.child("inputs", *inputs), result);
  result.changed = texts(view, "changed");
  result.notes = texts(view, "notes");
  if (const Json* checks = view.required("checks", Kind::Array))
    each(view, "checks", *checks,
         [&](const JsonView& item, std::size_t) { result.checks.push_back(read_check(item)); });
  if (const Json* series = view.required("series", Kind::Object)) {
    JsonView all = view.child("series", *series);
    for (const auto& [statistic, values] : series->members)
      if (all.member(statistic, Kind::Array) != nullptr)
        result.series[statistic] = numbers(all, statistic, values);
  }
  result.problem = optional_problem(view);
  view.close();
  return result;
}

SuiteResult read_suite(JsonView view) {
  SuiteResult suite;
  suite.suite = text(view, "suite");
  suite.verdict = verdict(view);
  suite.problem = optional_problem(view);
  if (const Json* problems = view.member("problems", Kind::Array))
    each(view, "problems", *problems,
         [&](const JsonView& item, std::size_t) { suite.problems.push_back(problem(item)); });
  if (const Json* cases = view.required("cases", Kind::Array)) {
    if (!cases->items.empty() && !is_name(suite.suite))
      view.fail("suite", "a name of letters, digits, '.', '_' and '-' was expected");
    std::set<std::string> names;
    each(view, "cases", *cases, [&](const JsonView& item, std::size_t) {
      suite.cases.push_back(read_case(item));
      if (!names.insert(suite.cases.back().name).second)
        item.fail("name", "this case is there twice");
    });
  }
  view.close();
  return suite;
}

void check_counts(JsonView view, const model::RunResult& run) {
  const VerdictCounts counts = count_verdicts(run);
  for (std::size_t i = 0; i < counts.size(); ++i) {
    const std::string name = model::verdict_name(static_cast<Verdict>(i));
    if (const std::size_t told = count(view, name); told != counts[i])
      view.fail(name, fmt::format("{} cases are counted here, {} are listed", told, counts[i]));
  }
  view.close();
}

void check_version(JsonView& view, std::string_view wanted, std::string_view writer) {
  const std::string found = text(view, "skinfold");
  if (found != wanted)
    view.fail("skinfold", fmt::format("'{}' was expected, not '{}': written by another version, {}",
                                      wanted, base::visible(found), writer));
}

}  // namespace

model::RunResult read_results(const std::filesystem::path& path, const std::string& shown) {
  const base::JsonSource source = base::read_json_source(path, shown);
  const Json root = base::parse_json(source);
  std::vector<base::Problem> problems;
  JsonView view(root, "", problems);
  model::RunResult run;
  check_version(view, "results 1", "run 'skinfold gate' again");
  if (!problems.empty()) throw base::InputError(std::move(problems));
  text(view, "version");
  run.verdict = verdict(view);
  const Json* counts = view.required("counts", Kind::Object);
  if (const Json* suites = view.required("suites", Kind::Array))
    each(view, "suites", *suites,
         [&](const JsonView& item, std::size_t) { run.suites.push_back(read_suite(item)); });
  if (counts != nullptr) check_counts(view.child("counts", *counts), run);
  view.close();
  if (!problems.empty()) throw base::InputError(std::move(problems));
  return run;
}

namespace {

void read_suite_run(JsonView view, SuiteResult& suite) {
  if (text(view, "suite") != suite.suite)
    view.fail("suite", fmt::format("the results have suite '{}' here; the two files are of "
                                   "different runs",
                                   base::visible(suite.suite)));
  suite.file = text(view, "file");
  suite.golden_folder = text(view, "golden");
  const Json* cases = view.required("cases", Kind::Object);
  if (cases != nullptr) {
    JsonView seconds = view.child("cases", *cases);
    for (CaseResult& result : suite.cases)
      if (seconds.required(result.name, Kind::Number) != nullptr)
        result.seconds = seconds.number(result.name, 0, {.low = 0});
    seconds.close();
  }
  view.close();
}

}  // namespace

RunInfo read_run(const std::filesystem::path& path, const std::string& shown,
                 model::RunResult& run) {
  const base::JsonSource source = base::read_json_source(path, shown);
  const Json root = base::parse_json(source);
  std::vector<base::Problem> problems;
  JsonView view(root, "", problems);
  check_version(view, "run 1", "run 'skinfold gate' again");
  if (!problems.empty()) throw base::InputError(std::move(problems));
  RunInfo info;
  text(view, "version");
  info.started = text(view, "started");
  view.required("seconds", Kind::Number);
  info.seconds = view.number("seconds", 0, {.low = 0});
  info.jobs = count(view, "jobs");
  info.arguments = texts(view, "arguments");
  if (const Json* suites = view.required("suites", Kind::Array)) {
    if (suites->items.size() != run.suites.size())
      view.fail("suites", fmt::format("{} suites are here, {} in the results; the two files are of "
                                      "different runs",
                                      suites->items.size(), run.suites.size()));
    else
      each(view, "suites", *suites,
           [&](const JsonView& item, std::size_t i) { read_suite_run(item, run.suites[i]); });
  }
  view.close();
  if (!problems.empty()) throw base::InputError(std::move(problems));
  return info;
}

}  // namespace report
