#pragma once

#include "harness/model/motion.h"
#include "harness/model/rig.h"
#include "harness/model/suite.h"

#include <filesystem>
#include <span>
#include <string>
#include <vector>

namespace input {

/// Most frames of a motion.
inline constexpr std::size_t kMostFrames = 1000000;

/// Nodes, skins and clips of a glTF file, which need not hold a mesh or a skin.
model::Rig read_clip_file(const std::filesystem::path& path, const std::string& shown,
                          const std::filesystem::path& root);

/// Times of the frames that `spec` asks for; `keys`: every key time of the clip, ascending, at
/// least one. With a rate t0 + k/rate, the last clamped to t1; without, the keys from t0 to t1,
/// those within 1e-5 s of the one before left out. Throws base::InputError when there are none or
/// too many.
std::vector<double> frame_times(std::span<const double> keys, const model::MotionSpec& spec);

/// Per node whether it is a joint of the rig's skins or above one.
std::vector<bool> carries_joint(const model::Rig& rig);

/// The clip, or all clips, that `spec` asks for, as tracks on the nodes of `rig`; what moves no
/// joint is left out. `source`: the rig whose clips are meant, `rig` itself or one whose nodes have
/// the same names from the root on.
model::Motion clip_motion(const model::MotionSpec& spec, const model::Rig& source,
                          const model::Rig& rig);

}  // namespace input
