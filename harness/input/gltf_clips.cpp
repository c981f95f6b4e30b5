#include "harness/input/gltf_accessors.h"
#include "harness/input/gltf_parts.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <set>
#include <utility>

namespace input::gltf {

namespace {

constexpr Use kTimes{.type = "SCALAR", .allowed = kF32};
constexpr Use kVectors{.type = "VEC3", .allowed = kF32 | kNormalized};
constexpr Use kRotations{.type = "VEC4", .allowed = kF32 | kNormalized};

void refuse(model::Clip& clip, std::string_view why) {
  if (clip.refusal.empty()) clip.refusal = fmt::format("{}: not in this version", why);
}

model::Channel channel_of(const Object& target, const std::string& path) {
  if (path == "translation") return model::Channel::Translation;
  if (path == "rotation") return model::Channel::Rotation;
  if (path == "scale") return model::Channel::Scale;
  const std::vector<std::string> known = {"translation", "rotation", "scale", "weights"};
  target.fail("path", fmt::format("unknown path '{}'{}", path, base::hint(path, known)));
}

std::vector<double> read_times(Document& document, const Object& sampler) {
  const Accessor accessor = open_accessor(document, sampler, "input", kTimes);
  std::vector<double> times = decode_numbers(accessor);
  if (times.front() < 0)
    accessor.object.fail(
        fmt::format("{}: element 0 is {} s, before 0", accessor.what, times.front()));
  for (std::size_t i = 1; i < times.size(); ++i)
    if (!(times[i] > times[i - 1]))
      accessor.object.fail(fmt::format("{}: element {} ({} s) is not after element {} ({} s)",
                                       accessor.what, i, times[i], i - 1, times[i - 1]));
  return times;
}

std::vector<Eigen::Vector4d> read_values(const Accessor& accessor, model::Channel channel) {
  const std::vector<double> numbers = decode_numbers(accessor);
  std::vector<Eigen::Vector4d> values(accessor.count, Eigen::Vector4d::Zero());
  for (std::size_t i = 0; i < numbers.size(); ++i)
    values[i / accessor.components][static_cast<Eigen::Index>(i % accessor.components)] =
        numbers[i];
  if (channel != model::Channel::Rotation) return values;
  for (std::size_t i = 0; i < values.size(); ++i)
    if (!(values[i].squaredNorm() >= std::numeric_limits<double>::min()))
      accessor.object.fail(
          fmt::format("{}: element {} is a quaternion of zero length", accessor.what, i));
  return values;
}

std::string interpolation_of(const Object& sampler) {
  std::vector<base::Problem> problems;
  base::JsonView view(sampler.json(), sampler.pointer(), problems);
  std::string name = view.choice("interpolation", {"LINEAR", "STEP", "CUBICSPLINE"});
  if (!problems.empty()) throw base::InputError(std::move(problems));
  return name;
}

// Adds the track of one channel, or the reason why the clip cannot be played.
void read_track(Document& document, const Object& sampler, int node, model::Channel channel,
                model::Clip& clip) {
  const std::string interpolation = interpolation_of(sampler);
  const bool cubic = interpolation == "CUBICSPLINE";
  model::Track track{.node = node, .channel = channel, .times = {}, .values = {}};
  if (interpolation == "STEP") track.interpolation = model::Interpolation::Step;
  track.times = read_times(document, sampler);
  const Accessor output = open_accessor(
      document, sampler, "output", channel == model::Channel::Rotation ? kRotations : kVectors);
  const std::size_t wanted = track.times.size() * (cubic ? 3 : 1);
  if (output.count != wanted)
    output.object.fail("count",
                       fmt::format("{} has {} values for {} keys, and {} needs {}", output.what,
                                   output.count, track.times.size(), interpolation, wanted));
  if (cubic) return refuse(clip, "uses CUBICSPLINE interpolation");
  if (output.storage != kF32) return refuse(clip, "has normalized-integer keys");
  track.values = read_values(output, channel);
  clip.tracks.push_back(std::move(track));
}

struct ClipReader {
  Document& document;
  std::span<const std::size_t> chosen;
  const model::Rig& rig;

  bool carries_chosen_skin(std::size_t node) const {
    const Object object = document.at("nodes", node);
    return object.has("skin") &&
           std::find(chosen.begin(), chosen.end(), object.whole("skin")) != chosen.end();
  }

  model::Clip read(const Object& animation) const {
    model::Clip clip{.name = animation.text("name"), .tracks = {}, .refusal = {}};
    const std::vector<Object> channels = animation.children("channels");
    const std::vector<Object> samplers = animation.children("samplers");
    if (channels.empty() || samplers.empty())
      animation.fail("an animation has at least one of 'channels' and of 'samplers'");
    std::set<std::pair<std::size_t, std::string>> seen;
    for (const Object& channel : channels) {
      const std::size_t sampler = channel.whole("sampler");
      if (sampler >= samplers.size())
        channel.fail("sampler", fmt::format("there is no sampler {} in this animation, which "
                                            "has {}",
                                            sampler, samplers.size()));
      const Object target = channel.child("target");
      const std::string path = target.text("path");
      if (path == "pointer") {
        refuse(clip, "animates through the extension KHR_animation_pointer");
        continue;
      }
      if (path != "weights") channel_of(target, path);
      if (!target.has("node")) continue;  // glTF: such a channel is ignored
      const std::size_t node = document.reference(target, "node", "nodes");
      if (!seen.emplace(node, path).second)
        channel.fail(fmt::format("a second channel for the {} of node {}", path,
                                 document.label("nodes", node)));
      if (path == "weights") {
        if (carries_chosen_skin(node)) refuse(clip, "animates morph weights");
        continue;
      }
      if (rig.nodes[node].matrix)
        target.fail("node", fmt::format("node {} has a 'matrix' and is animated; only a node with "
                                        "translation, rotation and scale can be",
                                        document.label("nodes", node)));
      read_track(document, samplers[sampler], static_cast<int>(node), channel_of(target, path),
                 clip);
    }
    return clip;
  }
};

}  // namespace

void read_clips(Document& document, std::span<const std::size_t> chosen, model::Rig& rig) {
  const ClipReader reader{document, chosen, rig};
  for (std::size_t i = 0; i < document.count("animations"); ++i)
    rig.clips.push_back(reader.read(document.at("animations", i)));
}

}  // namespace input::gltf
