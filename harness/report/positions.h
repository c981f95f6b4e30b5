#pragma once

#include "metrics/surface.h"

#include <cstddef>
#include <filesystem>
#include <functional>
#include <span>
#include <vector>

/// Skinned positions as files for other programs. All of them throw OutputError when the file
/// cannot be written and leave no part of it.
namespace report {

/// Positions over time: model space, file units, the vertex order of the rig's file.
struct PosedFrames {
  std::size_t vertices = 0;
  std::vector<double> times;  ///< seconds, ascending, one per frame
  /// Positions of a frame. Called for ascending frames; write_glb() goes over all of them twice.
  std::function<void(std::size_t frame, metrics::Points& out)> read;
};

/// NumPy array `<f8`, (frames, vertices, 3), C order, exact. Holds one frame in memory.
void write_npy(const std::filesystem::path& path, const PosedFrames& frames);

/// Wavefront OBJ of one frame: every coordinate as the shortest text that reads back the same.
/// Refuses coordinates that are no finite numbers.
void write_obj(const std::filesystem::path& path, const metrics::Points& points,
               std::span<const metrics::Face> faces);

/// Binary glTF 2.0 in single precision, without a skin. The mesh is frame 0; of several frames
/// every one is a morph target of its index, switched on at its time by a STEP animation that holds
/// the last frame as long as the one before. Times start at 0 where the first is negative. Refuses
/// coordinates that single precision has no finite number for, and files above 4 GiB. Source:
/// glTF 2.0 Specification, Khronos Group 2021, 3.6 (geometry), 3.11 (animation), 4.4 (GLB).
void write_glb(const std::filesystem::path& path, const PosedFrames& frames,
               std::span<const metrics::Face> faces);

}  // namespace report
