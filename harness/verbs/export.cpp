#include "harness/base/file.h"
#include "harness/pipeline.h"
#include "harness/report/positions.h"
#include "harness/suite/suite.h"
#include "harness/verbs/verbs.h"

#include <CLI/CLI.hpp>
#include <fmt/format.h>

#include <memory>
#include <optional>

namespace verbs {

namespace fs = std::filesystem;

namespace {

struct Arguments {
  std::string suite, case_name, to;
  std::optional<std::size_t> frame;
};

const model::CaseSpec& find_case(const model::Suite& suite, const std::string& name) {
  std::vector<std::string> names;
  for (const model::CaseSpec& spec : suite.cases) {
    if (spec.name == name) return spec;
    names.push_back(spec.name);
  }
  throw base::InputError(fmt::format("no case '{}'{}", name, base::hint(name, names)), suite.file);
}

// Frames [first, last) of a case, as the writers want them.
report::PosedFrames frames_of(const harness::CaseInputs& inputs, std::size_t first,
                              std::size_t last) {
  report::PosedFrames frames;
  frames.vertices = inputs.rig->surface.rest.size();
  frames.times.assign(inputs.motion.times.begin() + static_cast<std::ptrdiff_t>(first),
                      inputs.motion.times.begin() + static_cast<std::ptrdiff_t>(last));
  frames.read = [&inputs, first](std::size_t frame, metrics::Points& out) {
    harness::deform_frame(inputs, first + frame, out);
  };
  return frames;
}

// Throws base::InputError where the case cannot be computed.
int write_frames(const Arguments& arguments, const model::Suite& suite,
                 const model::CaseSpec& spec) {
  const harness::RigInputs rig = harness::load_rig_inputs(suite, suite.rigs[spec.rig]);
  const harness::CaseInputs inputs = harness::load_case(suite, spec, spec.method, rig);
  const std::size_t count = inputs.motion.times.size();
  const std::size_t vertices = rig.surface.rest.size();
  if (inputs.given && (inputs.given->frames != count || inputs.given->vertices != vertices))
    throw base::InputError(
        fmt::format("holds {} frames of {} vertices; the motion has {}, the rig {}",
                    inputs.given->frames, inputs.given->vertices, count, vertices),
        inputs.given->file);
  const fs::path to = arguments.to;
  if (arguments.frame && *arguments.frame >= count) {
    fmt::print(stderr, "--frame {}: the motion has frames 0 to {}\n", *arguments.frame, count - 1);
    return kUsage;
  }
  if (to.extension() == ".obj" && !arguments.frame && count > 1) {
    fmt::print(stderr, "an .obj file holds one frame: say --frame N (0 to {})\n", count - 1);
    return kUsage;
  }
  const std::size_t first = arguments.frame.value_or(0);
  const report::PosedFrames frames = frames_of(inputs, first, arguments.frame ? first + 1 : count);
  if (to.extension() == ".npy") {
    report::write_npy(to, frames);
  } else if (to.extension() == ".glb") {
    report::write_glb(to, frames, rig.surface.faces);
  } else {
    metrics::Points points;
    frames.read(0, points);
    report::write_obj(to, points, rig.surface.faces);
  }
  return kGood;
}

int export_case(const Arguments& arguments) {
  const std::string kind = fs::path(arguments.to).extension().string();
  if (kind != ".npy" && kind != ".obj" && kind != ".glb") {
    fmt::print(stderr, "--to {}: a name that ends in .npy, .obj or .glb was expected\n",
               arguments.to);
    return kUsage;
  }
  const model::Suite suite = suite::load_suite(arguments.suite, skinning::specs());
  const model::CaseSpec& spec = find_case(suite, arguments.case_name);
  try {
    return write_frames(arguments, suite, spec);
  } catch (const base::InputError& error) {
    fmt::print(stderr, "{}: broken: {}\n", spec.name, error.what());
    return kBroken;
  }
}

}  // namespace

void add_export(CLI::App& app, int& code) {
  auto arguments = std::make_shared<Arguments>();
  CLI::App* verb = app.add_subcommand("export", "Write the skinned positions of a case");
  verb->add_option("SUITE", arguments->suite, "Suite file")->required();
  verb->add_option("--case", arguments->case_name, "RIG/MOTION/METHOD")->required();
  verb->add_option("--to", arguments->to,
                   "File to write: .npy (frames x vertices x 3, double), .obj, .glb")
      ->required();
  verb->add_option("--frame", arguments->frame, "Only this frame, from 0");
  verb->callback([arguments, &code] { code = export_case(*arguments); });
}

}  // namespace verbs
