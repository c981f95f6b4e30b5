#pragma once

#include "harness/base/error.h"
#include "harness/input/input.h"
#include "tests/support/gltf_builder.h"

#include <cstring>
#include <span>
#include <string>
#include <vector>

namespace tests {

/// What a call complains of; empty when it does not.
template <typename Call>
std::string complaint(Call call) {
  try {
    call();
  } catch (const base::InputError& error) {
    return error.what();
  }
  return {};
}

/// Bytes of values as they lie in memory.
template <typename Item>
std::string bytes_of(const std::vector<Item>& items) {
  std::string bytes(items.size() * sizeof(Item), '\0');
  if (!items.empty()) std::memcpy(bytes.data(), items.data(), bytes.size());
  return bytes;
}

/// A .npy of format 1.0 with any text as header dictionary.
inline std::string npy_with_header(std::string header, const std::string& data) {
  header += '\n';
  std::string file("\x93NUMPY\x01\x00", 8);
  file += static_cast<char>(header.size() % 256);
  file += static_cast<char>(header.size() / 256);
  return file + header + data;
}

/// A .npy as NumPy writes it; `shape` with its parentheses.
inline std::string npy(const std::string& descr, const std::string& shape,
                       const std::string& data) {
  return npy_with_header(
      "{'descr': '" + descr + "', 'fortran_order': False, 'shape': " + shape + ", }", data);
}

/// hip > leg.L > foot, hip > leg.R > foot, and a camera beside them; all but the camera are joints
/// of the one skin.
inline model::Rig legs() {
  model::Rig rig;
  rig.file = "legs.glb";
  const auto add = [&](const char* name, int parent, const Eigen::Vector3d& translation) {
    model::Node node;
    node.name = name;
    node.parent = parent;
    node.local.translation = translation;
    rig.walk.push_back(static_cast<int>(rig.nodes.size()));
    rig.nodes.push_back(node);
  };
  add("hip", -1, {0, 2, 0});
  add("leg.L", 0, {1, 0, 0});
  add("foot", 1, {0, -1, 0});
  add("leg.R", 0, {-1, 0, 0});
  add("foot", 3, {0, -1, 0});
  add("camera", -1, {0, 0, 9});
  for (int i = 0; i < 5; ++i) {
    model::Joint joint;
    joint.node = i;
    rig.joints.push_back(joint);
  }
  rig.skins = {{"legs", 0, 5, 1}};
  return rig;
}

}  // namespace tests
