#include "harness/input/input.h"
#include "harness/model/statistic.h"
#include "harness/report/report.h"
#include "harness/skinning/skinning.h"
#include "harness/suite/suite.h"
#include "harness/verbs/verbs.h"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <memory>

namespace verbs {

namespace {

// "name (limit, drift; neutral 1)" for each statistic of a measurement.
template <typename Metric>
void print_metric(const Metric& metric, std::string_view domain) {
  fmt::print("{}  [{}, per {}]\n  {}\n", metric.name, metric.unit, domain, metric.summary);
  for (const metrics::Statistic& statistic : metric.statistics)
    fmt::print("    .{:<10} {}; undeformed: {}\n", statistic.name,
               statistic.limit && statistic.drift ? "limit and drift"
               : statistic.limit                  ? "limit only"
                                                  : "drift only",
               statistic.neutral);
  fmt::print("  undefined:  {}\n  cannot see: {}\n  source:     {}\n\n", metric.undefined,
             metric.cannot_see, metric.source);
}

void list_measurements() {
  for (const metrics::Metric& metric : metrics::catalog())
    print_metric(metric, metrics::domain_name(metric.domain));
  for (const metrics::AssetMetric& metric : metrics::asset_catalog()) print_metric(metric, "asset");
  fmt::print("D is the diagonal of the bounding box of the rest shape.\n");
}

std::string default_of(const model::ParameterSpec& parameter) {
  using Kind = model::ParameterSpec::Kind;
  if (parameter.required) return "required";
  if (parameter.kind == Kind::Choice) {
    std::string text;
    for (const std::string& choice : parameter.choices) text += (text.empty() ? "" : ", ") + choice;
    return fmt::format("{}; the first is the default", text);
  }
  if (parameter.kind == Kind::Text || parameter.kind == Kind::File) return "none by default";
  return fmt::format("{} to {}, default {}", parameter.low, parameter.high, parameter.fallback);
}

void list_methods() {
  for (const model::SkinningSpec& spec : skinning::specs()) {
    fmt::print("{}\n  {}\n", spec.name, spec.summary);
    for (const model::ParameterSpec& parameter : spec.parameters)
      fmt::print("    {:<16} {} ({})\n", parameter.name, parameter.summary, default_of(parameter));
    fmt::print("  source: {}\n\n", spec.source);
  }
}

void list_formats() {
  for (const input::Format& format : input::formats())
    fmt::print("{}  ({})\n  holds:  {}\n  limits: {}\n  source: {}\n\n", format.name,
               format.extensions, format.holds, format.limits, format.source);
}

}  // namespace

void add_list(CLI::App& app, int& code) {
  CLI::App* verb = app.add_subcommand("list", "What this build knows");
  verb->require_subcommand(1);
  verb->add_subcommand("measurements", "Measurements and their statistics")->callback([] {
    list_measurements();
  });
  verb->add_subcommand("methods", "Skinning methods and their parameters")->callback([] {
    list_methods();
  });
  verb->add_subcommand("formats", "Files that can be read")->callback([] { list_formats(); });
  auto path = std::make_shared<std::string>();
  CLI::App* resolved =
      verb->add_subcommand("resolved", "A suite with everything it uses merged in");
  resolved->add_option("SUITE", *path, "Suite file")->required();
  resolved->callback(
      [path] { fmt::print("{}", suite::load_suite(*path, skinning::specs()).resolved); });
  code = kGood;
}

}  // namespace verbs
