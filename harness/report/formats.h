#pragma once

#include "harness/report/report.h"

#include <string>
#include <string_view>
#include <vector>

namespace report {

/// A kind of report, as data.
struct Format {
  std::string_view name;  ///< as in formats.def
  std::string_view file;  ///< its name in the folder of results; empty: standard output
  std::string_view summary;
  std::string (*write)(const model::RunResult&, const RunInfo&) = nullptr;
};

#define FORMAT(name) Format name##_format();
#include "harness/report/formats.def"
#undef FORMAT

/// All kinds of report, in the order of formats.def.
const std::vector<Format>& formats();

}  // namespace report
