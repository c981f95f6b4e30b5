#include "harness/suite/suite.h"

#include "harness/suite/sections.h"

#include <catch2/catch.hpp>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <stdlib.h>

namespace fs = std::filesystem;

namespace {

struct Folder {
  fs::path path;
  Folder() {
    std::string name = (fs::temp_directory_path() / "skinfold-suite-XXXXXX").string();
    path = fs::canonical(mkdtemp(name.data()));
  }
  ~Folder() { fs::remove_all(path); }
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;
  void write(const std::string& name, const std::string& text) const {
    fs::create_directories((path / name).parent_path());
    std::ofstream(path / name) << text;
  }
};

std::vector<model::SkinningSpec> skinnings() {
  using Kind = model::ParameterSpec::Kind;
  model::SkinningSpec blend{"linear_blend", "", "", {}, true};
  blend.parameters = {{Kind::Integer, "keep_influences", "", 0, 0, 1000, {}, false},
                      {Kind::Integer, "weight_bits", "", 0, 0, 16, {"0", "8", "16"}, false},
                      {Kind::Choice, "scale", "", 0, 0, 0, {"two_phase", "drop"}, false}};
  model::SkinningSpec given{
      "given", "", "", {{Kind::File, "frames", "the frames", 0, 0, 0, {}, true}}, false};
  return {blend, given};
}

model::Suite load(const Folder& folder, const std::string& name = "s.json") {
  return suite::load_suite(folder.path / name, skinnings());
}

// Everything that is wrong with a suite, one line each, without the folder.
std::string faults(const std::string& text) {
  const Folder folder;
  folder.write("s.json", text);
  try {
    load(folder);
  } catch (const base::InputError& error) {
    std::string said = error.what();
    const std::string prefix = folder.path.string() + "/";
    for (std::size_t at = said.find(prefix); at != std::string::npos; at = said.find(prefix))
      said.erase(at, prefix.size());
    return said;
  }
  return "";
}

// A suite that is right, with one more member put in front.
std::string with(const std::string& member) {
  return "{\"skinfold\": \"suite 1\", \"name\": \"n\",\n" + member + R"(
    "rig": {"file": "r.glb"},
    "motions": {"a": {"sweep": [{"joint": "j", "axis": [1, 0, 0], "degrees": [0, 90]}], "frames": 3}, "b": {"clip": "B"}},
    "methods": {"ship": {"skinning": "linear_blend"}}})";
}

bool says(const std::string& text, const std::string& part) {
  INFO(text);
  return text.find(part) != std::string::npos;
}

}  // namespace

TEST_CASE("a suite becomes plain data") {
  const Folder folder;
  folder.write("s.json", R"({ // comments are allowed
    "skinfold": "suite 1", "name": "strider", "weights": "normalize", "weld": 1e-6,
    "rigs": {"lod0": {"file": "a.glb", "skins": ["S"]}, "lod1": {"mesh": "b.obj", "binding": "b.json"}},
    "motions": {
      "knee": {"sweep": [{"joint": "shin.L", "axis": [0, 2, 0], "degrees": [0, 130]}], "frames": 14, "tags": ["fast"]},
      "walk": {"clip": "Walk", "rate": 24, "span": [0.5, 1]},
      "shrug": {"poses": "p.npy"}},
    "methods": {"ship": {"skinning": "linear_blend", "keep_influences": 4}, "low": {"skinning": "linear_blend", "scale": "drop"}},
    "cases": ["*/*/ship", "lod0/knee/low"],
    "limits": {"volume.change": {"between": [-0.1, 0.1]}, "edge_stretch.p99": {"at_most": 1.6}, "finite.bad": null},
    "drift": {"profile": "reexport", "position.max": {"at_most": 2e-5, "relative": 0.1}, "flips.count": null},
    "overrides": [{"cases": "*/walk/*", "limits": {"edge_stretch.p99": {"at_most": 1.9}, "volume.change": null}},
                  {"cases": "lod1/**", "drift": {"profile": "exact"}}]})");
  const model::Suite suite = load(folder);
  CHECK(suite.name == "strider");
  CHECK(suite.weights == model::WeightRule::Normalize);
  CHECK(suite.weld == 1e-6);
  REQUIRE(suite.rigs.size() == 2);
  CHECK(suite.rigs[0].file->path == "a.glb");
  CHECK(suite.rigs[0].skins == std::vector<std::string>{"S"});
  CHECK(suite.rigs[1].binding->path == "b.json");
  REQUIRE(suite.motions.size() == 3);
  CHECK(suite.motions[0].frames == 14);
  CHECK(suite.motions[0].sweep[0].to == 130);
  CHECK(suite.motions[0].tags == std::vector<std::string>{"fast"});
  CHECK(suite.motions[1].rate == 24);
  CHECK(suite.motions[1].span->second == 1);
  CHECK(suite.motions[2].kind == model::MotionSpec::Kind::Poses);
  CHECK(suite.methods[0].number("keep_influences") == 4);
  CHECK(suite.methods[0].text("scale") == "two_phase");
  REQUIRE(suite.cases.size() == 7);  // 2 rigs x 3 motions, and lod0/knee/low
  CHECK(suite.cases[0].name == "lod0/knee/ship");
  CHECK(suite.cases[1].name == "lod0/knee/low");
  const model::CaseSpec& walk = suite.cases[2];
  CHECK(walk.name == "lod0/walk/ship");
  CHECK(walk.limits.at("edge_stretch.p99").high == 1.9);
  CHECK(walk.limits.count("volume.change") == 0);
  CHECK(suite.cases[0].limits.at("volume.change").between);
  CHECK(walk.removed_limits == std::vector<std::string>{"finite.bad", "volume.change"});
  CHECK(walk.profile == model::Profile::Reexport);
  CHECK(walk.drift.at("position.max").relative == 0.1);
  CHECK(walk.removed_drift == std::vector<std::string>{"flips.count"});
  CHECK(suite.cases.back().profile == model::Profile::Exact);
}

// Catches: a merge that loses the order of files, appends arrays, or resolves a path from the wrong
// folder.
TEST_CASE("suites build on others: in order, this file last, null removes") {
  const Folder folder;
  folder.write("skinfold.root", "");
  folder.write("shared/house.json", R"({"skinfold": "suite 1",
    "methods": {"ship": {"skinning": "linear_blend"}, "old": {"skinning": "linear_blend"}},
    "rig": {"file": "r.glb"},
    "limits": {"edge_stretch.p99": {"at_most": 1.6}, "volume.change": {"at_least": -0.5, "at_most": 0.5}},
    "overrides": [{"cases": "*/nowhere/*", "limits": {"edge_stretch.p99": null}}]})");
  folder.write("shared/more.json",
               R"({"skinfold": "suite 1", "limits": {"edge_stretch.p99": {"at_most": 1.7}}})");
  folder.write(
      "a/s.json",
      R"({"skinfold": "suite 1", "name": "n", "use": ["../shared/house.json", "../shared/more.json"],
    "methods": {"old": null}, "limits": {"volume.change": {"at_most": 0.25}},
    "motions": {"b": {"clip": "B"}}})");
  const model::Suite suite = load(folder, "a/s.json");
  CHECK(suite.root == folder.path);
  CHECK(fs::path(suite.rigs[0].file->folder) == folder.path / "shared");
  REQUIRE(suite.methods.size() == 1);
  REQUIRE(suite.cases.size() == 1);  // a glob of a used file may fit nothing
  CHECK(suite.cases[0].limits.at("edge_stretch.p99").high == 1.7);
  CHECK(suite.cases[0].limits.at("volume.change").high == 0.25);
  CHECK(suite.cases[0].limits.at("volume.change").low == -0.5);
  CHECK(says(suite.resolved, "\"at_most\": 1.7"));
  CHECK_FALSE(says(suite.resolved, "\"old\""));
}

TEST_CASE("use that cannot work is said where it stands") {
  const Folder folder;
  folder.write("s.json", R"({"skinfold": "suite 1", "use": ["t.json"]})");
  folder.write("t.json", R"({"skinfold": "suite 1", "use": ["s.json"]})");
  CHECK_THROWS_WITH(load(folder), Catch::Contains("uses itself"));
  folder.write("t.json", R"({"skinfold": "suite 1", "use": ["absent.json"]})");
  CHECK_THROWS_WITH(load(folder),
                    Catch::Contains("t.json:1:33: absent.json: no such file (/use/0)"));
  folder.write("t.json", R"({"skinfold": "suite 1", "use": ["../../etc/passwd"]})");
  CHECK_THROWS_WITH(load(folder), Catch::Contains("leaves the root folder"));
  folder.write("t.json", R"({"skinfold": "suite 2"})");
  CHECK_THROWS_WITH(load(folder), Catch::Contains("\"suite 1\" was expected"));
}

// Catches: a loader that stops at the first fault: every wrong place must come out in one run.
TEST_CASE("all wrong places of a suite are reported at once") {
  const std::string said = faults(R"({"skinfold": "suite 1", "name": "bad name",
    "rigs": {"r": {"fil": "x.glb"}, "R": {"file": "x.glb", "mesh": "y.obj"}},
    "motions": {"m": {"sweep": [{"joint": "j", "axis": [0, 0, 0], "degrees": [0]}], "clip": "c"},
                "n": {"frames": 0}, "con": {"clip": "c"}},
    "methods": {"k": {"skinning": "lbz"}, "l": {"skinning": "linear_blend", "keep": 1}, "d": {"skinning": "delta_mush"},
                "g": {"skinning": "given", "against": "kk"}},
    "limits": {"edge_stretch.p98": {"at_most": 2}, "position.max": {"at_most": 1}, "volume.change": {"at_most": -1}},
    "drift": {"edge_stretch.min": {"at_most": 1}, "profile": "visible", "seam_gap.max": {}},
    "regions": {}, "precision": "single", "limitz": 1})");
  for (const char* part : {"'bad name' is no name",
                           "unknown key 'fil'; did you mean 'file'? (/rigs/r/fil)",
                           "a rig needs a glTF \"file\"",
                           "the names 'r' and 'R' differ only in case",
                           "not both (/rigs/R)",
                           "the axis has length zero (/motions/m/sweep/0/axis)",
                           "2 numbers were expected, not 1 (/motions/m/sweep/0/degrees)",
                           "not several (/motions/m)",
                           "a number from 1 to 1000000 was expected, not 0 (/motions/n/frames)",
                           "'con' is a device",
                           "unknown method 'lbz'; known: linear_blend, given (/methods/k/skinning)",
                           "unknown key 'keep'",
                           "not in this version: method 'delta_mush'",
                           "the parameter 'frames' is missing",
                           "unknown method 'kk'",
                           "unknown statistic 'edge_stretch.p98'; did you mean 'edge_stretch.p99'?",
                           "'position.max' exists only as drift",
                           "-1 is below 0, the value of an undeformed skin",
                           "'edge_stretch.min' exists only as a limit",
                           "not in this version: profile 'visible'",
                           "a drift bound needs",
                           "not in this version: 'regions'",
                           "not in this version: precision 'single'",
                           "unknown key 'limitz'; did you mean 'limits'?"})
    CHECK(says(said, part));
  CHECK(says(said, "s.json:2:14: unknown key") == false);
  CHECK(says(said, "s.json:1:33: 'bad name'"));  // file:line:column
}

// Catches: a whole number of the range that is none of the values a parameter knows.
TEST_CASE("parameters keep to their values") {
  const auto bits = [](const std::string& value) {
    std::string text = with("");
    const std::string plain = "{\"skinning\": \"linear_blend\"}";
    text.replace(text.find(plain), plain.size(),
                 "{\"skinning\": \"linear_blend\", \"weight_bits\": " + value + "}");
    return faults(text);
  };
  CHECK(bits("8").empty());
  CHECK(bits("16").empty());
  CHECK(says(bits("12"), "unknown value 12; known: 0, 8, 16 (/methods/ship/weight_bits)"));
  CHECK(says(bits("17"), "a number from 0 to 16 was expected, not 17"));
}

// Catches: a hostile suite that takes minutes or gigabytes before it is refused.
TEST_CASE("suites have limits") {
  std::string many = "{\"skinfold\": \"suite 1\"";
  for (int i = 0; i < 50000; ++i) many += ", \"k" + std::to_string(i) + "\": 0";
  const std::string said = faults(many + "}");
  CHECK(std::count(said.begin(), said.end(), '\n') < 100);
  CHECK(says(faults(std::string(5 << 20, ' ')), "files of more than 4194304 are refused"));
  std::string motions, methods;
  for (int i = 0; i < 400; ++i) {
    motions += (i ? ",\"m" : "\"m") + std::to_string(i) + "\":{\"clip\":\"c\"}";
    methods += (i ? ",\"k" : "\"k") + std::to_string(i) + "\":{\"skinning\":\"linear_blend\"}";
  }
  CHECK(says(faults("{\"skinfold\": \"suite 1\", \"name\": \"n\", \"rig\": {\"file\": \"r.glb\"}, "
                    "\"motions\": {" +
                    motions + "}, \"methods\": {" + methods + "}}"),
             "make 160000 cases"));
}

TEST_CASE("patterns that fit nothing, and cases that cannot be computed, are errors") {
  CHECK(faults(with("")).empty());
  CHECK(says(faults(with(R"("cases": ["main/aa/*"],)")), "'main/aa/*' fits no case"));
  CHECK(says(faults(with(R"("overrides": [{"cases": "x/**", "limits": {}}],)")),
             "'x/**' fits no case"));
  CHECK(says(faults(with(R"("cases": [],)")), "no case is named"));
  CHECK(says(faults(with(R"("rigs": {},)")), "use one of the two"));
  CHECK(says(
      faults(
          R"({"skinfold": "suite 1", "name": "n", "rig": {"mesh": "a.obj"}, "motions": {"m": {"frames": 2}},
                        "methods": {"g": {"skinning": "given", "frames": "f.npy"}, "l": {"skinning": "linear_blend"}}})"),
      "the mesh has no \"binding\", which method 'l' needs"));
  CHECK(
      faults(
          R"({"skinfold": "suite 1", "name": "n", "rig": {"mesh": "a.obj"}, "motions": {"m": {"frames": 2}},
                   "methods": {"g": {"skinning": "given", "frames": "f.npy"}}})")
          .empty());
}

// Catches: goldens that land in another folder when a suite is named from another place.
TEST_CASE("the root is marked, or above suites, or the suite's own folder") {
  const Folder folder;
  folder.write("p/suites/x/y/s.json", "{}");
  CHECK(suite::root_folder(folder.path / "p/suites/x/y/s.json") == folder.path / "p");
  folder.write("q/r/s.json", "{}");
  CHECK(suite::root_folder(folder.path / "q/r/s.json") == folder.path / "q/r");
  folder.write("q/skinfold.root", "");
  CHECK(suite::root_folder(folder.path / "q/r/s.json") == folder.path / "q");
  folder.write("q/skinfold.root", "not empty");
  CHECK(suite::root_folder(folder.path / "q/r/s.json") == folder.path / "q/r");
  folder.write("p/suites/skinfold.root", "");
  CHECK(suite::root_folder(folder.path / "p/suites/x/y/s.json") == folder.path / "p/suites");
}

TEST_CASE("names are safe as files anywhere") {
  for (const char* good : {"a", "A.b_c-9", "lod0", "console", "com"})
    CHECK(suite::name_fault(good).empty());
  const std::string longest(64, 'a');
  CHECK(suite::name_fault(longest).empty());
  for (const std::string& bad :
       {std::string(), std::string(".a"), std::string("a."), std::string("a/b"), std::string("ä"),
        std::string("nul"), std::string("COM1.txt"), longest + "a", std::string("-a"),
        std::string("a b")})
    CHECK_FALSE(suite::name_fault(bad).empty());
}
