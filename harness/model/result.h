#pragma once

#include "harness/base/error.h"
#include "metrics/metric.h"

#include <array>
#include <map>
#include <optional>
#include <string>
#include <vector>

namespace model {

/// Worst last.
enum class Verdict { Within, Waived, Unsigned, Beyond, Broken };
std::string verdict_name(Verdict verdict);

/// One bound held against one statistic, over all frames of a case; the frame of the largest use.
struct Check {
  std::string statistic;  ///< "edge_stretch.max"; for kind shape: what differs
  std::string kind;       ///< limit, drift, shape, bits
  metrics::Domain domain = metrics::Domain::Frame;
  std::optional<double> value;  ///< empty: undefined
  std::optional<double> golden;
  std::optional<double> low, high;  ///< bounds of a limit
  std::optional<double> allowance;  ///< of a drift
  std::optional<double> used;       ///< empty: no finite number
  bool over = false;                ///< exceeded where `used` is no finite number
  Verdict verdict = Verdict::Within;
  std::optional<std::size_t> frame;
  std::optional<double> time;
  std::optional<std::size_t> element;
  std::vector<metrics::Index> vertices;
  std::optional<std::array<double, 3>> place;
  std::string joint;          ///< empty: none
  std::size_t failing = 0;    ///< elements beyond in that frame
  std::size_t undecided = 0;  ///< elements that could not be judged in that frame
  std::string reason;         ///< a sentence where the numbers do not say it
};

/// SHA-256 of each group of inputs, hex; a group that a rig does not have is absent.
using Fingerprints =
    std::map<std::string, std::string>;  // positions faces weights joints bind motion method

struct CaseResult {
  std::string name, rig, motion, method;
  std::string against;  ///< method compared with instead of the golden; or empty
  std::size_t frames = 0, vertices = 0;
  Verdict verdict = Verdict::Within;
  Fingerprints inputs;
  std::vector<std::string> changed;
  std::vector<std::string> notes;
  std::vector<Check> checks;                          ///< worst first
  std::map<std::string, std::vector<double>> series;  ///< NaN: undefined
  std::optional<base::Problem> problem;
  double seconds = 0;  ///< for run.json only
};

struct SuiteResult {
  std::string suite;
  std::string file;
  Verdict verdict = Verdict::Within;
  std::optional<base::Problem> problem;  ///< the first of `problems`
  std::vector<base::Problem> problems;   ///< everything wrong with the suite file
  std::vector<CaseResult> cases;
  std::string golden_folder;  ///< for run.json only
};

struct RunResult {
  Verdict verdict = Verdict::Within;
  std::vector<SuiteResult> suites;
};

}  // namespace model
