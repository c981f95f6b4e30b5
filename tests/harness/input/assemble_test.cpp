#include "harness/base/file.h"
#include "tests/harness/input/fixtures.h"

#include <Eigen/Core>
#include <catch2/catch.hpp>

#include <cmath>
#include <filesystem>

namespace {

using Catch::Contains;
using Kind = model::MotionSpec::Kind;
using Times = std::vector<double>;

const std::string kTriangle = "v 0 0 0\nv 1 0 0\nv 0 1 0\nf 1 2 3\n";

model::FileRef named(const std::string& path, const std::filesystem::path& folder) {
  return {path, folder, {"", "suite.json", 4, 9, "/rigs/main/file"}};
}

// A suite's folder with a rig file; the suite stands in `suites`.
struct Project {
  tests::TemporaryFolder folder;

  model::FileRef ref(const std::string& path) const {
    return named(path, folder.path() / "suites");
  }
  model::Rig rig(const std::string& path) const {
    model::RigSpec spec;
    spec.name = "main";
    spec.file = ref(path);
    return input::load_rig(spec, folder.path());
  }
  model::Rig mesh(const std::string& path, const std::string& binding = {}) const {
    model::RigSpec spec;
    spec.name = "main";
    spec.mesh = ref(path);
    if (!binding.empty()) spec.binding = ref(binding);
    return input::load_rig(spec, folder.path());
  }
  model::Motion motion(const model::MotionSpec& spec, const model::Rig& rig) const {
    return input::load_motion(spec, rig, folder.path());
  }
};

int found(const std::string& address, const model::Rig& rig = tests::legs()) {
  return input::find_joint(rig, address, {});
}

std::string unfound(const std::string& address, const model::Rig& rig = tests::legs()) {
  return tests::complaint([&] {
    input::find_joint(rig, address, {"", "suite.json", 8, 2, "/motions"});
  });
}

// One joint of that scale per number, over a triangle; bind is the identity scaled by `bind`.
std::string binding(const std::vector<double>& binds) {
  std::string joints;
  for (std::size_t i = 0; i < binds.size(); ++i) {
    const std::string s = std::to_string(binds[i]);
    joints += (i == 0 ? "" : ",") + std::string(R"({"name": "j)") + std::to_string(i) +
              R"(", "parent": null, "bind": [)" + s + ",0,0,0, 0," + s + ",0,0, 0,0," + s +
              ",0, 0,0,0,1]}";
  }
  return R"({"skinfold": "binding 1", "joints": [)" + joints +
         R"(], "influences": [[[0, 1]], [[0, 1]], [[0, 1]]]})";
}

// The arm with inverse binds that scale by these factors.
tests::GltfBuilder arm_scaled(double upper, double lower) {
  tests::GltfBuilder file = tests::arm();
  std::vector<double> numbers;
  for (const double s : {upper, lower}) {
    numbers.insert(numbers.end(), {s, 0, 0, 0, 0, s, 0, 0, 0, 0, s, 0, 0, 0, 0, 1});
  }
  const int accessor = file.add("MAT4", tests::Component::F32, numbers);
  file.set("/nodes/2/scale", "[1, 1, 1]");
  file.set("/skins/0/inverseBindMatrices", std::to_string(accessor));
  return file;
}

model::MotionSpec sweep(const std::string& joint, const std::vector<double>& axis) {
  model::MotionSpec spec;
  spec.kind = Kind::Sweep;
  spec.name = "knee";
  spec.frames = 3;
  spec.sweep = {{joint, axis, -10, 130, {"", "suite.json", 5, 5, "/motions/knee/sweep/0"}}};
  return spec;
}

}  // namespace

// Catches a joint that is found by chance: each way of writing an address leads to its node.
TEST_CASE("joints are found by name, path and index") {
  REQUIRE(found("hip") == 0);
  REQUIRE(found("leg.R") == 3);
  REQUIRE(found("hip/leg.L/foot") == 2);
  REQUIRE(found("hip/leg.R/foot") == 4);
  REQUIRE(found("leg.R/foot") == 4);  // the end of a path will do where it is the only one
  REQUIRE(found("#4") == 4);
}

// Catches a sweep of something that moves no joint: every frame would be the rest pose, and within.
TEST_CASE("what moves no joint is refused") {
  REQUIRE_THROWS_WITH(found("#5"),
                      Catch::Contains("'camera' is no joint of the skin, nor above one"));
  REQUIRE_THROWS_WITH(found("camera"), Catch::Contains("no joint is named 'camera'"));
}

// Catches a node above the skeleton that is taken for a joint of the same name.
TEST_CASE("joints come before nodes above them") {
  model::Rig rig = tests::legs();
  rig.nodes[0].parent = 5;
  rig.nodes[5].name = "foot.above";
  REQUIRE(found("foot.above", rig) == 5);
  rig.nodes[5].name = "hip";
  REQUIRE(found("hip", rig) == 0);
}

// Catches names that are cut at their slashes, a name that loses to a path, and a path that ends in
// the middle of a name.
TEST_CASE("names may hold slashes and paths hold whole names") {
  model::Rig rig = tests::legs();
  rig.nodes[3].name = "leg/R";
  REQUIRE(found("leg/R", rig) == 3);
  REQUIRE(found("hip/leg/R/foot", rig) == 4);
  rig.nodes[3].name = "leg.L/foot";
  REQUIRE(found("leg.L/foot", rig) == 3);
  REQUIRE_THAT(unfound("ip/leg.L"), Contains("no joint is named 'ip/leg.L'"));
  REQUIRE_THAT(unfound("/hip"), Contains("no joint is named '/hip'"));
}

// Catches a joint that is shared by two skins and then counted as two.
TEST_CASE("a joint of two skins is one joint") {
  model::Rig rig = tests::legs();
  rig.joints.push_back(rig.joints[0]);
  rig.joints.back().skin = 1;
  REQUIRE(found("hip", rig) == 0);
}

// Catches a guess where the address is not plain; the message lists what it could mean.
TEST_CASE("unclear addresses are refused with what is there") {
  REQUIRE_THAT(unfound("foot"),
               Contains("suite.json:8:2: 'foot' occurs 2 times in legs.glb: hip/leg.L/foot (#2), "
                        "hip/leg.R/foot (#4); write the path or the # and the index (/motions)"));
  REQUIRE_THAT(unfound("leg.l1"), Contains("did you mean 'leg.L'?"));
  REQUIRE_THAT(unfound("#6"), Contains("there is no joint #6; legs.glb has 6 nodes, #0 to #5"));
  REQUIRE_THAT(unfound("#99999999999999999999"), Contains("there is no joint #999"));
  REQUIRE_THAT(unfound("#"), Contains("there is no joint #"));
  REQUIRE_THAT(unfound("#-1"), Contains("no joint is named '#-1'"));
  REQUIRE_THAT(unfound(""), Contains("no joint is named ''"));
  model::Rig mesh;
  mesh.file = "a.obj";
  REQUIRE_THAT(unfound("hip", mesh), Contains("a.obj is a mesh without a skeleton"));
}

// Catches a format that is told by the name of the file, and messages that show where the folder
// lies on this machine.
TEST_CASE("a rig is read whatever its file is called") {
  const Project project;
  project.folder.write("art/arm.gltf", tests::arm().glb());
  project.folder.write("art/arm", tests::arm().embedded());
  for (const std::string path : {"../art/arm.gltf", "../art/arm"}) {
    const model::Rig rig = project.rig(path);
    REQUIRE(rig.positions.size() == 4);
    REQUIRE(rig.file == path.substr(3));
    REQUIRE(rig.skins[0].bind_scale == 1);
  }
}

// Catches an OBJ whose weights are lost, or a mesh alone that is refused.
TEST_CASE("an OBJ is a rig with or without a binding") {
  const Project project;
  project.folder.write("suites/a.obj", kTriangle);
  project.folder.write("suites/a.binding.json", binding({1, 1}));
  const model::Rig bound = project.mesh("a.obj", "a.binding.json");
  REQUIRE(bound.joints.size() == 2);
  REQUIRE(bound.influences.joint.size() == 3);
  REQUIRE(bound.skins[0].bind_scale == 1);
  const model::Rig alone = project.mesh("a.obj");
  REQUIRE_FALSE(alone.has_skin());
  REQUIRE(alone.file == "suites/a.obj");
}

// Catches files that are named wrong and reported without the place that names them.
TEST_CASE("files that are not there are refused where they are named") {
  const Project project;
  project.folder.write("suites/arm.glb", tests::arm().glb());
  project.folder.write("suites/a.obj", kTriangle);
  const auto fault = [&](const std::string& path) {
    return tests::complaint([&] { project.rig(path); });
  };
  const std::string missing = fault("arn.glb");
  REQUIRE_THAT(missing, Contains("suite.json:4:9: there is no file suites/arn.glb; did you mean "
                                 "'arm.glb'? (/rigs/main/file)"));
  REQUIRE(missing.find(project.folder.path().string()) == std::string::npos);
  REQUIRE_THAT(fault("../../etc/passwd"),
               Contains("suite.json:4:9") && Contains("leaves the root"));
  REQUIRE_THAT(fault("/etc/passwd"), Contains("suite.json:4:9") && Contains("is absolute"));
  REQUIRE_THAT(fault("a.obj"), Contains("'file' is for glTF; write \"mesh\": \"a.obj\""));
  REQUIRE_THAT(tests::complaint([&] { project.mesh("a.obj", "b.json"); }),
               Contains("there is no file suites/b.json"));
  const std::string neither = tests::complaint([&] { input::load_rig({}, project.folder.path()); });
  REQUIRE_THAT(neither, Contains("names neither 'file' nor 'mesh'"));
}

// Catches a scale that is the mean, the upper middle, or the cube of what it should be: with 2 and
// 50 the lower middle is 2 (elementary).
TEST_CASE("the bind scale is the lower middle of the joints") {
  const Project project;
  project.folder.write("suites/arm.glb", arm_scaled(50, 2).glb());
  const model::Rig rig = project.rig("arm.glb");
  REQUIRE(std::abs(rig.skins[0].bind_scale - 2) < 1e-12);
  REQUIRE(rig.notes ==
          std::vector<std::string>{"bind scale of skin '" + rig.skins[0].name + "' is 2"});
  project.folder.write("suites/mirrored.glb", arm_scaled(-100, -100).glb());
  REQUIRE(std::abs(project.rig("mirrored.glb").skins[0].bind_scale - 100) < 1e-10);
}

// Catches a scale of 1 that carries the noise of its file, and one that is 1 only nearly.
TEST_CASE("a bind scale near 1 is exactly 1") {
  const Project project;
  project.folder.write("suites/near.glb", arm_scaled(1.00005, 1.00005).glb());
  const model::Rig near = project.rig("near.glb");
  REQUIRE(near.skins[0].bind_scale == 1);
  REQUIRE(near.notes.empty());
  project.folder.write("suites/far.glb", arm_scaled(1.0002, 1.0002).glb());
  const model::Rig far = project.rig("far.glb");
  REQUIRE(std::abs(far.skins[0].bind_scale - 1.0002) < 1e-7);  // single precision in the file
  REQUIRE(far.notes.size() == 1);
}

// Catches scales that would make every length 0 or no number.
TEST_CASE("scales that cannot be computed with are refused") {
  const Project project;
  project.folder.write("suites/flat.glb", arm_scaled(0, 1).glb());
  REQUIRE_THAT(tests::complaint([&] { project.rig("flat.glb"); }),
               Contains("suites/flat.glb: the skin '") && Contains("has bind scale 0"));
  tests::GltfBuilder large = tests::arm();
  large.set("/nodes/0/scale", "[1e200, 1e200, 1e200]");
  project.folder.write("suites/large.glb", large.glb());
  REQUIRE_THAT(tests::complaint([&] { project.rig("large.glb"); }),
               Contains("has a rest or bind matrix too large to compute with"));
  large.set("/nodes/1/scale", "[1e200, 1e200, 1e200]");
  project.folder.write("suites/larger.glb", large.glb());
  REQUIRE_THAT(tests::complaint([&] { project.rig("larger.glb"); }),
               Contains("has a transform too large to compute with"));
}

// Catches times of another rate, an axis that is not normalized, and entries of another joint.
TEST_CASE("a sweep turns its joint about a unit axis") {
  const Project project;
  const model::Rig rig = tests::legs();
  model::MotionSpec spec = sweep("leg.L", {3, 0, 4});
  spec.sweep.push_back(sweep("#3", {0, -5e-200, 0}).sweep[0]);
  const model::Motion motion = project.motion(spec, rig);
  REQUIRE(motion.name == "knee");
  REQUIRE(motion.times == Times{0, 1.0 / 24, 2.0 / 24});
  const auto& entries = std::get<model::Sweep>(motion.pose).entries;
  REQUIRE(entries.size() == 2);
  REQUIRE(entries[0].node == 1);
  REQUIRE((entries[0].axis - Eigen::Vector3d(0.6, 0, 0.8)).norm() < 1e-15);
  REQUIRE(entries[0].from == -10);
  REQUIRE(entries[0].to == 130);
  REQUIRE(entries[1].node == 3);
  REQUIRE(entries[1].axis == Eigen::Vector3d(0, -1, 0));
  spec.rate = 2;
  REQUIRE(project.motion(spec, rig).times == Times{0, 0.5, 1});
}

// Catches sweeps that turn nothing, and counts of frames nobody can compute.
TEST_CASE("broken sweeps are refused with their place") {
  const Project project;
  const model::Rig rig = tests::legs();
  const auto fault = [&](const model::MotionSpec& spec) {
    return tests::complaint([&] { project.motion(spec, rig); });
  };
  REQUIRE_THAT(fault(sweep("leg.L", {0, 0, 0})),
               Contains("suite.json:5:5: an axis other than zero was expected "
                        "(/motions/knee/sweep/0)"));
  REQUIRE_THAT(fault(sweep("leg.L", {1, 0})), Contains("an axis of three numbers was expected"));
  REQUIRE_THAT(fault(sweep("leg.M", {1, 0, 0})), Contains("suite.json:5:5: no joint is named"));
  model::MotionSpec long_one = sweep("leg.L", {1, 0, 0});
  long_one.frames = 1000001;
  REQUIRE_THAT(fault(long_one), Contains("has 1000001 frames; expected 1 to 1000000 (\"frames\")"));
  long_one.frames = 0;
  REQUIRE_THAT(fault(long_one), Contains("has 0 frames"));
}

// Catches poses told from matrices by the name of the file, and times that are missing.
TEST_CASE("poses are read as JSON or as an array") {
  const Project project;
  model::Rig rig = tests::legs();
  model::MotionSpec spec;
  spec.kind = Kind::Poses;
  spec.name = "shrug";
  spec.rate = 10;
  spec.file = project.ref("shrug.poses.json");
  project.folder.write("suites/shrug.poses.json",
                       R"({"skinfold": "poses 1", "frames": [{}, {"hip": {"move": [1, 0, 0]}}]})");
  const model::Motion posed = project.motion(spec, rig);
  REQUIRE(posed.times == Times{0, 0.1});
  REQUIRE(std::get<model::PoseList>(posed.pose).frames[1][0].node == 0);

  std::vector<double> numbers(5 * 16, 0);
  for (std::size_t j = 0; j < 5; ++j)
    for (std::size_t i = 0; i < 4; ++i) numbers[j * 16 + i * 5] = 1;
  project.folder.write("suites/shrug.poses.json",
                       tests::npy("<f8", "(1, 5, 4, 4)", tests::bytes_of(numbers)));
  const model::Motion given = project.motion(spec, rig);
  REQUIRE(given.times == Times{0});
  REQUIRE(std::get<model::MatrixList>(given.pose).frames[0].size() == 5);

  spec.file = project.ref("none.json");
  REQUIRE_THAT(tests::complaint([&] { project.motion(spec, rig); }),
               Contains("there is no file suites/none.json"));
}

// Catches a clip that is looked for in the rig though another file is named, or the other way.
TEST_CASE("a clip comes from the rig or from a file of its own") {
  const Project project;
  project.folder.write("suites/arm.glb", tests::arm().glb());
  tests::GltfBuilder other = tests::arm();
  other.set("/animations/0/name", "\"greet\"");
  project.folder.write("suites/greet.glb", other.glb());
  const model::Rig rig = project.rig("arm.glb");
  model::MotionSpec spec;
  spec.kind = Kind::Clip;
  spec.name = "hello";
  spec.clip = "wave";
  REQUIRE(std::get<model::Play>(project.motion(spec, rig).pose).tracks.size() == 2);
  spec.clip = "greet";
  REQUIRE_THAT(tests::complaint([&] { project.motion(spec, rig); }),
               Contains("no clip is named 'greet' in suites/arm.glb"));
  spec.file = project.ref("greet.glb");
  const model::Motion motion = project.motion(spec, rig);
  REQUIRE(std::get<model::Play>(motion.pose).tracks.size() == 2);
  spec.clip = "wave";
  REQUIRE_THAT(tests::complaint([&] { project.motion(spec, rig); }),
               Contains("no clip is named 'wave' in suites/greet.glb"));
}

// Catches frames alone that ask for a skeleton.
TEST_CASE("frames alone need no pose") {
  const Project project;
  model::MotionSpec spec;
  spec.name = "walk";
  spec.frames = 2;
  const model::Motion motion = project.motion(spec, {});
  REQUIRE(motion.times == Times{0, 1.0 / 24});
  REQUIRE(std::holds_alternative<model::NoPose>(motion.pose));
}

// Catches a reader that `list formats` does not know.
TEST_CASE("every reader tells what it reads") {
  const std::vector<input::Format> formats = input::formats();
  REQUIRE(formats.size() == 5);
  for (const input::Format& format : formats) {
    REQUIRE_FALSE(format.name.empty());
    REQUIRE_FALSE(format.extensions.empty());
    REQUIRE_FALSE(format.holds.empty());
    REQUIRE_FALSE(format.limits.empty());
    REQUIRE_FALSE(format.source.empty());
  }
}
