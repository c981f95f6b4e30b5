#include "harness/base/file.h"
#include "harness/golden/golden.h"
#include "harness/report/report.h"
#include "harness/verbs/verbs.h"

#include <CLI/CLI.hpp>
#include <fmt/chrono.h>
#include <fmt/format.h>

#include <chrono>
#include <memory>

namespace verbs {

namespace fs = std::filesystem;

namespace {

struct Arguments {
  std::string out, by, role, why;
  std::vector<std::string> only;
  bool dry_run = false, despite_limits = false;
};

// A case that can be signed, and where.
struct Signing {
  std::string name;
  fs::path source, target;
  model::Record candidate;
};

// Why a case cannot be signed; empty when it can.
std::string refusal(const model::CaseResult& result, const model::Record* candidate,
                    bool despite_limits) {
  if (result.verdict == model::Verdict::Broken) return "is broken: it could not be computed";
  if (candidate == nullptr)
    return "has no frames to sign: gate it again (methods compared with another method have no "
           "golden)";
  if (candidate->non_finite > 0)
    return fmt::format("holds {} coordinates that are no finite numbers", candidate->non_finite);
  if (candidate->inputs != result.inputs)
    return "has frames of another run than results.json: gate it again";
  for (const model::Check& check : result.checks)
    if (check.kind == "limit" && check.verdict == model::Verdict::Beyond && !despite_limits)
      return fmt::format(
          "is beyond a limit, {}: mend it, change the limit, or say --despite-limits",
          check.statistic);
  return {};
}

int signoff(const Arguments& arguments) {
  const fs::path out = arguments.out;
  model::RunResult run =
      report::read_results(out / "results.json", (out / "results.json").string());
  report::read_run(out / "run.json", (out / "run.json").string(), run);
  std::vector<Signing> signings;
  std::size_t named = 0, refused = 0, already = 0;
  for (const model::SuiteResult& suite : run.suites)
    for (const model::CaseResult& result : suite.cases) {
      bool chosen = arguments.only.empty();
      for (const std::string& glob : arguments.only)
        chosen = chosen || base::glob_match(glob, result.name);
      if (!chosen) continue;
      ++named;
      if (result.verdict == model::Verdict::Within || result.verdict == model::Verdict::Waived) {
        ++already;
        continue;
      }
      Signing signing;
      signing.name = result.name;
      signing.source = golden::case_folder(out / "frames", suite.suite, result.name);
      std::error_code error;
      const bool candidate = fs::exists(signing.source / "record.json", error);
      if (candidate)
        signing.candidate = golden::read_record(signing.source / "record.json",
                                                (signing.source / "record.json").string());
      const std::string why =
          refusal(result, candidate ? &signing.candidate : nullptr, arguments.despite_limits);
      if (!why.empty()) {
        ++refused;
        fmt::print(stderr, "refused: {} {}\n", base::visible(result.name), base::visible(why));
        continue;
      }
      signing.target = golden::case_folder(suite.golden_folder, suite.suite, result.name);
      signings.push_back(std::move(signing));
    }
  if (named == 0 && !arguments.only.empty()) {
    fmt::print(stderr, "no case is selected by --only {}\n", arguments.only.front());
    return kUsage;
  }
  if (arguments.dry_run) {
    for (const Signing& signing : signings)
      for (const fs::path& path : golden::planned_writes(signing.target, signing.candidate))
        fmt::print("{}\n", path.string());
    return refused > 0 ? kBeyond : kGood;
  }
  for (const Signing& signing : signings) golden::check_writable(signing.target);
  model::SignOff sign{arguments.by, arguments.role, "", arguments.why, ""};
  sign.when = fmt::format("{:%Y-%m-%dT%H:%M:%SZ}",
                          fmt::gmtime(std::chrono::time_point_cast<std::chrono::seconds>(
                              std::chrono::system_clock::now())));
  for (const Signing& signing : signings) {
    golden::sign(signing.source, signing.target, sign);
    fmt::print("signed {}\n", signing.name);
  }
  fmt::print("{} signed, {} refused, {} already within\n", signings.size(), refused, already);
  return refused > 0 ? kBeyond : kGood;
}

}  // namespace

void add_signoff(CLI::App& app, int& code) {
  auto arguments = std::make_shared<Arguments>();
  CLI::App* verb = app.add_subcommand("signoff", "Make the results of a gate run the goldens");
  verb->add_option("OUT_DIR", arguments->out, "Results folder of the gate run")->required();
  const auto said = [](const std::string& text) {
    return text.find_first_not_of(" \t\r\n") == std::string::npos ? std::string("must not be empty")
                                                                  : std::string();
  };
  verb->add_option("--by", arguments->by, "Who signs")->required()->check(said);
  verb->add_option("--role", arguments->role, "In which role");
  verb->add_option("--why", arguments->why, "Why this is right")->required()->check(said);
  verb->add_option("--only", arguments->only,
                   "Only cases whose name fits this pattern (* ** ?); repeatable")
      ->expected(1)
      ->multi_option_policy(CLI::MultiOptionPolicy::TakeAll);
  verb->add_flag("--dry-run", arguments->dry_run,
                 "Print every path that would be written, write nothing");
  verb->add_flag("--despite-limits", arguments->despite_limits, "Sign cases beyond a limit too");
  verb->footer(
      "Nothing is computed anew: what is signed is what was judged. Exit codes: 0, 1 something was "
      "refused, 2 wrong usage, 4 a golden could not be written.");
  verb->callback([arguments, &code] { code = signoff(*arguments); });
}

}  // namespace verbs
