#include "harness/report/formats.h"
#include "harness/report/json_writer.h"

namespace report {

std::string run_json(const model::RunResult& run, const RunInfo& info) {
  JsonWriter out;
  out.open_object();
  out.text("skinfold", "run 1");
  out.text("version", SKINFOLD_VERSION);
  out.text("started", info.started);
  out.number("seconds", info.seconds);
  out.count("jobs", info.jobs);
  out.texts("arguments", info.arguments);
  out.open_list("suites");
  for (const model::SuiteResult& suite : run.suites) {
    out.open_object();
    out.text("suite", suite.suite);
    out.text("file", suite.file);
    out.text("golden", suite.golden_folder);
    out.open_object("cases");
    for (const model::CaseResult& result : suite.cases) out.number(result.name, result.seconds);
    out.close();
    out.close();
  }
  out.close();
  out.close();
  return std::move(out).finish();
}

Format run_json_format() {
  return {.name = "run_json",
          .file = "run.json",
          .summary = "when, how long and with what arguments; files of suites and golden folders",
          .write = run_json};
}

}  // namespace report
