#include "harness/input/input.h"

#include <catch2/catch.hpp>

#include <cstdlib>
#include <map>

namespace {

namespace fs = std::filesystem;

fs::path characters() {
  const char* const folder = std::getenv("SKINFOLD_CHARACTERS");  // NOLINT(concurrency-mt-unsafe)
  return folder != nullptr ? fs::path(folder) : fs::path(PROJECT_FOLDER) / "../shared/characters";
}

// What the folder's own description says: vertices, joints, clips.
struct Size {
  std::size_t vertices = 0, joints = 0, clips = 0;
};

const std::map<std::string, Size> kSizes = {
    {"RiggedSimple.gltf", {96, 2, 2}}, {"RiggedFigure.gltf", {370, 19, 19}},
    {"hand_left.glb", {1360, 25, 0}},  {"greenman.glb", {196, 12, 4}},
    {"robot.glb", {7218, 43, 14}},     {"trex.glb", {3496, 29, 6}},
    {"spider.glb", {5461, 39, 5}},     {"dolphin.glb", {865, 13, 1}},
};

// Files that a program quantized say so in their JSON.
bool is_quantized(const fs::path& path) {
  const std::string name = path.filename().string();
  return name.find("quant") != std::string::npos || name.find("pack-default") != std::string::npos;
}

void require_sound(const model::Rig& rig) {
  REQUIRE(!rig.positions.empty());
  REQUIRE(!rig.faces.empty());
  REQUIRE(rig.has_skin());
  REQUIRE(rig.walk.size() == rig.nodes.size());
  REQUIRE(rig.vertex_skin.size() == rig.positions.size());
  REQUIRE(rig.influences.first.size() == rig.positions.size() + 1);
  REQUIRE(rig.influences.first.back() == rig.influences.joint.size());
  for (const model::Index joint : rig.influences.joint) REQUIRE(joint < rig.joints.size());
  for (const model::Face& face : rig.faces)
    for (const model::Index corner : face) REQUIRE(corner < rig.positions.size());
}

// Catches: a rule that is stricter than what authoring tools write, whole arrays lost, and
// quantized files read as if they held plain numbers.
TEST_CASE("files of authoring tools are read or refused for a reason [characters]") {
  const fs::path folder = characters();
  if (!fs::is_directory(folder)) {
    WARN("skipped: no folder of characters; name one by SKINFOLD_CHARACTERS");
    SUCCEED();
    return;
  }
  std::size_t files = 0;
  for (const fs::directory_entry& entry : fs::recursive_directory_iterator(folder)) {
    const fs::path path = entry.path();
    if (path.extension() != ".glb" && path.extension() != ".gltf") continue;
    const std::string name = path.filename().string();
    CAPTURE(name);
    ++files;
    if (is_quantized(path)) {
      REQUIRE_THROWS_WITH(input::read_gltf(path, name, folder, {}),
                          Catch::Contains("KHR_mesh_quantization: not in this version"));
      continue;
    }
    const model::Rig rig = input::read_gltf(path, name, folder, {});
    require_sound(rig);
    // One of the optimizers stores rotations as 16-bit integers.
    const bool packed = name.find("pack-anim") != std::string::npos;
    for (const model::Clip& clip : rig.clips)
      REQUIRE(clip.refusal == (packed ? "has normalized-integer keys: not in this version" : ""));
    if (const auto size = kSizes.find(name); size != kSizes.end()) {
      REQUIRE(rig.positions.size() == size->second.vertices);
      REQUIRE(rig.joints.size() == size->second.joints);
      REQUIRE(rig.clips.size() == size->second.clips);
    }
  }
  REQUIRE(files >= kSizes.size());
}

}  // namespace
