#include "harness/model/rig.h"

#include <algorithm>
#include <tuple>

namespace model {

namespace {

std::string label(const Rig& rig, int node) {
  const std::string& name = rig.nodes[static_cast<std::size_t>(node)].name;
  return name.empty() ? "#" + std::to_string(node) : name;
}

}  // namespace

std::string node_path(const Rig& rig, int node) {
  std::vector<int> chain;
  for (int at = node; at >= 0; at = rig.nodes[static_cast<std::size_t>(at)].parent) {
    chain.push_back(at);
  }
  std::string path;
  for (auto at = chain.rbegin(); at != chain.rend(); ++at) {
    if (!path.empty()) path += '/';
    path += label(rig, *at);
  }
  return path;
}

std::vector<int> node_ranks(const Rig& rig) {
  const std::vector<Eigen::Matrix4d> pose = rest_pose(rig);
  std::vector<int> roots;
  std::vector<std::vector<int>> children(rig.nodes.size());
  for (std::size_t node = 0; node < rig.nodes.size(); ++node) {
    const int parent = rig.nodes[node].parent;
    (parent < 0 ? roots : children[static_cast<std::size_t>(parent)])
        .push_back(static_cast<int>(node));
  }
  const auto later = [&](int a, int b) {
    const auto key = [&](int node) {
      const Eigen::Matrix4d& M = pose[static_cast<std::size_t>(node)];
      const std::string& name = rig.nodes[static_cast<std::size_t>(node)].name;
      return std::tuple<double, double, double, const std::string&>(M(0, 3), M(1, 3), M(2, 3),
                                                                    name);
    };
    return key(b) < key(a);
  };
  // A stack of nodes still to visit: the one that comes first lies on top.
  const auto push_sorted = [&](std::vector<int>& stack, std::vector<int> siblings) {
    std::reverse(siblings.begin(), siblings.end());  // equal keys: lowest index on top
    std::stable_sort(siblings.begin(), siblings.end(), later);
    stack.insert(stack.end(), siblings.begin(), siblings.end());
  };
  std::vector<int> rank(rig.nodes.size(), 0);
  std::vector<int> stack;
  push_sorted(stack, roots);
  for (int next = 0; !stack.empty(); ++next) {
    const auto node = static_cast<std::size_t>(stack.back());
    stack.pop_back();
    rank[node] = next;
    push_sorted(stack, children[node]);
  }
  return rank;
}

Eigen::Matrix4d local_matrix(const Transform& transform) {
  const double x = transform.rotation[0], y = transform.rotation[1];
  const double z = transform.rotation[2], w = transform.rotation[3];
  // Dividing by the squared length makes a quaternion rounded by its file a pure rotation.
  const double s = 2 / (x * x + y * y + z * z + w * w);
  Eigen::Matrix3d R;
  R << 1 - s * (y * y + z * z), s * (x * y - z * w), s * (x * z + y * w),  //
      s * (x * y + z * w), 1 - s * (x * x + z * z), s * (y * z - x * w),   //
      s * (x * z - y * w), s * (y * z + x * w), 1 - s * (x * x + y * y);
  Eigen::Matrix4d M = Eigen::Matrix4d::Identity();
  for (Eigen::Index i = 0; i < 3; ++i) {
    M.block<3, 1>(0, i) = R.col(i) * transform.scale[i];
  }
  M.block<3, 1>(0, 3) = transform.translation;
  return M;
}

std::vector<Eigen::Matrix4d> rest_pose(const Rig& rig) {
  std::vector<Eigen::Matrix4d> pose(rig.nodes.size(), Eigen::Matrix4d::Identity());
  for (const int index : rig.walk) {
    const auto at = static_cast<std::size_t>(index);
    const Node& node = rig.nodes[at];
    const Eigen::Matrix4d local = node.matrix ? *node.matrix : local_matrix(node.local);
    pose[at] = node.parent < 0 ? local : pose[static_cast<std::size_t>(node.parent)] * local;
  }
  return pose;
}

Points rest_shape(const Rig& rig) {
  Points rest = rig.positions;
  for (const MorphTarget& morph : rig.morphs) {
    if (morph.weight == 0) continue;
    for (std::size_t i = 0; i < morph.deltas.size(); ++i) {
      rest[morph.first_vertex + i] += morph.weight * morph.deltas[i];
    }
  }
  for (std::size_t i = 0; i < rig.vertex_skin.size(); ++i) {
    rest[i] *= rig.skins[rig.vertex_skin[i]].bind_scale;
  }
  return rest;
}

}  // namespace model
