#pragma once

#include "harness/golden/golden.h"
#include "harness/judge.h"
#include "harness/pipeline.h"

#include <filesystem>
#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace harness {

/// What a case is compared with: its golden, or another method of the suite.
struct Reference {
  enum class Kind { None, Golden, Method } kind = Kind::None;
  std::optional<model::Record> record;               ///< Golden
  std::shared_ptr<const golden::FramesReader> file;  ///< Golden
  std::shared_ptr<const CaseInputs> other;           ///< Method
  std::vector<double> times;
  std::optional<metrics::Surface> own_surface;  ///< Golden whose rest shape or faces differ
};

/// Throws base::InputError where the golden is damaged.
Reference load_reference(const model::Suite& suite, const model::CaseSpec& spec,
                         const CaseInputs& inputs, const std::filesystem::path& golden_folder);

/// One case on its way through measuring and judging. Frames pass in small blocks; what is kept of
/// each is a handful of numbers.
class CaseRun {
 public:
  CaseRun(const model::Suite& suite, const model::CaseSpec& spec, const CaseInputs& inputs,
          const Reference& reference, const std::filesystem::path& out);

  void judge_frames(std::size_t jobs);
  /// The result; leaves the candidate in out/frames unless the case is within.
  model::CaseResult finish();

 private:
  struct Frame;
  Frame judge_frame_at(std::size_t index) const;
  void take(Frame&& frame);
  void compare_shapes();
  void compare_given(const model::GivenFrames& given);
  model::Check bits_check() const;
  void shape_check(std::string what, double today, double golden, std::string reason);
  void judge_asset_checks();
  void name_joints();
  void write_candidate();

  const model::Suite& suite_;
  const model::CaseSpec& spec_;
  const CaseInputs& inputs_;
  const Reference& reference_;
  std::filesystem::path folder_;
  const metrics::Surface& surface_;
  Measured rest_;
  double magnitude_ = 0;
  double grain_ = 0;
  double noise_ = 0;        ///< position noise of today's arithmetic, file units
  double delta_ = 0;        ///< the same with the golden's grain
  bool computable_ = true;  ///< given frames fit the rig and the motion
  bool comparable_ = false;
  std::vector<Plan> plans_;
  std::vector<model::Check> worst_;  ///< per plan of a frame measurement
  std::size_t taken_ = 0;            ///< frames judged so far
  std::size_t bits_failing_ = 0;     ///< of them, frames whose bits are not the reference's
  std::size_t first_other_bits_ = 0;
  model::CaseResult result_;
  std::optional<golden::FramesWriter> writer_;
};

}  // namespace harness
