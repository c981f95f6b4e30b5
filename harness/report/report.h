#pragma once

#include "harness/model/result.h"

#include <cstddef>
#include <filesystem>
#include <string>
#include <vector>

/// What people and other programs get to see of a run.
namespace report {

struct RunInfo {
  std::string started;  ///< ISO 8601, UTC
  double seconds = 0;
  std::size_t jobs = 1;
  std::vector<std::string> arguments;
};

/// The same bytes for the same results: no time, host or absolute path.
std::string results_json(const model::RunResult& run);
std::string run_json(const model::RunResult& run, const RunInfo& info);
std::string junit_xml(const model::RunResult& run);

struct ConsoleStyle {
  bool colour = false;
  bool quiet = false;  ///< only cases beyond or broken
  std::size_t width = 120;
  std::string out = "OUT_DIR";  ///< results folder, for the line that tells how to sign off
};
/// The table of one suite; empty when `quiet` leaves nothing to say.
std::string console_suite(const model::SuiteResult& suite, const ConsoleStyle& style);
/// The last line of a run.
std::string console_summary(const model::RunResult& run, const ConsoleStyle& style);

/// Reads results.json back: verdicts, checks and fingerprints, enough for sign-off and reports.
/// Names of suites with cases, and of their cases, are safe to make paths of.
/// Throws InputError naming `shown`, with everything that is wrong.
model::RunResult read_results(const std::filesystem::path& path, const std::string& shown);

/// Reads run.json back and fills in what results.json leaves out: files and golden folders of the
/// suites, seconds of the cases. Throws InputError when it is of another run than `run`.
RunInfo read_run(const std::filesystem::path& path, const std::string& shown,
                 model::RunResult& run);

}  // namespace report
