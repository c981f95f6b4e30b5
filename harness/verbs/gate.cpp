#include "harness/base/file.h"
#include "harness/pipeline.h"
#include "harness/report/report.h"
#include "harness/suite/suite.h"
#include "harness/verbs/verbs.h"

#include <CLI/CLI.hpp>
#include <fmt/chrono.h>
#include <fmt/format.h>

#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <map>
#include <memory>
#include <sys/ioctl.h>
#include <thread>
#include <unistd.h>

namespace verbs {

namespace fs = std::filesystem;

namespace {

struct Arguments {
  std::vector<std::string> suites;
  std::string golden, out = "skinfold-out", tag;
  std::vector<std::string> only;
  std::size_t jobs = std::max(1u, std::thread::hardware_concurrency());
  bool quiet = false, allow_unsigned = false;
};

// A suite file that was read, or what is wrong with it.
struct Loaded {
  std::optional<model::Suite> suite;
  model::SuiteResult result;
};

Loaded load(const std::string& path) {
  Loaded loaded;
  loaded.result.file = path;
  try {
    loaded.suite = suite::load_suite(path, skinning::specs());
    loaded.result.suite = loaded.suite->name;
  } catch (const base::InputError& error) {
    loaded.result.suite = fs::path(path).filename().string();
    loaded.result.verdict = model::Verdict::Broken;
    loaded.result.problems = error.problems();
    loaded.result.problem = error.problems().front();
  }
  return loaded;
}

std::vector<Loaded> load_all(const std::vector<std::string>& paths) {
  std::vector<Loaded> all;
  std::map<std::string, std::string> names;
  for (const std::string& path : paths) {
    Loaded loaded = load(path);
    if (loaded.suite) {
      std::string key = loaded.suite->name;  // some file systems do not tell case apart
      for (char& c : key) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
      const auto [first, fresh] = names.emplace(key, fs::path(path).filename().string());
      if (!fresh) {
        base::Problem problem;
        problem.file = loaded.suite->file;
        problem.message = fmt::format(
            "the suite {} has the same name, '{}'; goldens and results go by it: "
            "gate them in two runs, or rename one",
            first->second, loaded.suite->name);
        loaded.suite.reset();
        loaded.result.verdict = model::Verdict::Broken;
        loaded.result.problems = {problem};
        loaded.result.problem = problem;
      }
    }
    all.push_back(std::move(loaded));
  }
  return all;
}

// Progress on a terminal: one line, rewritten, gone when the results come.
std::function<void(std::size_t, std::size_t, const std::string&)> progress_line() {
  if (isatty(STDERR_FILENO) == 0) return {};
  return [](std::size_t done, std::size_t total, const std::string& name) {
    fmt::print(stderr, "\r\033[K{}/{} {}", done, total, base::visible(name));
    if (done == total) fmt::print(stderr, "\r\033[K");
    std::fflush(stderr);
  };
}

report::ConsoleStyle console_style(bool quiet) {
  report::ConsoleStyle style;
  style.quiet = quiet;
  style.colour = isatty(STDOUT_FILENO) != 0 &&
                 std::getenv("NO_COLOR") == nullptr;  // NOLINT(concurrency-mt-unsafe)
  struct winsize size {};
  if (::ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) == 0 && size.ws_col >= 60)
    style.width = size.ws_col;
  return style;
}

int exit_code(const model::RunResult& run, bool allow_unsigned) {
  bool wrong_suite = false, broken = false, beyond = false;
  for (const model::SuiteResult& suite : run.suites) {
    wrong_suite = wrong_suite || suite.problem.has_value();
    for (const model::CaseResult& each : suite.cases) {
      wrong_suite = wrong_suite || (each.verdict != model::Verdict::Broken && each.checks.empty());
      broken = broken || each.verdict == model::Verdict::Broken;
      beyond = beyond || each.verdict == model::Verdict::Beyond ||
               (each.verdict == model::Verdict::Unsigned && !allow_unsigned);
    }
  }
  return wrong_suite ? kUsage : broken ? kBroken : beyond ? kBeyond : kGood;
}

// Folders that cases within left empty.
void remove_empty_folders(const fs::path& folder) {
  std::error_code error;
  std::vector<fs::path> folders;
  for (fs::recursive_directory_iterator at(folder, error), end; !error && at != end;
       at.increment(error))
    if (at->is_directory(error) && !at->is_symlink(error)) folders.push_back(at->path());
  for (auto at = folders.rbegin(); at != folders.rend(); ++at) fs::remove(*at, error);
  fs::remove(folder, error);
}

void print_suite(const model::SuiteResult& suite, const report::ConsoleStyle& style) {
  const std::string text = report::console_suite(suite, style);
  std::fwrite(text.data(), 1, text.size(), stdout);
  std::fflush(stdout);
}

// What is wrong where the options select no case of any suite that could be read.
std::string selection_fault(const std::vector<Loaded>& suites,
                            const harness::GateOptions& options) {
  std::vector<std::string> names, tags;
  bool readable = false;
  for (const Loaded& loaded : suites) {
    if (!loaded.suite) continue;
    readable = true;
    if (!harness::chosen_cases(*loaded.suite, options).empty()) return {};
    for (const auto& spec : loaded.suite->cases) names.push_back(spec.name);
    for (const auto& motion : loaded.suite->motions)
      for (const std::string& tag : motion.tags)
        if (std::find(tags.begin(), tags.end(), tag) == tags.end()) tags.push_back(tag);
  }
  if (!readable) return {};
  std::string asked;
  for (const std::string& glob : options.only) asked += fmt::format(" --only '{}'", glob);
  if (!options.tag.empty()) asked += fmt::format(" --tag '{}'", options.tag);
  if (asked.empty()) return "no case is left: every pattern of 'cases' fits none";
  std::string text = fmt::format("no case is selected by{}", asked);
  if (!options.only.empty())
    text += fmt::format("; a pattern is held against the whole name, e.g. '{}'{}", names.front(),
                        options.only.front().find('/') == std::string::npos
                            ? fmt::format(" or '**/{}/**'", options.only.front())
                            : "");
  else
    text += base::hint(options.tag, tags);
  return base::visible(text);
}

int gate(const Arguments& arguments) {
  using Clock = std::chrono::system_clock;
  const auto start = Clock::now();
  harness::GateOptions options;
  if (!arguments.golden.empty()) options.golden = fs::absolute(arguments.golden);
  options.out = arguments.out;
  options.only = arguments.only;
  options.tag = arguments.tag;
  options.jobs = arguments.jobs;
  options.progress = progress_line();

  std::vector<Loaded> suites = load_all(arguments.suites);
  report::ConsoleStyle style = console_style(arguments.quiet);
  style.out = arguments.out;
  // Results of an earlier run must not be taken for those of this one if it ends early.
  std::error_code ignored;
  for (const char* name : {"results.json", "run.json", "junit.xml"})
    fs::remove(options.out / name, ignored);
  if (const std::string fault = selection_fault(suites, options); !fault.empty()) {
    for (const Loaded& loaded : suites)
      if (!loaded.suite) print_suite(loaded.result, style);
    fmt::print(stderr, "{}\n", fault);
    return kUsage;
  }

  model::RunResult run;
  for (Loaded& loaded : suites) {
    if (loaded.suite) loaded.result = harness::gate_suite(*loaded.suite, options);
    print_suite(loaded.result, style);
    run.verdict = std::max(run.verdict, loaded.result.verdict);
    run.suites.push_back(std::move(loaded.result));
  }
  remove_empty_folders(options.out / "frames");

  report::RunInfo info;
  info.started =
      fmt::format("{:%Y-%m-%dT%H:%M:%SZ}",
                  fmt::gmtime(std::chrono::time_point_cast<std::chrono::seconds>(start)));
  info.seconds = std::chrono::duration<double>(Clock::now() - start).count();
  info.jobs = options.jobs;
  info.arguments = arguments.suites;
  base::write_file(options.out / "run.json", report::run_json(run, info));
  base::write_file(options.out / "junit.xml", report::junit_xml(run));
  base::write_file(options.out / "results.json", report::results_json(run));
  const std::string summary = report::console_summary(run, style);
  std::fwrite(summary.data(), 1, summary.size(), stdout);
  return exit_code(run, arguments.allow_unsigned);
}

}  // namespace

void add_gate(CLI::App& app, int& code) {
  auto arguments = std::make_shared<Arguments>();
  CLI::App* verb =
      app.add_subcommand("gate", "Compute every case of the suites, measure it and judge it");
  verb->add_option("SUITE", arguments->suites, "Suite files")->required();
  verb->add_option("--golden", arguments->golden,
                   "Folder of the goldens (default: golden in the suite's root)");
  verb->add_option("--out", arguments->out, "Folder for the results")->capture_default_str();
  verb->add_option("--only", arguments->only,
                   "Only cases whose name fits this pattern (* ** ?); repeatable")
      ->expected(1)
      ->multi_option_policy(CLI::MultiOptionPolicy::TakeAll);
  verb->add_option("--tag", arguments->tag, "Only motions with this tag");
  verb->add_option("--jobs", arguments->jobs, "Threads")
      ->check(CLI::Range(1, 1024))
      ->capture_default_str();
  verb->add_flag("--quiet", arguments->quiet, "Print only cases that are beyond or broken");
  verb->add_flag("--allow-unsigned", arguments->allow_unsigned,
                 "Exit with 0 although cases have no golden yet");
  verb->footer(
      "Exit codes: 0 all within, 1 beyond or unsigned, 2 wrong usage or suite, 3 broken case, "
      "4 results not written, 70 a fault of skinfold itself.");
  verb->callback([arguments, &code] { code = gate(*arguments); });
}

}  // namespace verbs
