#pragma once

#include "harness/input/input.h"
#include "tests/support/gltf_builder.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <utility>

/// What the tests of the glTF reader share.
namespace tests {

using base::Problem;
using model::Index;
using model::Rig;
using Pairs = std::vector<std::pair<Index, double>>;

inline Rig read(const std::string& bytes, const std::string& name,
                const std::vector<std::string>& skins = {}) {
  const TemporaryFolder folder;
  return input::read_gltf(folder.write(name, bytes), name, folder.path(), skins);
}

inline Rig read(const GltfBuilder& file, const std::vector<std::string>& skins = {}) {
  return read(file.glb(), "arm.glb", skins);
}

inline Pairs influences_of(const Rig& rig, std::size_t vertex) {
  Pairs out;
  for (Index i = rig.influences.first[vertex]; i < rig.influences.first[vertex + 1]; ++i)
    out.emplace_back(rig.influences.joint[i], rig.influences.weight[i]);
  return out;
}

template <typename List>
inline void require_same_list(const List& a, const List& b) {
  REQUIRE(a.size() == b.size());
  REQUIRE(std::equal(a.begin(), a.end(), b.begin()));
}

inline void require_same_skin(const Rig& a, const Rig& b) {
  require_same_list(a.positions, b.positions);
  require_same_list(a.faces, b.faces);
  require_same_list(a.vertex_skin, b.vertex_skin);
  require_same_list(a.influences.first, b.influences.first);
  require_same_list(a.influences.joint, b.influences.joint);
  require_same_list(a.influences.weight, b.influences.weight);
}

inline void require_same(const Rig& a, const Rig& b) {
  require_same_skin(a, b);
  require_same_list(a.walk, b.walk);
  require_same_list(a.notes, b.notes);
  REQUIRE(a.joints.size() == b.joints.size());
  for (std::size_t i = 0; i < a.joints.size(); ++i) {
    REQUIRE(a.joints[i].node == b.joints[i].node);
    REQUIRE(a.joints[i].inverse_bind == b.joints[i].inverse_bind);
  }
  REQUIRE(a.nodes.size() == b.nodes.size());
  for (std::size_t i = 0; i < a.nodes.size(); ++i) {
    REQUIRE(a.nodes[i].name == b.nodes[i].name);
    REQUIRE(a.nodes[i].parent == b.nodes[i].parent);
    REQUIRE(a.nodes[i].local.translation == b.nodes[i].local.translation);
    REQUIRE(a.nodes[i].local.rotation == b.nodes[i].local.rotation);
  }
  REQUIRE(a.clips.size() == b.clips.size());
  for (std::size_t i = 0; i < a.clips.size(); ++i) {
    REQUIRE(a.clips[i].name == b.clips[i].name);
    REQUIRE(a.clips[i].tracks.size() == b.clips[i].tracks.size());
    for (std::size_t t = 0; t < a.clips[i].tracks.size(); ++t) {
      require_same_list(a.clips[i].tracks[t].times, b.clips[i].tracks[t].times);
      require_same_list(a.clips[i].tracks[t].values, b.clips[i].tracks[t].values);
    }
  }
}

// What reading a file of that name is refused for.
inline Problem refusal(const std::string& bytes, const std::string& name,
                       const std::vector<std::string>& skins = {}) {
  const TemporaryFolder folder;
  try {
    input::read_gltf(folder.write("in/" + name, bytes), name, folder.path() / "in", skins);
  } catch (const base::InputError& error) {
    REQUIRE(error.problems().size() == 1);
    return error.problems().front();
  }
  FAIL("not refused");
  return {};
}

}  // namespace tests
