#include "harness/report/findings.h"
#include "harness/report/text.h"
#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>

#include <sstream>

namespace {

std::vector<std::string> lines_of(const std::string& text) {
  std::istringstream stream(text);
  std::vector<std::string> lines;
  for (std::string line; std::getline(stream, line);) lines.push_back(line);
  return lines;
}

std::string used(double value) {
  model::Check check;
  check.used = value;
  return report::used_text(check);
}

}  // namespace

// Catches: a column, verdict or remark that gets lost, or a layout that no longer lines up.
TEST_CASE("the console shows a suite with every verdict") {
  CHECK("\n" + report::console_suite(sample::run().suites[0], {.width = 120}) == R"(
mire-strider  5 cases: 1 within, 1 waived, 1 unsigned, 1 beyond, 1 broken
  within    lod0/walk/ship     14 frames     48 %  position.max (drift)
  waived    lod0/nod/ship      14 frames
  unsigned  lod0/shrug/ship    14 frames
  beyond    lod0/knee/ship     14 frames     over  dihedral.max (drift)
    statistic         check      value       bound  used  frame     time  joint    failing  place
    edge_stretch.max  drift      0.031     ≤ 0.005  6.2x      9  0.375 s  shin.L  14 edges  0.1, 0.8, -0.25
    dihedral.max      drift  undefined        ≤ 2°  over      -        -  -              -  -
    volume.change     limit       -0.3  -0.1 … 0.1  3.0x      3  0.125 s  -              -  -
    dihedral.max: undefined in frame 4, where the golden has a value
    changed since sign-off: weights
  broken    lod0/turn/ship
    strider.glb:3:7: ends after 12 bytes (/nodes/2)
  note: some elements are too thin to be judged, and counted: position (lod0/walk/ship)
  note: known until the new rig (lod0/nod/ship)
  note: the joint 'shin.L' was called 'shin_L' (lod0/knee/ship)
  note: some elements are too thin to be judged, and counted: edge_stretch (lod0/knee/ship)
  to sign off what has no golden yet: skinfold signoff OUT_DIR --by NAME --why TEXT
)");
}

// Catches: a suite that was not read and is passed over in silence.
TEST_CASE("the console shows what is wrong with a suite that was not read") {
  const std::string expected = R"(
house  not run: 2 problems in the suite file
  suites/house.json:4:3: unknown key 'rigz' (/rigz)
  suites/house.json:1:1: the key 'motions' is missing
)";
  const model::SuiteResult suite = sample::run().suites[1];
  CHECK("\n" + report::console_suite(suite, {}) == expected);
  CHECK("\n" + report::console_suite(suite, {.quiet = true}) == expected);
}

// Catches: more rows than a glance takes, worse checks left out for better ones, a wrong count.
TEST_CASE("the console shows the six worst checks and counts the others") {
  model::SuiteResult suite = sample::run().suites[0];
  suite.cases = {sample::result("knee", model::Verdict::Beyond)};
  suite.cases[0].frames = 1;
  for (int i = 0; i < 10; ++i) {
    model::Check check = sample::drift("position.p99", 2e-5 * (100 - i), 1e-5);
    check.joint.clear();
    check.place.reset();
    check.time.reset();
    check.domain = metrics::Domain::Vertex;
    check.failing = 1;
    suite.cases[0].checks.push_back(check);
  }
  CHECK("\n" + report::console_suite(suite, {}) == R"(
mire-strider  1 case: 1 beyond
  beyond    lod0/knee/ship      1 frame     200x  position.p99 (drift)
    statistic     check      value     bound  used  frame   failing
    position.p99  drift    0.002 D  ≤ 1e-5 D  200x      9  1 vertex
    position.p99  drift  0.00198 D  ≤ 1e-5 D  198x      9  1 vertex
    position.p99  drift  0.00196 D  ≤ 1e-5 D  196x      9  1 vertex
    position.p99  drift  0.00194 D  ≤ 1e-5 D  194x      9  1 vertex
    position.p99  drift  0.00192 D  ≤ 1e-5 D  192x      9  1 vertex
    position.p99  drift   0.0019 D  ≤ 1e-5 D  190x      9  1 vertex
    … and 4 more checks beyond
    no input changed since sign-off: the code did
  note: some elements are too thin to be judged, and counted: position
)");
}

// Catches: blaming the code where only a limit is exceeded, which needs no golden.
TEST_CASE("the code is blamed only where the skin differs from the golden") {
  model::CaseResult result = sample::result("knee", model::Verdict::Beyond);
  result.checks = {sample::limit("volume.change", -0.3, -0.1, 0.1, 3.0)};
  CHECK(report::remarks(result).empty());
  result.checks.push_back(sample::drift("position.max", 2, 1));
  CHECK(report::remarks(result) ==
        std::vector<std::string>{"no input changed since sign-off: the code did"});
}

// Catches: a remark that is repeated under every case, or that does not say whose it is.
TEST_CASE("what several cases have in common is said once") {
  model::SuiteResult suite;
  suite.suite = "s";
  for (const char* name : {"a", "b", "c"})
    suite.cases.push_back(sample::result(name, model::Verdict::Within));
  for (model::CaseResult& result : suite.cases) {
    result.checks.clear();
    result.notes = {"bind scale"};
    result.changed = {"weights"};
  }
  suite.cases[0].notes.emplace_back("alone");
  suite.cases[2].changed.clear();
  CHECK("\n" + report::console_suite(suite, {}) == R"(
s  3 cases: 3 within
  within    lod0/a/ship    14 frames
  within    lod0/b/ship    14 frames
  within    lod0/c/ship    14 frames
  changed since sign-off: weights (2 cases, first lod0/a/ship)
  note: bind scale (all cases)
  note: alone (lod0/a/ship)
)");
}

// Catches: blaming the code for a difference between two methods.
TEST_CASE("a case compared with another method blames nothing") {
  model::CaseResult result = sample::result("knee", model::Verdict::Beyond);
  result.checks = {sample::drift("position.max", 2, 1)};
  result.against = "ship";
  CHECK(report::change_remark(result).empty());
}

// Catches: quiet that hides a case beyond or broken, or shows another.
TEST_CASE("quiet leaves the cases beyond and broken") {
  model::SuiteResult suite = sample::run().suites[0];
  const std::string text = report::console_suite(suite, {.quiet = true});
  for (const char* shown : {"mire-strider", "lod0/knee/ship", "lod0/turn/ship"})
    CHECK(text.find(shown) != std::string::npos);
  for (const char* hidden : {"lod0/walk/ship", "lod0/nod/ship", "lod0/shrug/ship", "sign off"})
    CHECK(text.find(hidden) == std::string::npos);
  suite.cases.resize(3);
  CHECK(report::console_suite(suite, {.quiet = true}).empty());
}

// Catches: colour codes where none were asked for, and a verdict that only colour tells.
TEST_CASE("colour adds codes and takes no word away") {
  const model::RunResult run = sample::run();
  const report::ConsoleStyle plain, coloured{.colour = true};
  std::string text =
      report::console_suite(run.suites[0], coloured) + report::console_summary(run, coloured);
  CHECK(text.find("\x1b[31mbeyond\x1b[0m") != std::string::npos);
  for (std::size_t at = text.find('\x1b'); at != std::string::npos; at = text.find('\x1b'))
    text.erase(at, text.find('m', at) - at + 1);
  CHECK(text == report::console_suite(run.suites[0], plain) + report::console_summary(run, plain));
}

// Catches: counts that do not add up, and a last line without the verdict.
TEST_CASE("the last line counts the verdicts") {
  model::RunResult run = sample::run();
  CHECK(report::console_summary(run, {}) ==
        "1 within, 1 waived, 1 unsigned, 1 beyond, 1 broken, 1 suite not run: suite wrong\n");
  run.suites.resize(1);
  run.suites[0].cases = {sample::result("a", model::Verdict::Within),
                         sample::result("b", model::Verdict::Within),
                         sample::result("c", model::Verdict::Beyond)};
  run.verdict = model::Verdict::Beyond;
  CHECK(report::console_summary(run, {}) == "2 within, 1 beyond: beyond\n");
}

// Catches: tables wider than the terminal, and columns that names in other scripts push aside.
TEST_CASE("tables fit the width and line up by what is seen") {
  const std::size_t width = GENERATE(80u, 100u, 120u);
  model::SuiteResult suite = sample::run().suites[0];
  model::CaseResult& result = suite.cases[3];
  result.checks.resize(1);
  for (const std::string& name : sample::hostile_names()) {
    result.checks.push_back(sample::drift("edge_stretch.max", 0.031, 0.005));
    result.checks.back().joint = name;
  }
  result.checks.resize(6);
  result.checks[4].joint = sample::hostile_names()[8];  // two columns a character
  result.checks[5].joint = sample::hostile_names()[9];  // 300 letters
  result.checks[3].joint = "e\u0301paule";              // a combining accent
  const std::vector<std::string> lines = lines_of(report::console_suite(suite, {.width = width}));
  std::size_t column = 0, rows = 0;
  for (const std::string& line : lines) {
    if (line.find("edge_stretch.max  drift") == std::string::npos) continue;
    ++rows;
    CHECK(report::display_width(line) <= width);
    // Where the table is wide enough for what stands after the joint, that begins in one column.
    const std::size_t after = line.find("14 edges");
    REQUIRE((after != std::string::npos) == (width > 100));
    if (after == std::string::npos) continue;
    const std::size_t at = report::display_width(line.substr(0, after));
    if (column == 0) column = at;
    CHECK(at == column);
  }
  CHECK(rows == 6);
}

// Catches: bytes or characters counted where columns are meant. Source: UAX 11 and elementary.
TEST_CASE("display width counts columns") {
  CHECK(report::display_width("") == 0);
  CHECK(report::display_width("shin.L") == 6);
  CHECK(report::display_width("é≤°…") == 4);
  CHECK(report::display_width("e\u0301") == 1);
  CHECK(report::display_width("骨盤") == 4);
  CHECK(report::display_width("\U0001F980") == 2);
  CHECK(report::padded("骨", 4) + "|" == "骨  |");
  CHECK(report::padded("骨", 4, report::Align::Right) == "  骨");
}

// Catches: a name cut within a character, made longer, or cut though it fits.
TEST_CASE("shortened names keep both ends and the width") {
  CHECK(report::shortened("shin.L", 6) == "shin.L");
  CHECK(report::shortened("character_arm.L", 9) == "char…rm.L");
  CHECK(report::shortened("abc", 0).empty());
  for (std::size_t width = 1; width < 24; ++width) {
    const std::string text = report::shortened("骨盤e\u0301ünïcödé腕上腕前腕手", width);
    CHECK(report::display_width(text) <= width);
    CHECK(base::visible(text) == text);  // still whole characters
  }
}

// Catches: "100 %" for what is not on its bound, or "1x" for what is just beyond it.
// Source: elementary.
TEST_CASE("used is told as a share within and as a multiple beyond") {
  CHECK(used(0) == "0 %");
  CHECK(used(0.0004) == "<0.1 %");
  CHECK(used(0.0052) == "0.5 %");
  CHECK(used(0.29) == "29 %");
  CHECK(used(0.999) == "99 %");
  CHECK(used(1) == "100 %");
  CHECK(used(1.0000001) == "1.001x");
  CHECK(used(6.2) == "6.2x");
  CHECK(used(62.4) == "62x");
  CHECK(used(1e300) == ">99999x");
  model::Check over;
  over.verdict = model::Verdict::Beyond;
  CHECK(report::used_text(over) == "over");
}

// Catches: a value beyond its bound that reads the same as the bound. Source: elementary.
TEST_CASE("numbers have four digits, and more where the bound needs them") {
  CHECK(report::number_text(0.0310049) == "0.031");
  CHECK(report::number_text(-2e-5) == "-2e-5");
  CHECK(report::number_text(123456) == "1.235e5");
  CHECK(report::number_text(1e100) == "1e100");
  CHECK(report::number_text(-0.0) == "0");
  model::Check check = sample::limit("edge_stretch.p99", 1.600001, {}, 1.6, 1.000002);
  CHECK(report::value_text(check) == "1.600001");
  check.value = 1.9;
  CHECK(report::value_text(check) == "1.9");
  CHECK(report::value_text(sample::drift("dihedral.max", 12.41, 5)) == "12.41°");
  CHECK(report::value_text(sample::drift("position.max", 0.5, 5)) == "0.5 D");
}

// Catches: two kinds of check told in one way, or a reason left out.
TEST_CASE("a check is told in a sentence") {
  CHECK(report::sentence(sample::limit("volume.change", -0.3, -0.1, 0.1, 3)) ==
        "volume.change is -0.3, bound -0.1 … 0.1 (3.0x), frame 3 at 0.125 s");
  CHECK(report::sentence(sample::limit("edge_stretch.min", 0.4, 0.5, {}, 1.2)) ==
        "edge_stretch.min is 0.4, bound ≥ 0.5 (1.2x), frame 3 at 0.125 s");
  model::Check shape;
  shape.statistic = "frames";
  shape.kind = "shape";
  shape.value = 14;
  shape.golden = 12;
  shape.verdict = model::Verdict::Beyond;
  shape.reason = "the motion has other frames than the golden";
  CHECK(report::sentence(shape) ==
        "frames (shape): 14, expected = 12 (over); the motion has other frames than the golden");
}
