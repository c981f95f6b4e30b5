#include "harness/skinning/skinning.h"
#include "metrics/elementary.h"

#include <Eigen/Geometry>

#include <algorithm>
#include <cassert>
#include <cmath>
#include <map>

namespace skinning {
namespace {

using Eigen::Matrix3d;
using Eigen::Matrix4d;
using Eigen::Vector3d;
using Eigen::Vector4d;

/// A local transform taken apart: x -> translation + rotation * stretch * x.
struct Parts {
  Vector3d translation;
  Matrix3d rotation, stretch;

  Matrix4d matrix() const {
    Matrix4d M = Matrix4d::Identity();
    M.topLeftCorner<3, 3>() = rotation * stretch;
    M.topRightCorner<3, 1>() = translation;
    return M;
  }
};

/// Nodes that the motion moves, by index.
using Moved = std::map<int, Parts>;

Matrix3d rotation_matrix(const Vector4d& quaternion) {
  model::Transform turn;
  turn.rotation = quaternion;
  return model::local_matrix(turn).topLeftCorner<3, 3>();
}

Matrix3d rotation_matrix(const Vector3d& axis, double degrees) {
  const double half = 0.5 * metrics::kDegree * std::fmod(degrees, 360.0);
  Vector4d quaternion;
  quaternion << metrics::sine(half) * axis, metrics::cosine(half);
  return rotation_matrix(quaternion);
}

Parts take_apart(const Matrix4d& M) {
  const Matrix3d A = M.topLeftCorner<3, 3>();
  Matrix3d columns = A;
  for (Eigen::Index i = 0; i < 3; ++i) columns.col(i).normalize();
  if (columns.col(0).dot(columns.col(1).cross(columns.col(2))) < 0) columns.col(0) *= -1;
  Parts result;
  result.translation = M.topRightCorner<3, 1>();
  result.rotation = polar(columns).R;
  result.stretch = result.rotation.transpose() * A;
  return result;
}

/// The node's parts so far, its rest pose to begin with.
Parts& parts(const model::Rig& rig, Moved& moved, int index) {
  const auto [place, fresh] = moved.try_emplace(index);
  if (fresh) {
    const model::Node& node = rig.nodes[static_cast<std::size_t>(index)];
    if (node.matrix) {
      place->second = take_apart(*node.matrix);
    } else {
      place->second = {node.local.translation, rotation_matrix(node.local.rotation),
                       node.local.scale.asDiagonal()};
    }
  }
  return place->second;
}

void apply(const model::Sweep& sweep, const model::Rig& rig, const model::Motion& motion,
           std::size_t frame, Moved& moved) {
  const std::size_t last = motion.times.size() - 1;
  for (const model::Sweep::Entry& entry : sweep.entries) {
    const double along = (entry.to - entry.from) * static_cast<double>(frame);
    const double degrees =
        frame == last ? entry.to : entry.from + along / static_cast<double>(last);
    Parts& part = parts(rig, moved, entry.node);
    part.rotation = part.rotation * rotation_matrix(entry.axis, degrees);
  }
}

// Shoemake, Animating rotation with quaternion curves, SIGGRAPH 1985; the angle from the arc
// tangent, which keeps its digits where the arc cosine loses them.
Vector4d slerp(const Vector4d& from, const Vector4d& to, double fraction) {
  const Vector4d a = from / from.norm();
  Vector4d b = to / to.norm();
  double cosine = a.dot(b);
  if (cosine < 0) {  // the short way
    b = -b;
    cosine = -cosine;
  }
  const double sine = (b - cosine * a).norm();
  Vector4d result = a + fraction * (b - a);
  if (sine > 1e-8) {
    const double angle = metrics::arc_tangent(sine, cosine);
    result = metrics::sine((1 - fraction) * angle) * a + metrics::sine(fraction * angle) * b;
  }
  return result / result.norm();
}

/// Value of a track, held outside its keys.
Vector4d sample(const model::Track& track, double time) {
  const auto after = std::upper_bound(track.times.begin(), track.times.end(), time);
  if (after == track.times.begin()) return track.values.front();
  const auto key = static_cast<std::size_t>(after - track.times.begin()) - 1;
  if (after == track.times.end() || track.interpolation == model::Interpolation::Step) {
    return track.values[key];
  }
  const double fraction = (time - track.times[key]) / (*after - track.times[key]);
  const Vector4d& from = track.values[key];
  const Vector4d& to = track.values[key + 1];
  if (fraction == 0) return from;
  if (track.channel == model::Channel::Rotation) return slerp(from, to, fraction);
  return from + fraction * (to - from);
}

void apply(const model::Play& play, const model::Rig& rig, const model::Motion& motion,
           std::size_t frame, Moved& moved) {
  for (const model::Track& track : play.tracks) {
    const Vector4d value = sample(track, motion.times[frame]);
    Parts& part = parts(rig, moved, track.node);
    switch (track.channel) {
      case model::Channel::Translation:
        part.translation = value.head<3>();
        break;
      case model::Channel::Rotation:
        part.rotation = rotation_matrix(value);
        break;
      case model::Channel::Scale:
        part.stretch = value.head<3>().asDiagonal();
        break;
    }
  }
}

void apply(const model::PoseList& poses, const model::Rig& rig, const model::Motion& /*motion*/,
           std::size_t frame, Moved& moved) {
  for (const model::PoseList::Change& change : poses.frames[frame]) {
    Parts& part = parts(rig, moved, change.node);
    if (change.move) part.translation += part.rotation * *change.move;
    if (change.rotate) part.rotation = part.rotation * rotation_matrix(*change.rotate);
    if (change.scale) part.stretch = part.stretch * change.scale->asDiagonal();
  }
}

/// Model-space matrices of all nodes.
std::vector<Matrix4d> posed_nodes(const model::Rig& rig, const Moved& moved) {
  std::vector<Matrix4d> pose(rig.nodes.size(), Matrix4d::Identity());
  for (const int index : rig.walk) {
    const auto at = static_cast<std::size_t>(index);
    const model::Node& node = rig.nodes[at];
    Matrix4d local = node.matrix ? *node.matrix : model::local_matrix(node.local);
    if (const auto found = moved.find(index); found != moved.end()) local = found->second.matrix();
    pose[at] = node.parent < 0 ? local : pose[static_cast<std::size_t>(node.parent)] * local;
  }
  return pose;
}

}  // namespace

std::vector<Matrix4d> joint_to_model(const model::Rig& rig, const model::Motion& motion,
                                     std::size_t frame) {
  assert(frame < motion.times.size());
  if (std::holds_alternative<model::NoPose>(motion.pose)) return {};
  if (const auto* list = std::get_if<model::MatrixList>(&motion.pose)) return list->frames[frame];

  Moved moved;
  if (const auto* sweep = std::get_if<model::Sweep>(&motion.pose)) {
    apply(*sweep, rig, motion, frame, moved);
  } else if (const auto* play = std::get_if<model::Play>(&motion.pose)) {
    apply(*play, rig, motion, frame, moved);
  } else {
    apply(std::get<model::PoseList>(motion.pose), rig, motion, frame, moved);
  }
  const std::vector<Matrix4d> pose = posed_nodes(rig, moved);
  std::vector<Matrix4d> joints;
  joints.reserve(rig.joints.size());
  for (const model::Joint& joint : rig.joints) {
    joints.push_back(pose[static_cast<std::size_t>(joint.node)]);
  }
  return joints;
}

std::vector<Affine> skinning_matrices(const model::Rig& rig,
                                      std::span<const Matrix4d> joint_to_model) {
  if (joint_to_model.empty()) return {};
  assert(joint_to_model.size() == rig.joints.size());
  std::vector<Affine> matrices(rig.joints.size());
  for (std::size_t j = 0; j < matrices.size(); ++j) {
    const Affine pose = joint_to_model[j].topRows<3>();
    const Affine bind = rig.joints[j].inverse_bind.topRows<3>();
    const double scale = rig.skins[static_cast<std::size_t>(rig.joints[j].skin)].bind_scale;
    matrices[j].leftCols<3>() = pose.leftCols<3>() * bind.leftCols<3>();
    matrices[j].col(3) = pose.leftCols<3>() * bind.col(3) + pose.col(3);
    if (scale != 1) matrices[j].leftCols<3>() /= scale;
  }
  return matrices;
}

}  // namespace skinning
