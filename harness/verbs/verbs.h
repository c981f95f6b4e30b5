#pragma once

namespace CLI {  // NOLINT(readability-identifier-naming): the library's own
class App;
}

/// The verbs of the program. Each adds itself to the command line; run when it was chosen, it sets
/// `code` to the exit code.
namespace verbs {

inline constexpr int kGood = 0, kBeyond = 1, kUsage = 2, kBroken = 3, kNotWritten = 4, kFault = 70;

void add_gate(CLI::App& app, int& code);
void add_signoff(CLI::App& app, int& code);
void add_export(CLI::App& app, int& code);
void add_list(CLI::App& app, int& code);

}  // namespace verbs
