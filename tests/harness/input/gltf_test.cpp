#include "tests/harness/input/gltf_reading.h"

#include <catch2/catch.hpp>

namespace tests {

namespace {

using model::Channel;
using model::Face;
using model::Interpolation;
using model::Point;

// All check values below are the numbers the builder was given, exact in single precision, or
// follow from the glTF 2.0 specification where a line says so.

// Catches: attributes mixed up, rows taken for columns, wrong joint numbering, zeros kept.
TEST_CASE("a glTF file is read as it stands") {
  const Rig rig = read(arm());
  REQUIRE(rig.file == "arm.glb");
  require_same_list(rig.positions,
                    {Point(0, 0, 0), Point(1, 0, 0), Point(1, 2, 0), Point(0, 2, 0.25)});
  require_same_list(rig.faces, {Face{0, 1, 2}, Face{0, 2, 3}});
  require_same_list(rig.vertex_skin, {0, 0, 0, 0});
  REQUIRE(influences_of(rig, 0) == Pairs{{0, 1.0}});
  REQUIRE(influences_of(rig, 1) == Pairs{{0, 0.75}, {1, 0.25}});
  REQUIRE(influences_of(rig, 2) == Pairs{{1, 1.0}});
  REQUIRE(influences_of(rig, 3) == Pairs{{1, 0.5}, {0, 0.25}, {1, 0.25}});
  REQUIRE(rig.skins.size() == 1);
  REQUIRE(rig.skins[0].name == "Arm");
  REQUIRE(rig.skins[0].first_joint == 0);
  REQUIRE(rig.skins[0].joint_count == 2);
  REQUIRE(rig.joints.size() == 2);
  REQUIRE(rig.joints[1].node == 2);
  Eigen::Matrix4d bind = Eigen::Matrix4d::Identity();
  bind.topRightCorner<3, 1>() = Point(-1, -3, 0);
  REQUIRE(rig.joints[1].inverse_bind == bind);
  REQUIRE(rig.morphs.empty());
  REQUIRE(rig.diagonals.empty());
  REQUIRE(rig.notes.empty());
}

// Catches: parents lost, children before parents, a quaternion that is normalized on reading.
TEST_CASE("glTF nodes keep their places and values") {
  const Rig rig = read(arm());
  REQUIRE(rig.nodes.size() == 4);
  REQUIRE(rig.nodes[0].parent == -1);
  REQUIRE(rig.nodes[1].parent == 0);
  REQUIRE(rig.nodes[2].parent == 1);
  REQUIRE(rig.nodes[3].parent == 0);
  REQUIRE(rig.nodes[2].name == "lower");
  REQUIRE(rig.nodes[2].local.translation == Point(0, 2, 0.5));
  REQUIRE(rig.nodes[2].local.rotation == Eigen::Vector4d(0, 0, 0, 2));
  REQUIRE(rig.nodes[2].local.scale == Point(1, 2, 3));
  REQUIRE(rig.nodes[1].local.rotation == Eigen::Vector4d(0, 0, 0, 1));
  require_same_list(rig.walk, {0, 1, 2, 3});
}

// Catches: a walk by index, which breaks when a child stands before its parent, and lost roots.
TEST_CASE("glTF nodes may stand in any order under several roots") {
  GltfBuilder file = arm();
  file.set("/nodes", R"([{"name": "leaf"}, {"mesh": 0, "skin": 0}, {"children": [0]},
                         {"matrix": [1,0,0,0, 0,2,0,0, 0,0,1,0, 5,6,7,1]}])");
  file.set("/skins/0/joints", "[0, 2]");
  file.remove("/animations");
  const Rig rig = read(file);
  require_same_list(rig.walk, {1, 2, 0, 3});
  REQUIRE(rig.nodes[0].parent == 2);
  REQUIRE(rig.nodes[3].matrix.has_value());
  // Column-major (glTF 3.5.3): the last four numbers are the translation.
  REQUIRE((*rig.nodes[3].matrix)(1, 3) == 6);
  REQUIRE((*rig.nodes[3].matrix)(1, 1) == 2);
}

// Catches: normalized weights divided by 256 or read as floats. glTF 3.6.2: c / 255, c / 65535.
TEST_CASE("normalized glTF weights decode exactly") {
  const std::vector<double> bytes = {255, 0, 0, 0, 200, 55, 0, 0, 1, 254, 0, 0, 85, 85, 84, 1};
  const bool wide = GENERATE(false, true);
  const double one = wide ? 65535.0 : 255.0;
  GltfBuilder file = arm();
  const int weights = file.add("VEC4", wide ? Component::U16 : Component::U8, bytes, {true, 0});
  const int joints = file.add("VEC4", Component::U16, std::vector<double>(16, 1));
  file.set("/meshes/0/primitives/0/attributes/WEIGHTS_0", std::to_string(weights));
  file.set("/meshes/0/primitives/0/attributes/JOINTS_0", std::to_string(joints));
  const Rig rig = read(file);
  REQUIRE(influences_of(rig, 0) == Pairs{{1, 255 / one}});
  REQUIRE(influences_of(rig, 1) == Pairs{{1, 200 / one}, {1, 55 / one}});
  REQUIRE(influences_of(rig, 2) == Pairs{{1, 1 / one}, {1, 254 / one}});
  REQUIRE(influences_of(rig, 3) ==
          Pairs{{1, 85 / one}, {1, 85 / one}, {1, 84 / one}, {1, 1 / one}});
}

// Catches: only the first set read; sets in the order of the file instead of their numbers; a
// negative weight dropped with the zeros.
TEST_CASE("all sets of glTF joints and weights are read") {
  GltfBuilder file = arm();
  const std::string attributes = "/meshes/0/primitives/0/attributes/";
  const std::vector<double> joints = {0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0, 1};
  for (const int set : {2, 1}) {
    const double w = set == 1 ? 0.125 : -0.5;
    const std::vector<double> weights = {0, 0, 0, w, 0, 0, 0, w, 0, 0, 0, w, 0, 0, 0, w};
    file.set(attributes + "JOINTS_" + std::to_string(set),
             std::to_string(file.add("VEC4", Component::U8, joints)));
    file.set(attributes + "WEIGHTS_" + std::to_string(set),
             std::to_string(file.add("VEC4", Component::F32, weights)));
  }
  const Rig rig = read(file);
  REQUIRE(influences_of(rig, 0) == Pairs{{0, 1.0}, {1, 0.125}, {1, -0.5}});
  REQUIRE(influences_of(rig, 2) == Pairs{{1, 1.0}, {1, 0.125}, {1, -0.5}});
}

// Catches: byteStride or the accessor's own byteOffset ignored, a stride beyond the last element.
TEST_CASE("interleaved and shared glTF accessors are read") {
  GltfBuilder file = arm();
  const Rig packed = read(file);
  const std::string primitive = "/meshes/0/primitives/0/";
  const int positions = file.add("VEC3", Component::F32,
                                 {9, 9, 9, 0, 0, 0, 1, 0, 0, 1, 2, 0, 0, 2, 0.25}, {false, 20});
  const int joints =
      file.add("VEC4", Component::U8, {0, 0, 0, 0, 0, 1, 0, 0, 1, 0, 0, 0, 1, 0, 1, 0}, {false, 8});
  file.set("/accessors/" + std::to_string(positions) + "/byteOffset", "20");
  file.set("/accessors/" + std::to_string(positions) + "/count", "4");
  file.set(primitive + "attributes/POSITION", std::to_string(positions));
  file.set(primitive + "attributes/JOINTS_0", std::to_string(joints));
  require_same_skin(packed, read(file));
  file.append("/meshes/0/primitives", R"({"indices": 3, "attributes":
      {"POSITION": 0, "JOINTS_0": 1, "WEIGHTS_0": 2}})");
  const Rig twice = read(file);
  REQUIRE(twice.positions.size() == 8);
  REQUIRE(twice.positions[6] == Point(1, 2, 0));
  REQUIRE(twice.faces[2] == Face{4, 5, 6});
  REQUIRE(influences_of(twice, 5) == influences_of(twice, 1));
}

// Catches: a stride outside vertex attributes that is refused though it says nothing new.
TEST_CASE("a stride that equals the element is allowed anywhere") {
  GltfBuilder file = arm();
  file.set("/bufferViews/5/byteStride", "4");
  require_same(read(arm()), read(file));
}

// Catches: index types mixed up, wrong winding of strips and fans. glTF 3.7.2.1 writes triangle i
// of a strip as i, i + (1 + i % 2), i + (2 - i % 2), of a fan as i + 1, i + 2, 0.
TEST_CASE("all kinds of glTF triangles are read") {
  GltfBuilder file = arm();
  const std::string primitive = "/meshes/0/primitives/0/";
  SECTION("indices of 8 and 32 bits") {
    const auto component = GENERATE(Component::U8, Component::U32);
    const int indices = file.add("SCALAR", component, {3, 2, 1});
    file.set(primitive + "indices", std::to_string(indices));
    require_same_list(read(file).faces, {Face{3, 2, 1}});
  }
  SECTION("without indices") {
    file.remove("/meshes/0/primitives/0/indices");
    for (const char* accessor : {"0", "1", "2"})
      file.set(std::string("/accessors/") + accessor + "/count", "3");
    require_same_list(read(file).faces, {Face{0, 1, 2}});
  }
  SECTION("a strip with indices") {
    file.set(primitive + "mode", "5");
    file.set(primitive + "indices",
             std::to_string(file.add("SCALAR", Component::U8, {0, 1, 2, 3, 1})));
    require_same_list(read(file).faces, {Face{0, 1, 2}, Face{1, 3, 2}, Face{2, 3, 1}});
  }
  SECTION("a fan without indices") {
    file.remove("/meshes/0/primitives/0/indices");
    file.set(primitive + "mode", "6");
    require_same_list(read(file).faces, {Face{1, 2, 0}, Face{2, 3, 0}});
  }
}

// Catches: inverse binds demanded (glTF 3.7.3.1: identity when absent), more matrices than joints
// refused, a last row that is kept as rounded by an exporter.
TEST_CASE("glTF inverse binds are optional and end in 0 0 0 1") {
  GltfBuilder file = arm();
  SECTION("absent") {
    file.remove("/skins/0/inverseBindMatrices");
    for (const model::Joint& joint : read(file).joints)
      REQUIRE(joint.inverse_bind == Eigen::Matrix4d::Identity());
  }
  SECTION("more than joints") {
    file.set("/skins/0/joints", "[2]");
    file.set("/meshes/0/primitives/0/attributes/JOINTS_0",
             std::to_string(file.add("VEC4", Component::U8, std::vector<double>(16, 0))));
    REQUIRE(read(file).joints.at(0).inverse_bind(1, 3) == -1);
  }
  SECTION("rounded") {
    const std::vector<double> matrices = {1, 0, 0, 1e-7, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1.0000005,
                                          1, 0, 0, 0,    0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1};
    file.set("/skins/0/inverseBindMatrices",
             std::to_string(file.add("MAT4", Component::F32, matrices)));
    REQUIRE(read(file).joints[0].inverse_bind == Eigen::Matrix4d::Identity());
  }
}

// Two skins over one skeleton; "Hat" has one joint and a triangle of its own.
GltfBuilder two_skins() {
  GltfBuilder file = arm();
  const int points = file.add("VEC3", Component::F32, {5, 0, 0, 6, 0, 0, 5, 1, 0});
  const int joints = file.add("VEC4", Component::U8, std::vector<double>(12, 0));
  const int weights = file.add("VEC4", Component::F32, {1, 0, 0, 0, 1, 0, 0, 0, 1, 0, 0, 0});
  file.append("/meshes", R"({"primitives": [{"attributes": {"POSITION": )" +
                             std::to_string(points) + R"(, "JOINTS_0": )" + std::to_string(joints) +
                             R"(, "WEIGHTS_0": )" + std::to_string(weights) + "}}]}");
  file.append("/skins", R"({"name": "Hat", "joints": [2]})");
  file.set("/nodes/0/mesh", "1");
  file.set("/nodes/0/skin", "1");
  return file;
}

// Catches: meshes of other skins read, joints numbered by node, vertices not in the order of nodes.
TEST_CASE("chosen glTF skins are read in the order they are named") {
  const GltfBuilder file = two_skins();
  const Rig hat = read(file, {"Hat"});
  REQUIRE(hat.positions.size() == 3);
  REQUIRE(hat.joints.size() == 1);
  REQUIRE(hat.joints[0].node == 2);
  REQUIRE(influences_of(hat, 2) == Pairs{{0, 1.0}});
  const Rig both = read(file, {"#0", "Hat"});
  REQUIRE(both.positions.size() == 7);
  REQUIRE(both.positions[0] == Point(5, 0, 0));
  require_same_list(both.vertex_skin, {1, 1, 1, 0, 0, 0, 0});
  REQUIRE(both.skins[1].first_joint == 2);
  REQUIRE(both.joints[2].skin == 1);
  REQUIRE(influences_of(both, 0) == Pairs{{2, 1.0}});
  REQUIRE(influences_of(both, 5) == Pairs{{1, 1.0}});
  REQUIRE(both.faces[1] == Face{3, 4, 5});
}

// Catches: a mesh under two nodes read once, primitives of two meshes in the wrong order.
TEST_CASE("every glTF node that carries the skin brings its mesh") {
  GltfBuilder file = arm();
  file.append("/nodes", R"({"mesh": 0, "skin": 0})");
  const Rig rig = read(file);
  REQUIRE(rig.positions.size() == 8);
  REQUIRE(rig.positions[7] == rig.positions[3]);
  REQUIRE(rig.faces.back() == Face{4, 6, 7});
}

GltfBuilder morphing() {
  GltfBuilder file = arm();
  const int flat = file.add("VEC3", Component::F32, std::vector<double>(12, 0));
  const int up = file.add("VEC3", Component::F32, {0, 0, 1, 0, 0, 2, 0, 0, 3, 0, 0, 4});
  file.set("/meshes/0/primitives/0/targets", R"([{"NORMAL": )" + std::to_string(flat) +
                                                 R"(}, {"POSITION": )" + std::to_string(up) + "}]");
  return file;
}

// Catches: morph targets lost or put at the wrong vertices; the mesh's weights used although the
// node has its own (glTF 3.7.2.2); weights shifted by a target without positions.
TEST_CASE("glTF morph targets keep their default weights") {
  GltfBuilder file = morphing();
  file.append("/nodes", R"({"mesh": 0, "skin": 0, "weights": [0.25, 0.75]})");
  REQUIRE(read(file).morphs.at(0).weight == 0);
  file.set("/meshes/0/weights", "[1, 0.5]");
  const Rig rig = read(file);
  REQUIRE(rig.morphs.size() == 2);
  REQUIRE(rig.morphs[0].first_vertex == 0);
  REQUIRE(rig.morphs[0].weight == 0.5);
  REQUIRE(rig.morphs[0].deltas[3] == Point(0, 0, 4));
  REQUIRE(rig.morphs[1].first_vertex == 4);
  REQUIRE(rig.morphs[1].weight == 0.75);
  REQUIRE(rig.positions[3] == Point(0, 2, 0.25));
}

// Catches: STEP played as LINEAR, channels swapped, keys normalized on reading.
TEST_CASE("glTF clips are read as they stand") {
  const Rig rig = read(arm());
  REQUIRE(rig.clips.size() == 1);
  const model::Clip& clip = rig.clips[0];
  REQUIRE(clip.name == "wave");
  REQUIRE(clip.refusal.empty());
  REQUIRE(clip.tracks.size() == 2);
  REQUIRE(clip.tracks[0].node == 1);
  REQUIRE(clip.tracks[0].channel == Channel::Translation);
  REQUIRE(clip.tracks[0].interpolation == Interpolation::Linear);
  require_same_list(clip.tracks[0].times, {0.0, 0.5, 2.0});
  REQUIRE(clip.tracks[0].values[1] == Eigen::Vector4d(0, 1.5, 0, 0));
  REQUIRE(clip.tracks[1].channel == Channel::Rotation);
  REQUIRE(clip.tracks[1].interpolation == Interpolation::Step);
  REQUIRE(clip.tracks[1].values[2] == Eigen::Vector4d(0, 0, 0, -2));
}

// Catches: a channel without a node that breaks the file (glTF 3.11: it is ignored).
TEST_CASE("glTF channels without a node are ignored, scale is a channel") {
  GltfBuilder file = arm();
  file.remove("/animations/0/channels/1/target/node");
  file.set("/animations/0/channels/0/target/path", "\"scale\"");
  const model::Clip clip = read(file).clips.at(0);
  REQUIRE(clip.tracks.size() == 1);
  REQUIRE(clip.tracks[0].channel == Channel::Scale);
}

// Catches: what this version cannot play is played wrongly, or makes the whole rig unreadable.
TEST_CASE("glTF clips that cannot be played say why") {
  GltfBuilder file = arm();
  std::string why;
  SECTION("morph weights of a chosen mesh") {
    file.set("/animations/0/channels/0/target", R"({"node": 3, "path": "weights"})");
    why = "animates morph weights: not in this version";
  }
  SECTION("cubic splines") {
    file.set("/animations/0/samplers/0/interpolation", "\"CUBICSPLINE\"");
    const std::vector<double> triples(27, 0.5);
    file.set("/animations/0/samplers/0/output",
             std::to_string(file.add("VEC3", Component::F32, triples)));
    why = "uses CUBICSPLINE interpolation: not in this version";
  }
  SECTION("normalized keys") {
    const std::vector<double> keys = {0, 0, 0, 127, 0, 0, 0, 127, 0, 0, 0, 127};
    file.set("/animations/0/samplers/1/output",
             std::to_string(file.add("VEC4", Component::I8, keys, {true, 0})));
    why = "has normalized-integer keys: not in this version";
  }
  SECTION("an extension") {
    file.set("/animations/0/channels/0/target", R"({"path": "pointer"})");
    why = "animates through the extension KHR_animation_pointer: not in this version";
  }
  const Rig rig = read(file);
  REQUIRE(rig.clips.at(0).refusal == why);
  REQUIRE(rig.positions.size() == 4);
}

// Catches: a clip refused for the morph weights of a mesh that nobody chose.
TEST_CASE("animated morph weights of other glTF meshes do not matter") {
  GltfBuilder file = two_skins();
  file.set("/animations/0/channels/0/target", R"({"node": 3, "path": "weights"})");
  REQUIRE(read(file, {"Hat"}).clips.at(0).refusal.empty());
  REQUIRE_FALSE(read(file, {"Arm"}).clips.at(0).refusal.empty());
}

// Catches: things left out without a word, and notes on files that have nothing odd.
TEST_CASE("what is left out of a glTF file is noted") {
  GltfBuilder file = arm();
  file.set("/nodes/3/translation", "[0, 0, 1]");
  file.append("/meshes/0/primitives", R"({"mode": 1, "attributes": {"POSITION": 0}})");
  file.append("/nodes", R"({"name": "ring", "mesh": 0})");
  file.set("/nodes/2/children", "[4]");
  const Rig rig = read(file);
  REQUIRE(rig.positions.size() == 4);
  REQUIRE(rig.notes.size() == 3);
  REQUIRE_THAT(rig.notes[0], Catch::Contains("own transform") && Catch::Contains("'body' (#3)"));
  REQUIRE_THAT(rig.notes[1],
               Catch::Contains("1 primitives") && Catch::Contains("/meshes/0/primitives/1"));
  REQUIRE_THAT(rig.notes[2], Catch::Contains("1 rigid meshes") && Catch::Contains("'ring' (#4)"));
}

// Catches: extensions that do not touch the shape refused, data that is not used demanded.
TEST_CASE("what does not concern the skin of a glTF file may be anything") {
  GltfBuilder file = arm();
  file.set("/extensionsRequired", R"(["KHR_materials_unlit", "KHR_texture_transform"])");
  file.set("/extensionsUsed", R"(["ACME_unheard_of"])");
  file.set("/asset/minVersion", "\"2.0\"");
  file.set("/asset/version", "\"2.1\"");
  file.append("/buffers", R"({"byteLength": 5, "uri": "nowhere.bin"})");
  file.set("/images", R"([{"bufferView": 99}])");
  file.append("/accessors", R"({"count": 0})");
  require_same(read(arm()), read(file));
}

}  // namespace

}  // namespace tests
