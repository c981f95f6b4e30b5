#pragma once

#include "harness/model/motion.h"
#include "harness/model/rig.h"
#include "harness/model/suite.h"

#include <filesystem>
#include <span>
#include <string>

/// Readers. All throw base::InputError with file, place and what to do; whatever they return has
/// every index in range, every number finite and every array of its stated length.
namespace input {

/// glTF 2.0, .gltf or .glb. `skins`: addresses (name, #index); empty: the only one.
/// Buffers named by relative URI must lie in `root`. Vertices: nodes by index that carry a chosen
/// skin, primitives in order, accessor order within.
/// Source: glTF 2.0 specification, Khronos Group. Limits: see the refusals in gltf.cpp.
model::Rig read_gltf(const std::filesystem::path& path, const std::string& shown,
                     const std::filesystem::path& root, std::span<const std::string> skins);

/// Wavefront OBJ: `v` and `f`, polygons fanned from their first corner.
model::Rig read_obj(const std::filesystem::path& path, const std::string& shown);

/// Adds skeleton and weights of a binding file to a rig read from an OBJ.
void read_binding(const std::filesystem::path& path, const std::string& shown,
                  const std::filesystem::path& root, model::Rig& rig);

/// Poses as JSON for the rig's joints. `times` are left empty.
model::PoseList read_poses(const std::filesystem::path& path, const std::string& shown,
                           const model::Rig& rig);

/// .npy, <f8 (frames, joints, 4, 4), last rows 0 0 0 1.
model::MatrixList read_matrices(const std::filesystem::path& path, const std::string& shown,
                                const model::Rig& rig);

/// .npy, <f4 or <f8, (frames, vertices, 3) or (vertices, 3), read on demand. Coordinates may be
/// non-finite: that is for the measurement to see.
model::GivenFrames open_given(const std::filesystem::path& path, const std::string& shown);

/// Node a joint address means: name, path from the root, or #index of the file's own array. Joints
/// of the rig's skins come first; if none fits, nodes above a joint. `place` is where the address
/// is written.
int find_joint(const model::Rig& rig, const std::string& address, const base::Problem& place);

/// The rig a suite asks for: read, cross-checked, bind scale computed.
model::Rig load_rig(const model::RigSpec& spec, const std::filesystem::path& root);

/// The motion a suite asks for on that rig, resampled as the contract says.
model::Motion load_motion(const model::MotionSpec& spec, const model::Rig& rig,
                          const std::filesystem::path& root);

/// A file format this build reads, for `list formats`.
struct Format {
  std::string name, extensions, holds, limits, source;
};
std::vector<Format> formats();

}  // namespace input
