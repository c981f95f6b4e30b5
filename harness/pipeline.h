#pragma once

#include "harness/model/result.h"
#include "harness/model/rig.h"
#include "harness/model/suite.h"
#include "harness/skinning/skinning.h"
#include "metrics/surface.h"

#include <filesystem>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

/// The straight line from a suite to its verdicts: load, deform, measure, judge.
namespace harness {

/// A rig as every case of it starts from: read once, shared.
struct RigInputs {
  model::Rig rig;
  model::Influences influences;  ///< after the suite's weight rule
  std::vector<int> joint_rank;   ///< ties between equal weights
  metrics::Surface surface;      ///< of the rest shape
  model::Fingerprints inputs;
  std::vector<std::string> notes;
};

/// Throws base::InputError.
RigInputs load_rig_inputs(const model::Suite& suite, const model::RigSpec& spec);

/// One case, ready to be computed frame by frame from several threads.
struct CaseInputs {
  const RigInputs* rig = nullptr;
  model::Motion motion;
  skinning::Prepared prepared;
  skinning::Deformer deform;
  bool joints = false;  ///< the motion poses joints
  std::optional<model::GivenFrames> given;
  model::Fingerprints inputs;
};

/// Throws base::InputError.
CaseInputs load_case(const model::Suite& suite, const model::CaseSpec& spec, std::size_t method,
                     const RigInputs& rig);

/// Skinning matrices of a frame; empty where the motion poses no joints.
std::vector<skinning::Affine> matrices_of_frame(const CaseInputs& inputs, std::size_t frame);

/// The skin of one frame.
void deform_frame(const CaseInputs& inputs, std::size_t frame, model::Points& out);

struct GateOptions {
  std::filesystem::path golden;  ///< empty: root/golden of each suite
  std::filesystem::path out = "skinfold-out";
  std::vector<std::string> only;  ///< globs over case names; empty: all
  std::string tag;                ///< motions with this tag; empty: all
  std::size_t jobs = 1;
  /// Called after each finished case, never by two threads at once.
  std::function<void(std::size_t done, std::size_t total, const std::string& case_name)> progress;
};

/// Names of the cases of a suite that the options choose.
std::vector<const model::CaseSpec*> chosen_cases(const model::Suite& suite,
                                                 const GateOptions& options);

/// Gates one case; `jobs` threads for its frames. What is wrong with the asset becomes the result.
model::CaseResult gate_case(const model::Suite& suite, const model::CaseSpec& spec,
                            const RigInputs& rig, const GateOptions& options, std::size_t jobs);

/// Gates all chosen cases of a suite, in its order. Candidates of cases that are not within are
/// left in out/frames. Throws base::OutputError.
model::SuiteResult gate_suite(const model::Suite& suite, const GateOptions& options);

/// Folder of the goldens of a suite.
std::filesystem::path golden_folder(const model::Suite& suite, const GateOptions& options);

}  // namespace harness
