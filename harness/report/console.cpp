#include "harness/report/findings.h"
#include "harness/report/formats.h"
#include "harness/report/text.h"

#include <fmt/format.h>

#include <algorithm>
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
    line += fmt::format("  {}  {}", padded(used_text(*most), 7, Align::Right),
                        base::visible(most->statistic));
  line.erase(line.find_last_not_of(' ') + 1);
  return line + '\n';
}

std::string case_lines(const CaseResult& result, std::size_t name_width,
                       const ConsoleStyle& style) {
  std::vector<std::string> details;
  if (result.problem) details.push_back(base::describe(*result.problem));
  if (result.verdict == Verdict::Unsigned) details.emplace_back("no golden yet");
  const std::size_t width = style.width > kIndent ? style.width - kIndent : 0;
  for (std::string& line : beyond_lines(result, width)) details.push_back(std::move(line));
  for (std::string& line : remarks(result)) details.push_back(std::move(line));

  std::string text = case_line(result, name_width, style);
  for (const std::string& line : details) text += std::string(kIndent, ' ') + line + '\n';
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

  std::size_t name_width = 0;
  for (const CaseResult& result : suite.cases)
    if (is_shown(result, style))
      name_width = std::max(name_width, display_width(base::visible(result.name)));
  name_width = std::min(name_width, kNameColumn);
  for (const CaseResult& result : suite.cases)
    if (is_shown(result, style)) text += case_lines(result, name_width, style);
  const bool unsigned_shown = !style.quiet && count_verdicts(suite)[kUnsigned] > 0;
  if (unsigned_shown) text += fmt::format("  to sign off what has no golden yet: {}\n", kSignOff);
  return text;
}

std::string console_summary(const model::RunResult& run, const ConsoleStyle& style) {
  const auto unread = std::count_if(run.suites.begin(), run.suites.end(),
                                    [](const SuiteResult& suite) { return suite.problem; });
  std::string counts = counts_text(count_verdicts(run));
  if (counts.empty()) counts = "no case";
  if (unread > 0)
    counts += fmt::format(", {} not run", counted(static_cast<std::size_t>(unread), "suite"));
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
