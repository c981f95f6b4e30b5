#pragma once

#include "harness/model/result.h"

#include <array>
#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

/// What the results say, in words that every report shares. All text is visible (base::visible).
namespace report {

using VerdictCounts = std::array<std::size_t, 5>;  ///< cases per verdict, in the order of Verdict
VerdictCounts count_verdicts(const model::SuiteResult& suite);
VerdictCounts count_verdicts(const model::RunResult& run);
/// "3 within, 1 beyond"; empty without any case.
std::string counts_text(const VerdictCounts& counts);

/// "D", "°" or nothing: what follows a number of `statistic`.
std::string unit_text(std::string_view statistic);

/// Value, bound ("≤ 1.6", "-0.1 … 0.1") and use ("48 %", "6.2x", "over") of a check. A value that
/// is beyond is told with as many digits as it takes to differ from its bound.
std::string value_text(const model::Check& check);
std::string bound_text(const model::Check& check);
std::string used_text(const model::Check& check);

/// The check in one sentence, without a full stop.
std::string sentence(const model::Check& check);

/// The check with the largest use, one beyond without a number first; null where there is none.
const model::Check* most_used(const model::CaseResult& result);

/// Table of the worst checks beyond, and a sentence for every one that has a reason.
std::vector<std::string> beyond_lines(const model::CaseResult& result, std::size_t width);

/// What changed since sign-off; empty where nothing is to be said.
std::string change_remark(const model::CaseResult& result);

/// What changed since sign-off, and the notes: one sentence each.
std::vector<std::string> remarks(const model::CaseResult& result);

/// The call that makes results the goldens.
inline constexpr std::string_view kSignOff = "skinfold signoff OUT_DIR --by NAME --why TEXT";

}  // namespace report
