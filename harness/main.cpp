#include "harness/base/error.h"
#include "harness/verbs/verbs.h"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <cstdio>
#include <exception>
#include <new>

namespace {

int run(int argc, char** argv) {
  CLI::App app(
      "Skinfold checks how character skins deform: it computes the skin of every case of a "
      "suite, measures it and holds it against limits and signed-off goldens.");
  app.name("skinfold");
  app.set_version_flag("--version", "skinfold " SKINFOLD_VERSION);
  app.require_subcommand(1);
  int code = verbs::kGood;
  verbs::add_gate(app, code);
  verbs::add_signoff(app, code);
  verbs::add_export(app, code);
  verbs::add_list(app, code);
  try {
    app.parse(argc, argv);
  } catch (const CLI::ParseError& error) {
    return app.exit(error) == 0 ? verbs::kGood : verbs::kUsage;
  }
  return code;
}

}  // namespace

int main(int argc, char** argv) {
  try {
    return run(argc, argv);
  } catch (const base::InputError& error) {
    fmt::print(stderr, "{}\n", error.what());
    return verbs::kUsage;
  } catch (const base::OutputError& error) {
    fmt::print(stderr, "results could not be written: {}\n", error.what());
    return verbs::kNotWritten;
  } catch (const std::bad_alloc&) {
    fmt::print(stderr, "out of memory; fewer --jobs need less\n");
    return verbs::kFault;
  } catch (const std::exception& error) {
    fmt::print(stderr, "a fault of skinfold itself: {}\n", error.what());
    return verbs::kFault;
  }
}
