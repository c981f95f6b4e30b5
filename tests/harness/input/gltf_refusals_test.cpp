#include "tests/harness/input/gltf_reading.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <functional>
#include <limits>
#include <sstream>

namespace tests {

namespace {

const std::string kPrimitive = "/meshes/0/primitives/0";
const std::string kAttributes = kPrimitive + "/attributes";

// One rule: what breaks the arm, where the reader must point, and what it must say.
struct Rule {
  std::string name;
  std::function<void(GltfBuilder&)> apply;
  std::string pointer;
  std::vector<std::string> says;
};

Rule set(const std::string& pointer, const std::string& value, const std::string& blamed,
         std::vector<std::string> says) {
  return {pointer + " = " + value, [=](GltfBuilder& file) { file.set(pointer, value); }, blamed,
          std::move(says)};
}

Rule removed(const std::string& pointer, const std::string& blamed, std::vector<std::string> says) {
  return {"without " + pointer, [=](GltfBuilder& file) { file.remove(pointer); }, blamed,
          std::move(says)};
}

// Another accessor, which becomes number 8, in the place of one.
Rule other(const std::string& pointer, const std::string& type, Component component,
           const std::vector<double>& values, const std::string& blamed,
           std::vector<std::string> says, Packing packing = {}) {
  return {pointer + " = new " + type,
          [=](GltfBuilder& file) {
            file.set(pointer, std::to_string(file.add(type, component, values, packing)));
          },
          blamed, std::move(says)};
}

// Reads the broken arm as .gltf and as .glb.
void require_refused(const Rule& rule) {
  CAPTURE(rule.name);
  GltfBuilder file = arm();
  rule.apply(file);
  const std::string text = file.embedded();
  const Problem problem = refusal(text, "arm.gltf");
  CAPTURE(base::describe(problem));
  CHECK(problem.file == "arm.gltf");
  CHECK(problem.pointer == rule.pointer);
  for (const std::string& part : rule.says) CHECK_THAT(problem.message, Catch::Contains(part));
  CHECK(problem.line > 0);
  CHECK(problem.column > 0);
  CHECK(problem.line <= std::count(text.begin(), text.end(), '\n'));

  const Problem binary = refusal(file.glb(), "arm.glb");
  CHECK(binary.file == "arm.glb");
  CHECK(binary.pointer == rule.pointer);
  CHECK(binary.message == problem.message);
  CHECK(binary.line == 0);
}

// Every rule below is one of the glTF 2.0 specification, or says "not in this version". A rule
// that is not checked, or is blamed on something else, fails its line.

TEST_CASE("a glTF file of another version or with unknown extensions is refused") {
  const std::string required = "/extensionsRequired";
  const Rule rules[] = {
      removed("/asset", "", {"'asset' is missing"}),
      removed("/asset/version", "/asset", {"'version' is missing"}),
      set("/asset/version", "\"1.0\"", "/asset/version", {"glTF 1.0", "reads glTF 2"}),
      set("/asset/version", "\"2\"", "/asset/version", {"'2' is no version"}),
      set("/asset/version", "\"2.0b\"", "/asset/version", {"'2.0b' is no version"}),
      set("/asset/version", "2.0", "/asset/version", {"a string was expected"}),
      set("/asset/minVersion", "\"2.1\"", "/asset/minVersion", {"needs a reader of glTF 2.1"}),
      set(required, R"(["KHR_mesh_quantization"])", required,
          {"KHR_mesh_quantization: not in this version"}),
      set(required, R"(["EXT_meshopt_compression"])", required,
          {"EXT_meshopt_compression", "export again with mesh compression off"}),
      set(required, R"(["KHR_draco_mesh_compression"])", required,
          {"KHR_draco_mesh_compression", "export again with mesh compression off"}),
      set(required, R"(["KHR_materials_unlit", "ACME_twist"])", required,
          {"'ACME_twist'", "export again without it"}),
      set("/nodes", "{}", "/nodes", {"an array was expected, not an object"}),
      set("/nodes/0", "7", "/nodes/0", {"an object was expected, not a number"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("a glTF accessor that leaves its view or buffer is refused") {
  const std::string huge = "9007199254740992";  // 2^53: sums of such numbers overflow
  const Rule rules[] = {
      set("/accessors/0/count", "0", "/accessors/0/count", {"at least 1", "not 0"}),
      set("/accessors/0/count", "-1", "/accessors/0/count", {"not -1"}),
      set("/accessors/0/count", "1.5", "/accessors/0/count", {"a whole number", "1.5"}),
      set("/accessors/0/count", "5", "/accessors/0",
          {"accessor #0 (POSITION of /meshes/0/primitives/0/attributes)",
           "does not fit buffer view #0", "5 elements of 12 bytes", "48 bytes"}),
      set("/accessors/0/count", huge, "/accessors/0", {"does not fit buffer view #0"}),
      set("/accessors/0/byteOffset", "4", "/accessors/0", {"does not fit", "44 bytes"}),
      set("/accessors/0/byteOffset", huge, "/accessors/0", {"does not fit"}),
      set("/accessors/0/bufferView", "8", "/accessors/0/bufferView",
          {"no #8 in 'bufferViews'", "8 entries"}),
      set("/bufferViews/0/byteLength", "0", "/bufferViews/0/byteLength", {"at least 1"}),
      set("/bufferViews/0/byteLength", "47", "/accessors/0", {"does not fit", "47 bytes"}),
      set("/bufferViews/0/byteLength", "100000", "/bufferViews/0", {"do not fit the buffer"}),
      set("/bufferViews/0/byteOffset", huge, "/bufferViews/0", {"do not fit the buffer"}),
      set("/bufferViews/7/byteLength", "52", "/bufferViews/7", {"do not fit the buffer"}),
      set("/bufferViews/0/buffer", "1", "/bufferViews/0/buffer", {"no #1 in 'buffers'"}),
      removed("/bufferViews/0/byteLength", "/bufferViews/0", {"'byteLength' is missing"}),
      removed("/bufferViews/0/buffer", "/bufferViews/0", {"'buffer' is missing"}),
      removed("/accessors/0/bufferView", "/accessors/0", {"has no 'bufferView'"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("a glTF accessor of the wrong kind is refused") {
  const std::vector<double> sixteen(16, 0);
  const std::vector<double> twelve(12, 0);
  const Rule rules[] = {
      set("/accessors/0/componentType", "5124", "/accessors/0/componentType",
          {"5124 is no component type"}),
      set("/accessors/0/type", "\"VEC2\"", "/accessors/0/type", {"type VEC3, not 'VEC2'"}),
      set("/accessors/0/normalized", "true", "/accessors/0/normalized", {"cannot be normalized"}),
      set("/accessors/0/sparse", "{}", "/accessors/0/sparse",
          {"accessor #0 (POSITION", "sparse: not in this version"}),
      other(kAttributes + "/POSITION", "VEC3", Component::I16, twelve, "/accessors/8/componentType",
            {"must hold float numbers, not signed short", "quantized", "not in this version"},
            {false, 8}),
      other(kAttributes + "/JOINTS_0", "VEC4", Component::U32, sixteen,
            "/accessors/8/componentType", {"JOINTS_0", "unsigned byte or unsigned short"}),
      other(kAttributes + "/JOINTS_0", "VEC4", Component::U8, sixteen, "/accessors/8/componentType",
            {"not normalized unsigned byte"}, {true, 0}),
      other(
          kAttributes + "/WEIGHTS_0", "VEC4", Component::U8, sixteen, "/accessors/8/componentType",
          {"normalized unsigned byte or normalized unsigned short or float", "not unsigned byte"}),
      other(kPrimitive + "/indices", "SCALAR", Component::I16, {0, 1, 2},
            "/accessors/8/componentType", {"indices of /meshes/0/primitives/0", "signed short"}),
      other("/skins/0/inverseBindMatrices", "VEC4", Component::F32, sixteen, "/accessors/8/type",
            {"type MAT4"}),
      other("/animations/0/samplers/0/input", "SCALAR", Component::U16, {0, 1, 2},
            "/accessors/8/componentType", {"must hold float numbers"}, {true, 0}),
      other("/animations/0/samplers/1/output", "VEC3", Component::F32, twelve, "/accessors/8/type",
            {"type VEC4"}),
      set(kAttributes + "/POSITION", "8", kAttributes + "/POSITION", {"no #8 in 'accessors'"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("a glTF accessor out of step is refused") {
  const Rule rules[] = {
      set("/bufferViews/0/byteStride", "8", "/bufferViews/0/byteStride",
          {"8 is no byte stride for elements of 12 bytes"}),
      set("/bufferViews/0/byteStride", "14", "/bufferViews/0/byteStride", {"14 is no byte stride"}),
      set("/bufferViews/0/byteStride", "256", "/bufferViews/0/byteStride",
          {"256 is no byte stride"}),
      set("/bufferViews/0/byteStride", "16", "/accessors/0", {"4 elements of 12 bytes, 16 apart"}),
      set("/bufferViews/3/byteStride", "4", "/bufferViews/3/byteStride",
          {"no vertex attribute and may not be interleaved"}),
      set("/accessors/0/byteOffset", "2", "/accessors/0/byteOffset", {"multiples of 4"}),
      set("/accessors/1/byteOffset", "2", "/accessors/1/byteOffset", {"multiples of 4"}),
      set("/accessors/3/byteOffset", "1", "/accessors/3/byteOffset", {"multiples of 2"}),
      set("/bufferViews/5/byteOffset", "2", "/accessors/5", {"multiples of 4"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("numbers of a glTF file that are not finite are refused") {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const double infinity = std::numeric_limits<double>::infinity();
  std::vector<double> matrices(32, 0);
  matrices[17] = nan;
  const Rule rules[] = {
      other(kAttributes + "/POSITION", "VEC3", Component::F32,
            {0, 0, 0, 0, 0, 0, 0, infinity, 0, 0, 0, 0}, "/accessors/8",
            {"accessor #8 (POSITION", "component 1 of element 2 is not a finite number"}),
      other(kAttributes + "/WEIGHTS_0", "VEC4", Component::F32,
            {1, 0, 0, 0, 1, 0, 0, nan, 1, 0, 0, 0, 1, 0, 0, 0}, "/accessors/8",
            {"accessor #8 (WEIGHTS_0", "component 3 of element 1"}),
      other("/skins/0/inverseBindMatrices", "MAT4", Component::F32, matrices, "/accessors/8",
            {"component 1 of element 1"}),
      other("/animations/0/samplers/0/input", "SCALAR", Component::F32, {0, 1, infinity},
            "/accessors/8", {"accessor #8 (input of /animations/0/samplers/0)", "element 2"}),
      other("/animations/0/samplers/0/output", "VEC3", Component::F32,
            {0, 0, 0, 0, 0, 0, 0, 0, -infinity}, "/accessors/8", {"component 2 of element 2"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("glTF nodes that are no forest or cannot be posed are refused") {
  const Rule rules[] = {
      set("/nodes/0/children", "[1, 4]", "/nodes/0/children/1",
          {"'nodes', which has 4 entries", "not 4"}),
      set("/nodes/0/children", "[1, -1]", "/nodes/0/children/1", {"not -1"}),
      set("/nodes/0/children", "[0.5]", "/nodes/0/children/0", {"not 0.5"}),
      set("/nodes/2/children", "[3]", "/nodes/2/children",
          {"node 'body' (#3) has two parents, 'root' (#0) and 'lower' (#2)"}),
      set("/nodes/0/children", "[1, 1]", "/nodes/0/children", {"'upper' (#1) has two parents"}),
      set("/nodes/2/children", "[0]", "/nodes/0", {"'root' (#0) is on or below a cycle"}),
      set("/nodes/3/children", "[3]", "/nodes/3/children", {"has two parents"}),
      set("/nodes/2/rotation", "[0, 0, 0, 0]", "/nodes/2/rotation", {"zero", "length"}),
      set("/nodes/2/rotation", "[0, 0, 1]", "/nodes/2/rotation", {"4 numbers", "not 3"}),
      set("/nodes/2/scale", "[1, 1, true]", "/nodes/2/scale/2", {"a number was expected"}),
      set("/nodes/2/matrix", "[1,0,0,0, 0,1,0,0, 0,0,1,0, 0,0,0,1]", "/nodes/2",
          {"either 'matrix' or 'translation', not both"}),
      set("/nodes/0/matrix", "[1,0,0,0.5, 0,1,0,0, 0,0,1,0, 0,0,0,1]", "/nodes/0",
          {"matrix: the last row is 0.5 0 0 1 and must be 0 0 0 1"}),
      set("/nodes/0/matrix", "[1, 2]", "/nodes/0/matrix", {"16 numbers"}),
      set("/nodes/3/mesh", "1", "/nodes/3/mesh", {"no #1 in 'meshes', which has 1"}),
      set("/nodes/3/skin", "1", "/nodes/3/skin", {"no #1 in 'skins', which has 1"}),
      removed("/nodes/3/mesh", "/nodes/3/skin", {"must have 'mesh' too"}),
      set("/nodes/3/name", "5", "/nodes/3/name", {"a string was expected"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("a glTF skin that cannot move its mesh is refused") {
  const Rule rules[] = {
      set("/skins/0/joints", "[]", "/skins/0", {"skin 'Arm' (#0) has no joints"}),
      removed("/skins/0/joints", "/skins/0", {"has no joints"}),
      set("/skins/0/joints", "[1, 1]", "/skins/0/joints", {"'upper' (#1)", "twice"}),
      set("/skins/0/joints", "[1, 4]", "/skins/0/joints/1", {"'nodes', which has 4 entries"}),
      set("/skins/0/joints", "[1, 2, 0]", "/accessors/4/count", {"2 matrices for 3 joints"}),
      set("/skins/0/skeleton", "4", "/skins/0/skeleton", {"no #4 in 'nodes'"}),
      other("/skins/0/inverseBindMatrices", "MAT4", Component::F32,
            {1, 0, 0, 0,    0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1,
             1, 0, 0, 2e-6, 0, 1, 0, 0, 0, 0, 1, 0, 0, 0, 0, 1},
            "/skins/0", {"inverse bind matrix 1 (joint 'lower' (#2))", "must be 0 0 0 1"}),
      removed("/nodes/3/skin", "/skins/0", {"no node carries skin 'Arm' (#0)"}),
      set(kPrimitive + "/mode", "0", "/skins/0", {"no node carries skin", "triangles"}),
  };
  for (const Rule& rule : rules) require_refused(rule);
}

// Catches: a skin picked by chance, and messages that leave the user without the names.
TEST_CASE("an unclear choice of glTF skins is refused with their names") {
  GltfBuilder file = arm();
  const auto message = [&](const std::vector<std::string>& skins) {
    return refusal(file.glb(), "arm.glb", skins).message;
  };
  REQUIRE_THAT(message({"Arms"}), Catch::Contains("no skin 'Arms'; did you mean 'Arm'?"));
  REQUIRE_THAT(message({"#1"}), Catch::Contains("no skin '#1'") && Catch::Contains("'Arm' (#0)"));
  REQUIRE_THAT(message({"#"}), Catch::Contains("no skin '#'"));
  REQUIRE_THAT(message({""}), Catch::Contains("no skin ''"));
  REQUIRE_THAT(message({"Arm", "#0"}), Catch::Contains("skin 'Arm' (#0) is named twice"));
  file.append("/skins", R"({"joints": [1]})");
  REQUIRE_THAT(message({}), Catch::Contains("has 2 skins") && Catch::Contains("'Arm' (#0), #1"));
  file.set("/skins/1/name", "\"Arm\"");
  REQUIRE_THAT(message({"Arm"}), Catch::Contains("2 skins are named 'Arm'"));
  REQUIRE_THAT(message({"#0", "#1"}), Catch::Contains("no node carries skin 'Arm' (#1)"));
  file.remove("/skins");
  file.remove("/nodes/3/skin");
  REQUIRE_THAT(message({}), Catch::Contains("the file has no skin"));
}

TEST_CASE("a glTF mesh whose parts do not fit is refused") {
  const Rule rules[] = {
      set("/meshes/0/primitives", "[]", "/meshes/0", {"at least one primitive"}),
      removed(kAttributes, kPrimitive, {"'attributes' is missing"}),
      removed(kAttributes + "/POSITION", kAttributes, {"POSITION is missing"}),
      removed(kAttributes + "/JOINTS_0", kAttributes, {"0 sets of joints and 1 sets of weights"}),
      {"no influences",
       [](GltfBuilder& file) {
         file.remove(kAttributes + "/JOINTS_0");
         file.remove(kAttributes + "/WEIGHTS_0");
       },
       kAttributes,
       {"needs JOINTS_0 and WEIGHTS_0"}},
      set(kAttributes + "/JOINTS_2", "1", kAttributes, {"'JOINTS_1' is missing", "without gaps"}),
      set(kAttributes + "/JOINTS_01", "1", kAttributes + "/JOINTS_01",
          {"'JOINTS_01' does not end in the number of a set"}),
      set(kAttributes + "/WEIGHTS_x", "2", kAttributes + "/WEIGHTS_x", {"'WEIGHTS_x'"}),
      set("/accessors/1/count", "3", kAttributes + "/JOINTS_0",
          {"accessor #1 (JOINTS_0) has 3 elements for 4 positions"}),
      other(kAttributes + "/NORMAL", "VEC3", Component::F32, {0, 0, 1}, kAttributes + "/NORMAL",
            {"accessor #8 (NORMAL) has 1 elements for 4 positions"}),
      other(kAttributes + "/NORMAL", "VEC3", Component::F32, std::vector<double>(15, 0),
            kAttributes + "/NORMAL", {"has 5 elements for 4 positions"}),
      other(kAttributes + "/JOINTS_0", "VEC4", Component::U8,
            {0, 0, 0, 0, 0, 0, 2, 0, 0, 0, 0, 0, 0, 0, 0, 0}, "/accessors/8",
            {"component 2 of element 1 is joint 2, and the skin has 2 joints"}),
      other(kPrimitive + "/indices", "SCALAR", Component::U16, {0, 1, 4}, "/accessors/8",
            {"element 2 is vertex 4, and the primitive has 4"}),
      set("/accessors/3/count", "4", kPrimitive, {"4 corners do not make triangles"}),
      set(kPrimitive + "/mode", "7", kPrimitive + "/mode", {"7 is no mode"}),
      {"a strip of two",
       [](GltfBuilder& file) {
         file.set("/accessors/3/count", "2");
         file.set(kPrimitive + "/mode", "5");
       },
       kPrimitive,
       {"2 corners do not make a strip or fan"}},
      set(kPrimitive + "/targets", R"([{"POSITION": 6}])", kPrimitive + "/targets/0/POSITION",
          {"accessor #6 (POSITION) has 3 elements for 4 positions"}),
      {"two targets, one weight",
       [](GltfBuilder& file) {
         file.set(kPrimitive + "/targets", R"([{"POSITION": 0}, {"POSITION": 0}])");
         file.set("/nodes/3/weights", "[1]");
       },
       kPrimitive,
       {"2 morph targets and 1 default weights"}},
      {"targets on one primitive only",
       [](GltfBuilder& file) {
         file.append("/meshes/0/primitives",
                     R"({"attributes": {"POSITION": 0}, "targets": [{"POSITION": 0}]})");
       },
       "/meshes/0/primitives/1",
       {"the same number of morph targets"}},
      {"a restart index",
       [](GltfBuilder& file) {
         const std::vector<double> many(256 * 4, 0);
         file.set(
             kAttributes,
             R"({"POSITION": )" +
                 std::to_string(file.add("VEC3", Component::F32, std::vector<double>(256 * 3, 0))) +
                 R"(, "JOINTS_0": )" + std::to_string(file.add("VEC4", Component::U8, many)) +
                 R"(, "WEIGHTS_0": )" + std::to_string(file.add("VEC4", Component::F32, many)) +
                 "}");
         file.set(kPrimitive + "/indices",
                  std::to_string(file.add("SCALAR", Component::U8, {0, 1, 255})));
       },
       "/accessors/11",
       {"element 2 is 255, the largest value of its type"}},
  };
  for (const Rule& rule : rules) require_refused(rule);
}

TEST_CASE("a glTF animation that cannot be played is refused") {
  const std::string clip = "/animations/0";
  const Rule rules[] = {
      set(clip + "/channels", "[]", clip, {"at least one of 'channels'"}),
      removed(clip + "/samplers", clip, {"of 'samplers'"}),
      set(clip + "/channels/0/sampler", "2", clip + "/channels/0/sampler",
          {"no sampler 2", "has 2"}),
      set(clip + "/channels/0/target/node", "4", clip + "/channels/0/target/node",
          {"no #4 in 'nodes'"}),
      set(clip + "/channels/0/target/path", "\"rotatoin\"", clip + "/channels/0/target/path",
          {"unknown path 'rotatoin'; did you mean 'rotation'?"}),
      set(clip + "/channels/0", R"({"sampler": 1, "target": {"node": 2, "path": "rotation"}})",
          clip + "/channels/1", {"a second channel for the rotation of node 'lower' (#2)"}),
      set(clip + "/samplers/0/interpolation", "\"LINAER\"", clip + "/samplers/0/interpolation",
          {"unknown value 'LINAER'; did you mean 'LINEAR'?"}),
      other(clip + "/samplers/0/input", "SCALAR", Component::F32, {0, 0.5, 0.5}, "/accessors/8",
            {"element 2 (0.5 s) is not after element 1 (0.5 s)"}),
      other(clip + "/samplers/0/input", "SCALAR", Component::F32, {-0.25, 0.5, 1}, "/accessors/8",
            {"element 0 is -0.25 s, before 0"}),
      other(clip + "/samplers/0/input", "SCALAR", Component::F32, {0, 1}, "/accessors/6/count",
            {"3 values for 2 keys", "LINEAR needs 2"}),
      set(clip + "/samplers/0/interpolation", "\"CUBICSPLINE\"", "/accessors/6/count",
          {"3 values for 3 keys", "CUBICSPLINE needs 9"}),
      other(clip + "/samplers/1/output", "VEC4", Component::F32,
            {0, 0, 0, 1, 0, 0, 0, 0, 0, 0, 0, 1}, "/accessors/8",
            {"element 1 is a quaternion of zero length"}),
      {"an animated matrix",
       [](GltfBuilder& file) {
         file.set("/nodes/1", R"({"name": "upper", "children": [2],
                                  "matrix": [1,0,0,0, 0,1,0,0, 0,0,1,0, 0,0,0,1]})");
       },
       clip + "/channels/0/target/node",
       {"node 'upper' (#1) has a 'matrix' and is animated"}},
  };
  for (const Rule& rule : rules) require_refused(rule);
}

// Catches: line and column of something else than the value that is wrong.
TEST_CASE("a problem of a .gltf names its line and column") {
  GltfBuilder file = arm();
  file.set(kPrimitive + "/mode", "77");
  const std::string text = file.embedded();
  const Problem problem = refusal(text, "arm.gltf");
  std::istringstream lines(text);
  std::string line;
  for (int i = 0; i < problem.line; ++i) std::getline(lines, line);
  REQUIRE(line.substr(static_cast<std::size_t>(problem.column) - 1, 2) == "77");
}

}  // namespace

}  // namespace tests
