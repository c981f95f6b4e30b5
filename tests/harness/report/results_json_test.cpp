#include "tests/harness/report/folder.h"
#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <bit>
#include <sstream>

namespace {

model::RunResult read_back(const std::string& text) {
  const sample::Folder folder;
  return report::read_results(folder.file("results.json", text), "results.json");
}

// The problems of a text that must be refused, one a line.
std::string refusal(const std::string& text) {
  try {
    read_back(text);
  } catch (const base::InputError& error) {
    return error.what();
  }
  return "accepted";
}

std::string replaced(std::string text, const std::string& from, const std::string& to) {
  const std::size_t at = text.find(from);
  REQUIRE(at != std::string::npos);
  return text.replace(at, from.size(), to);
}

std::vector<std::string> lines_of(const std::string& text) {
  std::istringstream stream(text);
  std::vector<std::string> lines;
  for (std::string line; std::getline(stream, line);) lines.push_back(line);
  return lines;
}

void require_same(const std::optional<base::Problem>& a, const std::optional<base::Problem>& b) {
  REQUIRE(a.has_value() == b.has_value());
  if (!a) return;
  CHECK(a->message == b->message);
  CHECK(a->file == b->file);
  CHECK(a->line == b->line);
  CHECK(a->column == b->column);
  CHECK(a->pointer == b->pointer);
}

void require_same(const model::Check& a, const model::Check& b) {
  CHECK(a.statistic == b.statistic);
  CHECK(a.kind == b.kind);
  CHECK(a.domain == b.domain);
  CHECK(a.value == b.value);
  CHECK(a.golden == b.golden);
  CHECK(a.low == b.low);
  CHECK(a.high == b.high);
  CHECK(a.allowance == b.allowance);
  CHECK(a.used == b.used);
  CHECK(a.over == b.over);
  CHECK(a.verdict == b.verdict);
  CHECK(a.frame == b.frame);
  CHECK(a.time == b.time);
  CHECK(a.element == b.element);
  CHECK(a.vertices == b.vertices);
  CHECK(a.place == b.place);
  CHECK(a.joint == b.joint);
  CHECK(a.failing == b.failing);
  CHECK(a.undecided == b.undecided);
  CHECK(a.reason == b.reason);
}

void require_same(const model::CaseResult& a, const model::CaseResult& b) {
  CHECK(a.name == b.name);
  CHECK(a.rig == b.rig);
  CHECK(a.motion == b.motion);
  CHECK(a.method == b.method);
  CHECK(a.frames == b.frames);
  CHECK(a.vertices == b.vertices);
  CHECK(a.verdict == b.verdict);
  CHECK(a.inputs == b.inputs);
  CHECK(a.changed == b.changed);
  CHECK(a.notes == b.notes);
  REQUIRE(a.checks.size() == b.checks.size());
  for (std::size_t i = 0; i < a.checks.size(); ++i) require_same(a.checks[i], b.checks[i]);
  REQUIRE(a.series.size() == b.series.size());
  for (const auto& [name, values] : a.series) {
    REQUIRE(b.series.count(name) == 1);
    const std::vector<double>& others = b.series.at(name);
    CHECK(std::equal(values.begin(), values.end(), others.begin(), others.end(),
                     [](double x, double y) { return x == y || (x != x && y != y); }));
  }
  require_same(a.problem, b.problem);
}

void require_same(const model::RunResult& a, const model::RunResult& b) {
  CHECK(a.verdict == b.verdict);
  REQUIRE(a.suites.size() == b.suites.size());
  for (std::size_t i = 0; i < a.suites.size(); ++i) {
    CHECK(a.suites[i].suite == b.suites[i].suite);
    CHECK(a.suites[i].verdict == b.suites[i].verdict);
    require_same(a.suites[i].problem, b.suites[i].problem);
    REQUIRE(a.suites[i].problems.size() == b.suites[i].problems.size());
    for (std::size_t k = 0; k < a.suites[i].problems.size(); ++k)
      require_same(std::optional(a.suites[i].problems[k]), b.suites[i].problems[k]);
    REQUIRE(a.suites[i].cases.size() == b.suites[i].cases.size());
    for (std::size_t k = 0; k < a.suites[i].cases.size(); ++k)
      require_same(a.suites[i].cases[k], b.suites[i].cases[k]);
  }
}

}  // namespace

// Catches: a key missing, renamed or in another place than the README says. Source: the README.
TEST_CASE("results.json has its keys in order") {
  model::RunResult run = sample::run();
  run.verdict = model::Verdict::Beyond;
  run.suites.pop_back();
  run.suites[0].verdict = model::Verdict::Beyond;
  run.suites[0].cases = {sample::beyond()};
  run.suites[0].cases[0].checks.resize(1);
  CHECK(report::results_json(run) == R"({
  "skinfold": "results 1",
  "version": ")" SKINFOLD_VERSION R"(",
  "verdict": "beyond",
  "counts": {
    "within": 0,
    "waived": 0,
    "unsigned": 0,
    "beyond": 1,
    "broken": 0
  },
  "suites": [
    {
      "suite": "mire-strider",
      "verdict": "beyond",
      "problem": null,
      "cases": [
        {
          "name": "lod0/knee/ship",
          "rig": "lod0",
          "motion": "knee",
          "method": "ship",
          "frames": 14,
          "vertices": 6120,
          "verdict": "beyond",
          "inputs": {
            "positions": "aa11",
            "faces": "bb22",
            "weights": "cc33",
            "method": "dd44"
          },
          "changed": [
            "weights"
          ],
          "notes": [
            "the joint 'shin.L' was called 'shin_L'"
          ],
          "checks": [
            {
              "statistic": "edge_stretch.max",
              "kind": "drift",
              "domain": "edge",
              "value": 0.031,
              "golden": 1.21,
              "allowance": 0.005,
              "used": 6.2,
              "verdict": "beyond",
              "frame": 9,
              "time": 0.375,
              "element": 1204,
              "vertices": [88, 91],
              "place": [0.1, 0.8, -0.25],
              "joint": "shin.L",
              "failing": 14,
              "undecided": 2
            }
          ],
          "series": {
            "position.max": [],
            "volume.change": [0.0, -0.004, null]
          },
          "problem": null
        }
      ]
    }
  ]
}
)");
}

// Catches: a field that is dropped, swapped or changed by writing and reading.
TEST_CASE("results.json gives back every field") {
  const model::RunResult run = sample::run();
  const std::string text = report::results_json(run);
  const model::RunResult again = read_back(text);
  require_same(run, again);
  CHECK(report::results_json(again) == text);
}

// Catches: a time, a host's path or anything else of the run itself getting into the results.
TEST_CASE("results.json does not depend on when and where the run was") {
  model::RunResult run = sample::run();
  const std::string text = report::results_json(run);
  run.suites[0].file = "/home/somebody/suites/mire.json";
  run.suites[0].golden_folder = "/srv/golden";
  run.suites[0].cases[0].seconds = 99;
  CHECK(report::results_json(run) == text);

  const char* absolute = GENERATE("/srv/rigs/strider.glb", "C:\\rigs\\strider.glb");
  run.suites[0].cases[4].problem->file = absolute;
  run.suites[0].cases[4].problem->message = std::string(absolute) + " and " + absolute;
  const std::string portable = report::results_json(run);
  CHECK(portable.find("rigs") == std::string::npos);
  CHECK(portable.find("\"file\": \"strider.glb\"") != std::string::npos);
  CHECK(portable.find("\"message\": \"strider.glb and strider.glb\"") != std::string::npos);
}

// Catches: a number that loses bits, a NaN written as text, a zero with a sign.
// Source of the values: elementary (ends of the range of binary64, numbers without short decimals).
TEST_CASE("numbers of results.json read back bit for bit") {
  const std::vector<double> values = {0.1,
                                      1.0 / 3,
                                      2e-5,
                                      5e-324,
                                      2.2250738585072014e-308,
                                      1e22,
                                      1e23,
                                      -1e300,
                                      6.2,
                                      1.7976931348623157e308,
                                      1 + 2e-16,
                                      123456789.125,
                                      -7,
                                      9007199254740993.0};
  model::RunResult run = sample::run();
  run.suites[0].cases[0].series["a"] = values;
  const double infinity = std::numeric_limits<double>::infinity();
  run.suites[0].cases[0].series["b"] = {-0.0, sample::kNaN, infinity, -infinity};
  const std::string text = report::results_json(run);
  CHECK(text.find("\"b\": [0.0, null, null, null]") != std::string::npos);
  const std::vector<double> back = read_back(text).suites[0].cases[0].series["a"];
  REQUIRE(back.size() == values.size());
  for (std::size_t i = 0; i < values.size(); ++i)
    CHECK(std::bit_cast<std::uint64_t>(back[i]) == std::bit_cast<std::uint64_t>(values[i]));
}

// Catches: rows whose breaks move, so that one changed frame makes a whole series differ.
TEST_CASE("a frame that changes in a long series changes one line") {
  model::RunResult run = sample::run();
  std::vector<double>& series = run.suites[0].cases[0].series["volume.change"];
  series.assign(1000, 0.5);
  const std::vector<std::string> before = lines_of(report::results_json(run));
  series[500] = 0.123456789;
  const std::vector<std::string> after = lines_of(report::results_json(run));
  REQUIRE(before.size() == after.size());
  std::size_t different = 0;
  for (std::size_t i = 0; i < before.size(); ++i) different += before[i] != after[i] ? 1u : 0u;
  CHECK(different == 1);
}

// Catches: sorting on the way; checks come worst first and cases in the order of the suite.
TEST_CASE("results.json keeps the order of suites, cases and checks") {
  model::RunResult run = sample::run();
  std::reverse(run.suites[0].cases.begin(), run.suites[0].cases.end());
  std::reverse(run.suites.begin(), run.suites.end());
  require_same(run, read_back(report::results_json(run)));
}

// Catches: a name that breaks out of its string, reverses a line on a terminal or is not read back.
TEST_CASE("hostile names are safe in results.json and come back") {
  const std::size_t which = GENERATE(range(std::size_t{0}, sample::hostile_names().size()));
  const model::RunResult run = sample::hostile(sample::hostile_names()[which], false);
  const std::string text = report::results_json(run);
  CHECK(base::visible(replaced(text, "\n", "")).find("\\u{202E}") == std::string::npos);
  require_same(run, read_back(text));
}

// Catches: bytes that are no UTF-8 written through, which makes the whole file unreadable.
TEST_CASE("a name that is no UTF-8 leaves results.json readable") {
  model::RunResult run = sample::run();
  run.suites[0].cases[3].checks[0].joint = "a\xFF\xC0\x80z\xE2\x80";
  const std::string joint = read_back(report::results_json(run)).suites[0].cases[3].checks[0].joint;
  CHECK(joint.front() == 'a');
  CHECK(joint.find('z') != std::string::npos);
  CHECK(joint.find("\uFFFD") != std::string::npos);
}

// Catches: a reader that takes what this program did not write. Every fault names its place.
TEST_CASE("read_results refuses what is wrong") {
  const std::string good = report::results_json(sample::run());
  const auto wrong = [&](const std::string& from, const std::string& to) {
    return refusal(replaced(good, from, to));
  };
  CHECK_THAT(wrong("\"results 1\"", "\"results 2\""), Catch::Contains("results.json:2:15: "));
  CHECK_THAT(wrong("\"frames\"", "\"framez\""),
             Catch::Contains("missing") && Catch::Contains("(/suites/0/cases/0/framez)"));
  CHECK_THAT(wrong("\"frames\": 14", "\"frames\": -1"), Catch::Contains("/cases/0/frames)"));
  CHECK_THAT(wrong("\"frames\": 14", "\"frames\": 1.5"), Catch::Contains("/cases/0/frames)"));
  CHECK_THAT(wrong("\"frames\": 14", "\"frames\": \"14\""), Catch::Contains("/cases/0/frames)"));
  CHECK_THAT(wrong("\"verdict\": \"waived\"", "\"verdict\": \"wavied\""),
             Catch::Contains("waived") && Catch::Contains("/cases/1/verdict)"));
  CHECK_THAT(wrong("\"kind\": \"drift\"", "\"kind\": \"drifts\""), Catch::Contains("/kind)"));
  CHECK_THAT(wrong("\"domain\": \"edge\"", "\"domain\": \"egde\""), Catch::Contains("/domain)"));
  CHECK_THAT(wrong("[88, 91]", "[88, -1]"), Catch::Contains("/vertices)"));
  CHECK_THAT(wrong("[88, 91]", "[88, 4294967295]"), Catch::Contains("/vertices)"));
  CHECK_THAT(wrong("[0.1, 0.8, -0.25]", "[0.1, 0.8]"), Catch::Contains("/place)"));
  CHECK_THAT(wrong("[-0.1, 0.1]", "[-0.1, 0.1, 1]"), Catch::Contains("/bound)"));
  CHECK_THAT(wrong("[0.0, -0.004, null]", "[0.0, \"a\"]"),
             Catch::Contains("/series/volume.change)"));
  CHECK_THAT(wrong("\"within\": 1", "\"within\": 2"), Catch::Contains("/counts/within)"));
  CHECK_THAT(wrong("\"problem\": null", "\"problem\": 3"), Catch::Contains("/problem)"));
  CHECK_THAT(wrong("\"line\": 3", "\"line\": 3000000000"), Catch::Contains("/line)"));
}

// Catches: names of stored results leading a sign-off out of the folder of goldens, or to one
// twice.
TEST_CASE("read_results refuses names that no path may be made of") {
  const char* name = GENERATE("..", "../../x", "a/b", "", ".hidden", "a b", "\u202Ea");
  model::RunResult run = sample::run();
  SECTION("suite") {
    run.suites[0].suite = name;
  }
  SECTION("rig") {
    run.suites[0].cases[0].rig = name;
    run.suites[0].cases[0].name = std::string(name) + "/walk/ship";
  }
  SECTION("method") {
    run.suites[0].cases[0].method = name;
    run.suites[0].cases[0].name = "lod0/walk/" + std::string(name);
  }
  CHECK_THAT(refusal(report::results_json(run)), Catch::Contains("letters, digits"));
}

TEST_CASE("read_results refuses a case whose name is another's") {
  model::RunResult run = sample::run();
  run.suites[0].cases[0].name = "lod0/other/ship";
  CHECK_THAT(refusal(report::results_json(run)), Catch::Contains("RIG/MOTION/METHOD"));
  run.suites[0].cases[0] = run.suites[0].cases[1];
  CHECK_THAT(refusal(report::results_json(run)), Catch::Contains("twice"));
}

// Catches: a crash, or half a file taken for a whole one.
TEST_CASE("read_results refuses every beginning of a file") {
  model::RunResult run = sample::run();
  run.suites[0].cases = {sample::beyond()};
  const std::string text = report::results_json(run);
  std::string accepted;
  for (std::size_t size = 0; size + 2 < text.size(); size += 7)
    if (refusal(text.substr(0, size)) == "accepted") accepted += std::to_string(size) + ' ';
  CHECK(accepted.empty());
}
