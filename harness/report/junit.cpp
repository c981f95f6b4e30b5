#include "harness/report/findings.h"
#include "harness/report/formats.h"

#include <fmt/format.h>

#include <cmath>
#include <set>

namespace report {
namespace {

using model::CaseResult;
using model::SuiteResult;
using model::Verdict;

constexpr std::size_t kTextWidth = 120;

// Text and attribute values alike. XML 1.0 cannot hold control characters and U+FFFE, U+FFFF even
// as references, so they are spelled out.
std::string escaped(std::string_view text) {
  std::string out;
  const std::string seen = base::visible(text);
  for (std::size_t at = 0; at < seen.size(); ++at) {
    const std::string_view rest = std::string_view(seen).substr(at);
    if (rest.starts_with("\xEF\xBF\xBE") || rest.starts_with("\xEF\xBF\xBF")) {
      out += rest[2] == '\xBE' ? "\\u{FFFE}" : "\\u{FFFF}";
      at += 2;
      continue;
    }
    switch (seen[at]) {
      case '&':
        out += "&amp;";
        break;
      case '<':
        out += "&lt;";
        break;
      case '>':
        out += "&gt;";
        break;
      case '"':
        out += "&quot;";
        break;
      case '\'':
        out += "&apos;";
        break;
      default:
        out += seen[at];
    }
  }
  return out;
}

std::string lines_of(const std::vector<std::string>& lines) {
  std::string text;
  for (const std::string& line : lines) text.append(escaped(line)).append("\n");
  return text;
}

std::string seconds_text(double seconds) {
  return fmt::format("{:.3f}", std::isfinite(seconds) && seconds > 0 ? seconds : 0.0);
}

struct Totals {
  std::size_t tests = 0, failures = 0, errors = 0, skipped = 0;
  double seconds = 0;

  void add(Verdict verdict, double more_seconds) {
    ++tests;
    failures += verdict == Verdict::Beyond || verdict == Verdict::Unsigned ? 1 : 0;
    errors += verdict == Verdict::Broken ? 1 : 0;
    skipped += verdict == Verdict::Waived ? 1 : 0;
    seconds += more_seconds;
  }
};

Totals totals_of(const SuiteResult& suite) {
  Totals totals;
  if (suite.problem) totals.add(Verdict::Broken, 0);
  for (const CaseResult& result : suite.cases) totals.add(result.verdict, result.seconds);
  return totals;
}

// The opening tag of a testcase; a name that was there before is numbered.
std::string opening(const std::string& suite, const std::string& name, double seconds,
                    std::set<std::string>& taken) {
  const std::string class_name = escaped("skinfold." + suite);
  std::string unique = escaped(name);
  for (int i = 2; !taken.insert(class_name + '\n' + unique).second; ++i)
    unique = fmt::format("{} ({})", escaped(name), i);
  return fmt::format("    <testcase classname=\"{}\" name=\"{}\" time=\"{}\"", class_name, unique,
                     seconds_text(seconds));
}

std::string element(const char* tag, const char* type, const std::string& message,
                    const std::vector<std::string>& lines) {
  return fmt::format("      <{} type=\"{}\" message=\"{}\">{}</{}>\n", tag, type, escaped(message),
                     lines_of(lines), tag);
}

std::string beyond_element(const CaseResult& result) {
  std::string message = "a bound is exceeded";
  for (const model::Check& check : result.checks)
    if (check.verdict == Verdict::Beyond) {
      message = sentence(check);
      break;
    }
  std::vector<std::string> lines = beyond_lines(result, kTextWidth);
  for (std::string& line : remarks(result)) lines.push_back(std::move(line));
  return element("failure", "beyond", message, lines);
}

std::string waived_element(const CaseResult& result) {
  std::string reason = result.notes.empty() ? "waived" : result.notes.front();
  for (const model::Check& check : result.checks)
    if (check.verdict == Verdict::Waived && !check.reason.empty()) {
      reason = check.reason;
      break;
    }
  return fmt::format("      <skipped message=\"{}\"/>\n", escaped(reason));
}

std::string broken_element(const std::vector<base::Problem>& problems) {
  std::vector<std::string> lines;
  lines.reserve(problems.size());
  for (const base::Problem& problem : problems) lines.push_back(base::describe(problem));
  return element("error", "broken", lines.empty() ? "it could not be computed" : lines.front(),
                 lines);
}

std::string verdict_element(const CaseResult& result) {
  switch (result.verdict) {
    case Verdict::Within:
      break;
    case Verdict::Waived:
      return waived_element(result);
    case Verdict::Unsigned:
      return element("failure", "unsigned", "no golden yet",
                     {fmt::format("sign it off: {}", kSignOff)});
    case Verdict::Beyond:
      return beyond_element(result);
    case Verdict::Broken:
      return broken_element(result.problem ? std::vector{*result.problem}
                                           : std::vector<base::Problem>{});
  }
  return "";
}

std::string suite_element(const SuiteResult& suite, std::set<std::string>& taken) {
  const Totals totals = totals_of(suite);
  std::string out = fmt::format(
      "  <testsuite name=\"{}\" tests=\"{}\" failures=\"{}\" errors=\"{}\" skipped=\"{}\" "
      "time=\"{}\">\n",
      escaped(suite.suite), totals.tests, totals.failures, totals.errors, totals.skipped,
      seconds_text(totals.seconds));
  if (suite.problem) {
    const bool all = !suite.problems.empty();
    out += opening(suite.suite, "suite", 0, taken) + ">\n" +
           broken_element(all ? suite.problems : std::vector{*suite.problem}) + "    </testcase>\n";
  }
  for (const CaseResult& result : suite.cases) {
    const std::string inside = verdict_element(result);
    out += opening(suite.suite, result.name, result.seconds, taken);
    out += inside.empty() ? "/>\n" : ">\n" + inside + "    </testcase>\n";
  }
  return out + "  </testsuite>\n";
}

}  // namespace

std::string junit_xml(const model::RunResult& run) {
  Totals sum;
  std::string suites;
  std::set<std::string> taken;
  for (const SuiteResult& suite : run.suites) {
    const Totals part = totals_of(suite);
    sum.tests += part.tests;
    sum.failures += part.failures;
    sum.errors += part.errors;
    sum.seconds += part.seconds;
    suites += suite_element(suite, taken);
  }
  return fmt::format(
      "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n"
      "<testsuites name=\"skinfold\" tests=\"{}\" failures=\"{}\" errors=\"{}\" time=\"{}\">\n"
      "{}</testsuites>\n",
      sum.tests, sum.failures, sum.errors, seconds_text(sum.seconds), suites);
}

Format junit_format() {
  return {.name = "junit",
          .file = "junit.xml",
          .summary = "one test case per case, for build servers",
          .write = [](const model::RunResult& run, const RunInfo&) { return junit_xml(run); }};
}

}  // namespace report
