#include "harness/report/findings.h"
#include "harness/report/formats.h"
#include "harness/report/text.h"

#include <fmt/format.h>

#include <algorithm>
#include <map>
#include <optional>

namespace report {
namespace {

using model::CaseResult;
using model::SuiteResult;
using model::Verdict;

constexpr auto kUnsigned = static_cast<std::size_t>(Verdict::Unsigned);
constexpr std::size_t kIndent = 4;
constexpr std::size_t kVerdictWidth = 8;  // "unsigned"
constexpr std::size_t kNameColumn = 56;   // longer names push the rest of their line

// The word says it; the colour (ANSI) only helps to find it.
std::string painted(Verdict verdict, const std::string& word, const ConsoleStyle& style) {
  if (!style.colour) return word;
  const int colour = verdict == Verdict::Within   ? 32
                     : verdict == Verdict::Beyond ? 31
                     : verdict == Verdict::Broken ? 35
                                                  : 33;
  return fmt::format("\x1b[{}m{}\x1b[0m", colour, word);
}

bool is_shown(const CaseResult& result, const ConsoleStyle& style) {
  return !style.quiet || result.verdict >= Verdict::Beyond;
}

std::string case_line(const CaseResult& result, std::size_t name_width, const ConsoleStyle& style) {
  const std::string name = model::verdict_name(result.verdict);
  std::string line = "  " + painted(result.verdict, name, style) +
                     std::string(kVerdictWidth - name.size() + 2, ' ') +
                     padded(base::visible(result.name), name_width);
  line += "  " + padded(result.frames > 0 ? counted(result.frames, "frame") : "", 11, Align::Right);
  if (const model::Check* most = most_used(result))
    line += fmt::format("  {}  {} ({})", padded(used_text(*most), 7, Align::Right),
                        base::visible(most->statistic), base::visible(most->kind));
  line.erase(line.find_last_not_of(' ') + 1);
  return line + '\n';
}

// One line for a case that passes; what is wrong, and why, under one that does not.
// `problem`: what is said of a broken case.
std::string case_lines(const CaseResult& result, const std::string& problem, std::size_t name_width,
                       const ConsoleStyle& style) {
  std::vector<std::string> details;
  if (result.problem) details.push_back(problem);
  const std::size_t width = style.width > kIndent ? style.width - kIndent : 0;
  for (std::string& line : beyond_lines(result, width)) details.push_back(std::move(line));
  if (result.verdict >= Verdict::Beyond) details.push_back(change_remark(result));

  std::string text = case_line(result, name_width, style);
  for (const std::string& line : details)
    if (!line.empty()) text += std::string(kIndent, ' ') + line + '\n';
  return text;
}

// Measurements that left elements undecided; empty if none did.
std::string undecided_remark(const CaseResult& result) {
  std::string names;
  for (const model::Check& check : result.checks) {
    const std::string name = base::visible(check.statistic.substr(0, check.statistic.find('.')));
    if (check.undecided > 0 && names.find(name) == std::string::npos)
      names += (names.empty() ? "" : ", ") + name;
  }
  return names.empty() ? ""
                       : "note: some elements are too thin to be judged, and counted: " + names;
}

// Remarks of several cases, each once, with the number of cases that have it.
std::string common_remarks(const std::vector<const CaseResult*>& results) {
  struct Remark {
    std::string text, first;
    std::size_t cases = 0;
  };
  std::vector<Remark> all;
  const auto add = [&](const std::string& text, const CaseResult& result) {
    const auto known =
        std::find_if(all.begin(), all.end(), [&](const Remark& one) { return one.text == text; });
    if (known == all.end())
      all.push_back({text, base::visible(result.name), 1});
    else
      ++known->cases;
  };
  for (const CaseResult* result : results) {
    const std::string change = change_remark(*result);
    if (result->verdict < Verdict::Beyond && !change.empty()) add(change, *result);
    for (const std::string& note : result->notes) add("note: " + base::visible(note), *result);
    if (const std::string undecided = undecided_remark(*result); !undecided.empty())
      add(undecided, *result);
  }
  std::string text;
  for (const Remark& one : all) {
    text += "  " + one.text;
    if (one.cases == results.size() && one.cases > 1)
      text += " (all cases)";
    else if (one.cases > 1)
      text += fmt::format(" ({}, first {})", counted(one.cases, "case"), one.first);
    else if (results.size() > 1)
      text += fmt::format(" ({})", one.first);
    text += '\n';
  }
  return text;
}

}  // namespace

std::string console_suite(const SuiteResult& suite, const ConsoleStyle& style) {
  const bool any = std::any_of(suite.cases.begin(), suite.cases.end(),
                               [&](const CaseResult& one) { return is_shown(one, style); });
  const std::vector<base::Problem> problems =
      suite.problems.empty() && suite.problem ? std::vector{*suite.problem} : suite.problems;
  if (style.quiet && !any && problems.empty()) return "";

  std::string text = base::visible(suite.suite);
  if (!problems.empty())
    text += fmt::format("  {}: {} in the suite file", painted(Verdict::Broken, "not run", style),
                        counted(problems.size(), "problem"));
  if (!suite.cases.empty())
    text += fmt::format("  {}: {}", counted(suite.cases.size(), "case"),
                        counts_text(count_verdicts(suite)));
  text += '\n';
  for (const base::Problem& problem : problems) text += "  " + base::describe(problem) + '\n';

  std::vector<const CaseResult*> shown;
  std::size_t name_width = 0;
  for (const CaseResult& result : suite.cases) {
    if (!is_shown(result, style)) continue;
    shown.push_back(&result);
    name_width = std::max(name_width, display_width(base::visible(result.name)));
  }
  name_width = std::min(name_width, kNameColumn);
  std::map<std::string, std::string> told;  // problems, by the first case that has it
  for (const CaseResult* result : shown) {
    std::string problem;
    if (result->problem) {
      problem = base::describe(*result->problem);
      const auto [first, fresh] = told.emplace(problem, base::visible(result->name));
      if (!fresh) problem = "as " + first->second;
    }
    text += case_lines(*result, problem, name_width, style);
  }
  text += common_remarks(shown);
  const bool unsigned_shown = !style.quiet && count_verdicts(suite)[kUnsigned] > 0;
  if (unsigned_shown)
    text += fmt::format(
        "  to sign off what has no golden yet: skinfold signoff {} --by NAME --why TEXT\n",
        base::visible(style.out));
  return text;
}

std::string console_summary(const model::RunResult& run, const ConsoleStyle& style) {
  const auto unread = std::count_if(run.suites.begin(), run.suites.end(),
                                    [](const SuiteResult& suite) { return suite.problem; });
  std::string counts = counts_text(count_verdicts(run));
  if (counts.empty()) counts = "no case";
  if (unread > 0)
    counts += fmt::format(", {} not run", counted(static_cast<std::size_t>(unread), "suite"));
  if (unread > 0)
    return fmt::format("{}: {}\n", counts, painted(Verdict::Broken, "suite wrong", style));
  return fmt::format("{}: {}\n", counts,
                     painted(run.verdict, model::verdict_name(run.verdict), style));
}

Format console_format() {
  return {.name = "console",
          .file = "",
          .summary = "a line per case on standard output, and a table where one is beyond",
          .write = [](const model::RunResult& run, const RunInfo&) {
            std::string text;
            for (const SuiteResult& suite : run.suites) text += console_suite(suite, {});
            return text + console_summary(run, {});
          }};
}

}  // namespace report
