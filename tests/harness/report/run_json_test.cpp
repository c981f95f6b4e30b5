#include "tests/harness/report/folder.h"
#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>

namespace {

report::RunInfo info() {
  return {"2031-05-17T08:30:00Z", 12.25, 4, {"gate", "suites/mire.json", "--jobs", "4"}};
}

report::RunInfo read_back(const std::string& text, model::RunResult& run) {
  const sample::Folder folder;
  return report::read_run(folder.file("run.json", text), "run.json", run);
}

// What results.json holds of the sample.
model::RunResult bare() {
  model::RunResult run = sample::run();
  for (model::SuiteResult& suite : run.suites) {
    suite.file.clear();
    suite.golden_folder.clear();
    for (model::CaseResult& result : suite.cases) result.seconds = 0;
  }
  return run;
}

}  // namespace

// Catches: a key missing, renamed or in another place.
TEST_CASE("run.json has its keys in order") {
  model::RunResult run = sample::run();
  run.suites[0].cases.erase(run.suites[0].cases.begin() + 1, run.suites[0].cases.begin() + 3);
  CHECK(report::run_json(run, info()) == R"({
  "skinfold": "run 1",
  "version": ")" SKINFOLD_VERSION R"(",
  "started": "2031-05-17T08:30:00Z",
  "seconds": 12.25,
  "jobs": 4,
  "arguments": [
    "gate",
    "suites/mire.json",
    "--jobs",
    "4"
  ],
  "suites": [
    {
      "suite": "mire-strider",
      "file": "suites/mire.json",
      "golden": "golden/mire-strider",
      "cases": {
        "lod0/walk/ship": 0.0,
        "lod0/knee/ship": 1.5,
        "lod0/turn/ship": 0.0
      }
    },
    {
      "suite": "house",
      "file": "suites/house.json",
      "golden": "",
      "cases": {}
    }
  ]
}
)");
}

// Catches: a sign-off that writes into another folder than the one the run was judged against.
TEST_CASE("read_run fills in what results.json leaves out") {
  const std::string hostile = GENERATE(as<std::string>{}, "golden/mire", "\"\u202E\\\x01 <&>");
  model::RunResult run = sample::run();
  run.suites[0].golden_folder = hostile;
  run.suites[1].file = hostile;
  report::RunInfo said = info();
  said.arguments.push_back(hostile);

  model::RunResult filled = bare();
  const report::RunInfo back = read_back(report::run_json(run, said), filled);
  CHECK(back.started == said.started);
  CHECK(back.seconds == said.seconds);
  CHECK(back.jobs == said.jobs);
  CHECK(back.arguments == said.arguments);
  for (std::size_t i = 0; i < run.suites.size(); ++i) {
    CHECK(filled.suites[i].file == run.suites[i].file);
    CHECK(filled.suites[i].golden_folder == run.suites[i].golden_folder);
    for (std::size_t k = 0; k < run.suites[i].cases.size(); ++k)
      CHECK(filled.suites[i].cases[k].seconds == run.suites[i].cases[k].seconds);
  }
}

// Catches: results of one run put together with the folders of another.
TEST_CASE("read_run refuses a file of another run or another shape") {
  const std::string good = report::run_json(sample::run(), info());
  model::RunResult run = bare();
  std::string text = good;
  std::string expected;
  SECTION("other suite") {
    run.suites[0].suite = "mire-stalker";
    expected = "different runs";
  }
  SECTION("fewer suites") {
    run.suites.pop_back();
    expected = "different runs";
  }
  SECTION("other cases") {
    run.suites[0].cases[0].name = "lod0/swim/ship";
    expected = "'lod0/swim/ship' is missing";
  }
  SECTION("more cases") {
    run.suites[0].cases.pop_back();
    expected = "unknown key 'lod0/turn/ship'";
  }
  SECTION("other version") {
    text.replace(text.find("run 1"), 5, "run 9");
    expected = "another version";
  }
  SECTION("negative time") {
    text.replace(text.find("12.25"), 5, "-1.25");
    expected = "/seconds)";
  }
  SECTION("cut short") {
    text.resize(text.size() / 2);
    expected = "run.json:";
  }
  CHECK_THROWS_WITH(read_back(text, run), Catch::Contains(expected));
}
