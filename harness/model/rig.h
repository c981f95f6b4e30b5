#pragma once

#include "metrics/surface.h"

#include <Eigen/Core>

#include <array>
#include <optional>
#include <string>
#include <vector>

namespace model {

using metrics::Face;
using metrics::Index;
using metrics::Point;
using metrics::Points;

/// Local transform T * R * S of a node, column vectors.
struct Transform {
  Eigen::Vector3d translation = Eigen::Vector3d::Zero();
  Eigen::Vector4d rotation =
      Eigen::Vector4d(0, 0, 0, 1);  ///< quaternion (x, y, z, w), as in the file
  Eigen::Vector3d scale = Eigen::Vector3d::Ones();
};

struct Node {
  std::string name;                       ///< may be empty or occur twice
  int parent = -1;                        ///< -1: a root
  Transform local;                        ///< rest pose
  std::optional<Eigen::Matrix4d> matrix;  ///< used instead of `local` where the file gives one
};

/// One joint of a chosen skin. A node may be a joint of several skins.
struct Joint {
  int node = 0;                                                ///< into Rig::nodes
  int skin = 0;                                                ///< into Rig::skins
  Eigen::Matrix4d inverse_bind = Eigen::Matrix4d::Identity();  ///< last row exactly 0 0 0 1
};

/// One chosen skin: a run of joints and the vertices of the meshes that carry it.
struct Skin {
  std::string name;
  Index first_joint = 0, joint_count = 0;  ///< run in Rig::joints
  double bind_scale = 1;                   ///< contract "Rest"; exactly 1 when within 1e-4 of it
};

/// Per vertex a run of (joint, weight) pairs, as in the file: unsorted, repeats allowed, zeros left
/// out.
struct Influences {
  std::vector<Index> first;    ///< vertices + 1
  std::vector<Index> joint;    ///< into Rig::joints
  std::vector<double> weight;  ///< finite
};

/// Displacements that are added to a run of vertices, times a weight.
struct MorphTarget {
  Index first_vertex = 0;
  Points deltas;
  double weight = 0;  ///< default weight of the file
};

enum class Interpolation { Linear, Step };
enum class Channel { Translation, Rotation, Scale };

struct Track {
  int node = 0;
  Channel channel = Channel::Translation;
  Interpolation interpolation = Interpolation::Linear;
  std::vector<double> times;            ///< strictly ascending, at least one
  std::vector<Eigen::Vector4d> values;  ///< one per time; (x, y, z, 0) or quaternion (x, y, z, w)
};

struct Clip {
  std::string name;
  std::vector<Track> tracks;
  /// Why it cannot be played here though the file is legal, e.g. "animates morph weights"; else
  /// empty.
  std::string refusal;
};

/// Mesh, skeleton, weights and clips as they stand in the files, before any arithmetic of ours.
struct Rig {
  std::string file;  ///< as shown in messages
  Points positions;  ///< per vertex, base shape, file units
  std::vector<MorphTarget> morphs;
  std::vector<Face> faces;
  std::vector<std::array<Index, 2>> diagonals;  ///< made by fanning polygons
  std::vector<Index> vertex_skin;  ///< per vertex its skin; empty for a mesh without skin
  Influences influences;           ///< empty for a mesh without skin
  std::vector<Skin> skins;
  std::vector<Joint> joints;  ///< skin after skin, each in its own order
  std::vector<Node> nodes;    ///< the file's own array
  std::vector<int> walk;      ///< nodes, parents before children
  std::vector<Clip> clips;
  /// Joint-to-model matrices at bind time as a binding file has them; empty for glTF, which has the
  /// inverse. Local transforms and inverse binds are then derived from these.
  std::vector<Eigen::Matrix4d> file_binds;
  std::vector<std::string> notes;  ///< oddities worth telling, one sentence each

  bool has_skin() const { return !joints.empty(); }
};

/// "hip/leg.L/foot": names from the root, "#3" for a node without one.
std::string node_path(const Rig& rig, int node);

/// Order of nodes that ties between equal weights go by: depth-first from the roots, roots and
/// siblings ordered by rest position in model space (x, y, z), then name. Rank per node.
std::vector<int> node_ranks(const Rig& rig);

/// Local matrix and model-space matrices of the rest pose, per node.
Eigen::Matrix4d local_matrix(const Transform& transform);
std::vector<Eigen::Matrix4d> rest_pose(const Rig& rig);

/// Rest shape: positions plus default morph weights, times the bind scale of the vertex's skin.
Points rest_shape(const Rig& rig);

}  // namespace model
