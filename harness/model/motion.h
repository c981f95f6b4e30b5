#pragma once

#include "harness/model/rig.h"

#include <Eigen/Core>

#include <functional>
#include <optional>
#include <string>
#include <variant>
#include <vector>

namespace model {

/// Turns of joints on top of the rest pose; entries of one node multiply in their order.
struct Sweep {
  struct Entry {
    int node = 0;
    Eigen::Vector3d axis = Eigen::Vector3d::UnitX();  ///< normalized
    double from = 0, to = 0;                          ///< degrees
  };
  std::vector<Entry> entries;
};

/// Tracks sampled at the frame times, held outside their keys.
struct Play {
  std::vector<Track> tracks;
};

/// Changes of single joints on top of the rest pose, per frame.
struct PoseList {
  struct Change {
    int node = 0;
    std::optional<Eigen::Vector4d> rotate;  ///< quaternion (x, y, z, w), normalized
    std::optional<Eigen::Vector3d> move;    ///< added as R * move
    std::optional<Eigen::Vector3d> scale;   ///< by components
  };
  std::vector<std::vector<Change>> frames;
};

/// Joint-to-model matrices as given, per frame and joint of the rig (row-major in the file).
struct MatrixList {
  std::vector<std::vector<Eigen::Matrix4d>> frames;
};

/// Frames without a pose: what an engine computed for a mesh alone.
struct NoPose {};

struct Motion {
  std::string name;
  std::vector<double> times;  ///< seconds, one per frame, at least one
  std::variant<NoPose, Sweep, Play, PoseList, MatrixList> pose;
};

/// Skins that an engine computed, read frame by frame; safe to call from several threads.
struct GivenFrames {
  std::string file;
  std::size_t frames = 0, vertices = 0;
  std::function<void(std::size_t frame, Points& out)> read;
};

}  // namespace model
