#include "harness/pipeline.h"

#include "harness/base/file.h"
#include "harness/case_run.h"
#include "harness/fingerprint.h"
#include "harness/input/input.h"
#include "harness/parallel.h"
#include "metrics/volume.h"

#include <algorithm>
#include <chrono>
#include <mutex>

namespace harness {

namespace fs = std::filesystem;

namespace {

std::vector<int> ranks_of_joints(const model::Rig& rig) {
  const std::vector<int> nodes = model::node_ranks(rig);
  std::vector<int> ranks;
  for (const model::Joint& joint : rig.joints)
    ranks.push_back(nodes[static_cast<std::size_t>(joint.node)]);
  return ranks;
}

std::string with_placeholders(std::string path, const std::string& rig, const std::string& motion) {
  const auto fill = [&](const std::string& mark, const std::string& name) {
    for (std::size_t at = path.find(mark); at != std::string::npos;
         at = path.find(mark, at + name.size()))
      path.replace(at, mark.size(), name);
  };
  fill("{rig}", rig);
  fill("{motion}", motion);
  return path;
}

model::GivenFrames open_given(const model::Suite& suite, const model::CaseSpec& spec,
                              const model::FileRef& ref) {
  const std::string path =
      with_placeholders(ref.path, suite.rigs[spec.rig].name, suite.motions[spec.motion].name);
  try {
    return input::open_given(base::path_inside(suite.root, ref.folder, path), path);
  } catch (const base::InputError& error) {
    base::Problem problem = ref.place;  // what the suite asks for is not there
    const base::Problem& found = error.problems().front();
    problem.message = found.file.empty() ? found.message : found.file + ": " + found.message;
    throw base::InputError(problem);
  }
}

model::CaseResult broken_case(const model::Suite& suite, const model::CaseSpec& spec,
                              base::Problem problem) {
  model::CaseResult result;
  result.name = spec.name;
  result.rig = suite.rigs[spec.rig].name;
  result.motion = suite.motions[spec.motion].name;
  result.method = suite.methods[spec.method].name;
  result.verdict = model::Verdict::Broken;
  result.problem = std::move(problem);
  return result;
}

}  // namespace

RigInputs load_rig_inputs(const model::Suite& suite, const model::RigSpec& spec) {
  RigInputs inputs;
  inputs.rig = input::load_rig(spec, suite.root);
  const model::Rig& rig = inputs.rig;
  inputs.influences = skinning::resolve_weights(rig, suite.weights);
  inputs.joint_rank = ranks_of_joints(rig);
  inputs.surface =
      metrics::make_surface(model::rest_shape(rig), rig.faces, rig.diagonals, suite.weld);
  inputs.inputs = rig_fingerprints(rig);
  inputs.notes = rig.notes;
  if (std::string note = metrics::volume_note(inputs.surface); !note.empty())
    inputs.notes.push_back(std::move(note));
  return inputs;
}

CaseInputs load_case(const model::Suite& suite, const model::CaseSpec& spec,
                     std::size_t method_index, const RigInputs& rig) {
  const model::MethodSpec& method = suite.methods[method_index];
  const skinning::Method& skinning = skinning::find_method(method.skinning);
  const model::MotionSpec& motion = suite.motions[spec.motion];
  CaseInputs inputs;
  inputs.rig = &rig;
  inputs.motion = input::load_motion(motion, rig.rig, suite.root);
  inputs.joints = rig.rig.has_skin() && !std::holds_alternative<model::NoPose>(inputs.motion.pose);
  inputs.prepared = {rig.surface.rest, rig.influences, rig.joint_rank, rig.rig.joints.size(), {}};
  if (skinning.spec.computes) {
    skinning::Prepared& prepared = inputs.prepared;
    prepared.influences = skinning::keep_influences(
        prepared.influences, static_cast<std::size_t>(method.number("keep_influences")),
        rig.joint_rank);
    prepared.influences = skinning::round_weights(
        prepared.influences, static_cast<int>(method.number("weight_bits")), rig.joint_rank);
  } else {
    inputs.given =
        open_given(suite, spec, std::get<model::FileRef>(method.parameters.at("frames")));
    inputs.prepared.given = inputs.given;
  }
  inputs.deform = skinning.prepare(inputs.prepared, method);
  inputs.inputs = rig.inputs;
  inputs.inputs["motion"] = motion_fingerprint(motion, inputs.motion, rig.rig);
  inputs.inputs["method"] = method_fingerprint(method, suite.weights);
  return inputs;
}

std::vector<skinning::Affine> matrices_of_frame(const CaseInputs& inputs, std::size_t frame) {
  if (!inputs.joints) return {};
  return skinning::skinning_matrices(
      inputs.rig->rig, skinning::joint_to_model(inputs.rig->rig, inputs.motion, frame));
}

void deform_frame(const CaseInputs& inputs, std::size_t frame, model::Points& out) {
  inputs.deform(frame, matrices_of_frame(inputs, frame), out);
}

fs::path golden_folder(const model::Suite& suite, const GateOptions& options) {
  return options.golden.empty() ? suite.root / "golden" : options.golden;
}

std::vector<const model::CaseSpec*> chosen_cases(const model::Suite& suite,
                                                 const GateOptions& options) {
  std::vector<const model::CaseSpec*> chosen;
  for (const model::CaseSpec& spec : suite.cases) {
    const std::vector<std::string>& tags = suite.motions[spec.motion].tags;
    const bool named =
        options.only.empty() ||
        std::any_of(options.only.begin(), options.only.end(),
                    [&](const std::string& glob) { return base::glob_match(glob, spec.name); });
    const bool tagged =
        options.tag.empty() || std::find(tags.begin(), tags.end(), options.tag) != tags.end();
    if (named && tagged) chosen.push_back(&spec);
  }
  return chosen;
}

model::CaseResult gate_case(const model::Suite& suite, const model::CaseSpec& spec,
                            const RigInputs& rig, const GateOptions& options, std::size_t jobs) {
  std::error_code ignored;  // what an earlier run left may not be taken for this one's
  fs::remove_all(golden::case_folder(options.out / "frames", suite.name, spec.name), ignored);
  try {
    const CaseInputs inputs = load_case(suite, spec, spec.method, rig);
    const Reference reference = load_reference(suite, spec, inputs, golden_folder(suite, options));
    CaseRun run(suite, spec, inputs, reference, options.out);
    run.judge_frames(jobs);
    return run.finish();
  } catch (const base::InputError& error) {
    return broken_case(suite, spec, error.problems().front());
  }
}

model::SuiteResult gate_suite(const model::Suite& suite, const GateOptions& options) {
  using Clock = std::chrono::steady_clock;
  model::SuiteResult result;
  result.suite = suite.name;
  result.file = suite.file;
  result.golden_folder = golden_folder(suite, options).string();
  const std::vector<const model::CaseSpec*> cases = chosen_cases(suite, options);

  struct Loaded {
    std::optional<RigInputs> inputs;
    std::optional<base::Problem> problem;
  };
  std::vector<Loaded> rigs(suite.rigs.size());
  parallel_for(rigs.size(), options.jobs, [&](std::size_t i) {
    const bool used =
        std::any_of(cases.begin(), cases.end(), [&](auto* spec) { return spec->rig == i; });
    if (!used) return;
    try {
      rigs[i].inputs = load_rig_inputs(suite, suite.rigs[i]);
    } catch (const base::InputError& error) {
      rigs[i].problem = error.problems().front();
    }
  });

  result.cases.resize(cases.size());
  const std::size_t frame_jobs =
      std::max<std::size_t>(1, options.jobs / std::max<std::size_t>(1, cases.size()));
  std::mutex reporting;
  std::size_t done = 0;
  parallel_for(cases.size(), options.jobs, [&](std::size_t i) {
    const auto start = Clock::now();
    const Loaded& rig = rigs[cases[i]->rig];
    result.cases[i] = rig.problem ? broken_case(suite, *cases[i], *rig.problem)
                                  : gate_case(suite, *cases[i], *rig.inputs, options, frame_jobs);
    result.cases[i].seconds = std::chrono::duration<double>(Clock::now() - start).count();
    const std::lock_guard lock(reporting);
    if (options.progress) options.progress(++done, cases.size(), cases[i]->name);
  });
  for (const model::CaseResult& each : result.cases)
    result.verdict = std::max(result.verdict, each.verdict);
  return result;
}

}  // namespace harness
