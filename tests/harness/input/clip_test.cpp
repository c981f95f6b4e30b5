#include "harness/input/clip.h"

#include "tests/harness/input/fixtures.h"

#include <catch2/catch.hpp>

#include <cmath>
#include <utility>

namespace {

using Catch::Contains;
using model::Channel;
using Times = std::vector<double>;

model::MotionSpec spec(const std::string& clip, std::optional<double> rate = {}) {
  model::MotionSpec made;
  made.kind = model::MotionSpec::Kind::Clip;
  made.name = "walk";
  made.clip = clip;
  made.rate = rate;
  made.place = {"", "suite.json", 7, 3, "/motions/walk"};
  return made;
}

model::MotionSpec spanning(double from, double to, std::optional<double> rate = {}) {
  model::MotionSpec made = spec("Walk", rate);
  made.span = {from, to};
  return made;
}

model::Track track(int node, Channel channel, const Times& times) {
  model::Track made;
  made.node = node;
  made.channel = channel;
  made.times = times;
  made.values.assign(times.size(), Eigen::Vector4d(0, 0, 0, 1));
  return made;
}

// Walk turns hip and a foot and moves the camera; Nod and a second Walk follow.
model::Rig walker() {
  model::Rig rig = tests::legs();
  rig.clips = {{"Walk",
                {track(0, Channel::Rotation, {0.5, 1}), track(2, Channel::Scale, {0.25, 1}),
                 track(5, Channel::Translation, {0, 2})},
                ""},
               {"Nod", {track(0, Channel::Translation, {0, 1})}, ""},
               {"Twice", {track(1, Channel::Rotation, {0})}, ""},
               {"Twice", {track(1, Channel::Rotation, {0})}, ""},
               {"Blink", {track(5, Channel::Translation, {0})}, ""},
               {"Morph", {track(0, Channel::Scale, {0})}, "animates morph weights"}};
  return rig;
}

std::string complaint(const model::MotionSpec& motion, const model::Rig& source,
                      const model::Rig& rig) {
  return tests::complaint([&] { input::clip_motion(motion, source, rig); });
}

std::string complaint(const std::string& clip) {
  const model::Rig rig = walker();
  return complaint(spec(clip), rig, rig);
}

const std::vector<model::Track>& tracks_of(const model::Motion& motion) {
  return std::get<model::Play>(motion.pose).tracks;
}

}  // namespace

// Catches a clip whose time starts at its first key, though the rule starts it at 0, and a last
// frame that is lost to rounding: 23 frames of 1/24 s from 0 to 0.9583 (elementary).
TEST_CASE("a clip that starts late is sampled from zero") {
  const Times keys = {0.0417, 0.5, 0.9583};
  const Times times = input::frame_times(keys, spec("Walk", 24));
  REQUIRE(times.size() == 24);
  for (std::size_t k = 0; k < times.size(); ++k) {
    REQUIRE(times[k] == std::min(static_cast<double>(k) / 24, 0.9583));
  }
  REQUIRE(times.back() == 0.9583);  // 23/24 = 0.95833..., clamped

  model::MotionSpec from_keys = spec("Walk", 24);
  from_keys.span_keys = true;
  const Times late = input::frame_times(keys, from_keys);
  REQUIRE(late.size() == 22 + 1);  // floor(0.9166 * 24 + 0.01) = floor(22.0084)
  REQUIRE(late.front() == 0.0417);
  REQUIRE(late[1] == 0.0417 + 1.0 / 24);
}

// Catches a frame count that rounds instead of cutting off, or that lacks the hundredth of a frame
// which forgives keys in single precision.
TEST_CASE("frames go on while they end within a hundredth of a frame") {
  REQUIRE(input::frame_times(Times{0, 1.0}, spec("Walk", 10)).size() == 11);
  REQUIRE(input::frame_times(Times{0, 0.9991}, spec("Walk", 10)).size() == 11);  // 9.991 + 0.01
  REQUIRE(input::frame_times(Times{0, 0.9989}, spec("Walk", 10)).size() == 10);  // 9.989 + 0.01
  REQUIRE(input::frame_times(Times{0, 0.9991}, spec("Walk", 10)).back() == 0.9991);
  REQUIRE(input::frame_times(Times{0}, spec("Walk", 10)) == Times{0});
}

// Catches a span that is cut to the keys, or counted from 0.
TEST_CASE("a span sets both ends") {
  REQUIRE(input::frame_times(Times{0.5, 1}, spanning(0.75, 2, 2)) == Times{0.75, 1.25, 1.75});
  REQUIRE(input::frame_times(Times{0.5, 1}, spanning(0.75, 0.75, 2)) == Times{0.75});
}

// Catches keys that are sampled twice, keys merged into others that are far away by many small
// steps, and a span that loses its own ends in single precision: 0.7F is below 0.7.
TEST_CASE("without a rate every key is a frame") {
  REQUIRE(input::frame_times(Times{0, 0, 1e-6, 0.5, 0.5 + 9e-6, 0.5 + 1.1e-5}, spec("Walk")) ==
          Times{0, 0.5, 0.5 + 1.1e-5});
  const Times keys = {0.1, static_cast<double>(0.7F), 0.9, 1.1};
  REQUIRE(input::frame_times(keys, spanning(0.7, 1)) == Times{keys[1], 0.9});
  REQUIRE(input::frame_times(Times{0.5, 1}, spec("Walk")) == Times{0.5, 1});
}

// Catches counts of frames that fill the memory, or overflow; the message names what to change.
TEST_CASE("absurd numbers of frames are refused") {
  const auto fault = [](const Times& keys, const model::MotionSpec& motion) {
    return tests::complaint([&] { input::frame_times(keys, motion); });
  };
  REQUIRE_THAT(fault({0, 1e9}, spec("Walk", 24)),
               Contains("suite.json:7:3") && Contains("more than 1000000 frames; lower \"rate\" or "
                                                      "shorten \"span\" (/motions/walk)"));
  REQUIRE_THAT(fault({0, 1e300}, spec("Walk", 1e30)), Contains("more than 1000000 frames"));
  REQUIRE(fault({0, 999999}, spec("Walk", 1)).empty());
  REQUIRE_THAT(fault({0, 1000000}, spec("Walk", 1)), Contains("more than 1000000 frames"));
  REQUIRE_THAT(fault({0.5, 1}, spanning(2, 3)),
               Contains("no key of the clip 'Walk' lies from 2 s to 3 s (the keys are from 0.5 s "
                        "to 1 s)"));
  REQUIRE_THAT(fault({0.5, 1}, spanning(3, 2)), Contains("would run from 3 s to 2 s"));
  Times many(1000002);
  for (std::size_t i = 0; i < many.size(); ++i) many[i] = static_cast<double>(i);
  REQUIRE_THAT(fault(many, spec("Walk")), Contains("set \"rate\" or shorten \"span\""));
}

// Catches another clip, keys of tracks that are left out and yet belong to the clip's time, and
// tracks that stay though they move no joint.
TEST_CASE("a clip plays the tracks that move joints") {
  const model::Rig rig = walker();
  for (const std::string address : {"Walk", "#0"}) {
    const model::Motion motion = input::clip_motion(spec(address), rig, rig);
    REQUIRE(motion.name == "walk");
    REQUIRE(motion.times == Times{0, 0.25, 0.5, 1, 2});
    REQUIRE(tracks_of(motion).size() == 2);
    REQUIRE(tracks_of(motion)[0].node == 0);
    REQUIRE(tracks_of(motion)[0].channel == Channel::Rotation);
    REQUIRE(tracks_of(motion)[1].node == 2);
  }
  // A node above the joints moves them too.
  model::Rig above = walker();
  above.joints = {above.joints[2]};
  REQUIRE(tracks_of(input::clip_motion(spec("Nod"), above, above)).size() == 1);
}

// Catches "*" that plays the first clip only.
TEST_CASE("all clips play at once") {
  model::Rig rig = walker();
  rig.clips.resize(2);
  const model::Motion motion = input::clip_motion(spec("*"), rig, rig);
  REQUIRE(motion.times == Times{0, 0.25, 0.5, 1, 2});
  REQUIRE(tracks_of(motion).size() == 3);
}

// Catches a clip that is guessed, or played in part.
TEST_CASE("clips that cannot be played are refused") {
  REQUIRE_THAT(complaint("Wlak"), Contains("suite.json:7:3: no clip is named 'Wlak' in legs.glb; "
                                           "did you mean 'Walk'? (/motions/walk)"));
  REQUIRE_THAT(complaint(""), Contains("no clip is named ''"));
  REQUIRE_THAT(complaint("#6"), Contains("there is no clip #6; legs.glb holds 6, #0 to #5"));
  REQUIRE_THAT(complaint("#99999999999999999999"), Contains("there is no clip #9999"));
  REQUIRE_THAT(complaint("Twice"), Contains("2 clips are named 'Twice' in legs.glb, the first two "
                                            "are #2 and #3; write the # and the index"));
  REQUIRE(complaint("#3").empty());
  REQUIRE_THAT(complaint("Morph"), Contains("the clip 'Morph' of legs.glb cannot be played: "
                                            "animates morph weights"));
  REQUIRE_THAT(complaint("Blink"), Contains("moves no joint of legs.glb nor a node above one"));
  REQUIRE_THAT(complaint("*"), Contains("the clips 'Twice' and 'Twice' of legs.glb both move "
                                        "'hip/leg.L' in the same way"));
  const model::Rig none = tests::legs();
  REQUIRE_THAT(complaint(spec("Walk"), none, none), Contains("legs.glb holds no clip to play"));
  model::Rig empty = tests::legs();
  empty.clips = {{"Still", {}, ""}};
  REQUIRE_THAT(complaint(spec("Still"), empty, empty), Contains("'Still' of legs.glb has no key"));
}

// Catches nodes matched by index instead of path: the other file numbers them the other way round,
// so that foot 2 of hip/leg.L is its node 3.
TEST_CASE("a clip of another file moves the nodes of the same path") {
  const model::Rig rig = tests::legs();
  model::Rig other;
  other.file = "walk.glb";
  other.nodes.resize(6);
  const std::vector<std::size_t> to = {5, 4, 3, 2, 1, 0};
  for (std::size_t i = 0; i < 6; ++i) {
    other.nodes[to[i]] = rig.nodes[i];
    const int parent = rig.nodes[i].parent;
    if (parent >= 0)
      other.nodes[to[i]].parent = static_cast<int>(to[static_cast<std::size_t>(parent)]);
  }
  other.walk = {5, 4, 3, 2, 1, 0};
  other.clips = {{"Walk", {track(3, Channel::Rotation, {0}), track(1, Channel::Scale, {0})}, ""}};
  const model::Motion motion = input::clip_motion(spec("Walk"), other, rig);
  REQUIRE(tracks_of(motion).size() == 2);
  REQUIRE(tracks_of(motion)[0].node == 2);
  REQUIRE(tracks_of(motion)[1].node == 4);

  model::Rig renamed = other;
  renamed.nodes[4].name = "thigh.L";
  REQUIRE_THAT(complaint(spec("Walk"), renamed, rig),
               Contains("the clip 'Walk' of walk.glb moves 'hip/thigh.L/foot', and legs.glb has no "
                        "node of that path"));
  model::Rig twice = rig;
  twice.nodes[1].name = twice.nodes[3].name = "leg";
  renamed.nodes[4].name = "leg";
  REQUIRE_THAT(complaint(spec("Walk"), renamed, twice), Contains("legs.glb has several nodes"));
}

// Catches an error over a camera that moves along, where the file itself says it is no joint.
TEST_CASE("what is no joint in its own file need not be in the rig") {
  model::Rig other = walker();
  other.file = "walk.glb";
  other.nodes[5].name = "drone";
  const model::Rig rig = tests::legs();
  REQUIRE(tracks_of(input::clip_motion(spec("Walk"), other, rig)).size() == 2);
  other.joints.clear();
  REQUIRE_THAT(complaint(spec("Walk"), other, rig), Contains("moves 'drone', and legs.glb has no"));
}

// Catches a reader that wants a mesh or a skin in a file of clips.
TEST_CASE("a file of clips needs neither mesh nor skin") {
  const tests::TemporaryFolder folder;
  const tests::GltfBuilder whole = tests::arm();
  const auto clips_of = [&](const tests::GltfBuilder& file) {
    return input::read_clip_file(folder.write("clips.glb", file.glb()), "clips.glb", folder.path());
  };
  REQUIRE(clips_of(whole).joints.size() == 2);
  tests::GltfBuilder bare = whole;
  bare.remove("/nodes/3/skin");
  bare.remove("/nodes/3/mesh");
  bare.remove("/skins");
  bare.remove("/meshes");
  const model::Rig rig = clips_of(bare);
  REQUIRE(rig.clips.size() == 1);
  REQUIRE(rig.clips[0].name == "wave");
  REQUIRE(rig.clips[0].tracks.size() == 2);
  REQUIRE_FALSE(rig.has_skin());
  REQUIRE(rig.file == "clips.glb");
}
