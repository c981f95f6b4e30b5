#include "harness/input/clip.h"

#include "harness/base/file.h"
#include "harness/input/gltf_parts.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <map>
#include <numeric>
#include <utility>

namespace input {

namespace {

constexpr double kSameTime = 1e-5;  // seconds

[[noreturn]] void fail(const model::MotionSpec& spec, std::string message) {
  base::Problem problem = spec.place;
  problem.message = std::move(message);
  throw base::InputError(std::move(problem));
}

std::string clip_label(const model::Rig& source, std::size_t index) {
  const std::string& name = source.clips[index].name;
  return name.empty() ? fmt::format("#{}", index) : name;
}

// Indices of the clips that the address means: one, or all for "*".
std::vector<std::size_t> chosen_clips(const model::MotionSpec& spec, const model::Rig& source) {
  const std::size_t count = source.clips.size();
  if (count == 0) fail(spec, fmt::format("{} holds no clip to play", source.file));
  std::vector<std::size_t> found;
  if (spec.clip == "*") {
    found.resize(count);
    std::iota(found.begin(), found.end(), std::size_t{0});
    return found;
  }
  std::size_t index = 0;
  const char* const end = spec.clip.data() + spec.clip.size();
  if (spec.clip.starts_with('#')) {
    const auto [stop, error] = std::from_chars(spec.clip.data() + 1, end, index);
    if (error == std::errc{} && stop == end && index < count) return {index};
    if (stop == end)
      fail(spec, fmt::format("there is no clip {}; {} holds {}, #0 to #{}", spec.clip, source.file,
                             count, count - 1));
  }
  std::vector<std::string> known;
  for (std::size_t i = 0; i < count; ++i) {
    known.push_back(clip_label(source, i));
    if (!spec.clip.empty() && source.clips[i].name == spec.clip) found.push_back(i);
  }
  if (found.empty())
    fail(spec, fmt::format("no clip is named '{}' in {}{}", spec.clip, source.file,
                           base::hint(spec.clip, known)));
  if (found.size() > 1)
    fail(spec,
         fmt::format("{} clips are named '{}' in {}, the first two are #{} and #{}; write the "
                     "# and the index",
                     found.size(), spec.clip, source.file, found[0], found[1]));
  return found;
}

std::vector<model::Track> merged_tracks(const model::MotionSpec& spec, const model::Rig& source,
                                        std::span<const std::size_t> chosen) {
  std::vector<model::Track> tracks;
  std::map<std::pair<int, model::Channel>, std::size_t> owner;
  for (const std::size_t index : chosen) {
    const model::Clip& clip = source.clips[index];
    if (!clip.refusal.empty())
      fail(spec, fmt::format("the clip '{}' of {} cannot be played: {}", clip_label(source, index),
                             source.file, clip.refusal));
    for (const model::Track& track : clip.tracks) {
      const auto [at, added] = owner.emplace(std::pair(track.node, track.channel), index);
      if (!added)
        fail(spec, fmt::format("the clips '{}' and '{}' of {} both move '{}' in the same way, so "
                               "they cannot be played at once; name one of them",
                               clip_label(source, at->second), clip_label(source, index),
                               source.file, model::node_path(source, track.node)));
      tracks.push_back(track);
    }
  }
  if (tracks.empty())
    fail(spec, fmt::format("the clip '{}' of {} has no key", spec.clip, source.file));
  return tracks;
}

constexpr int kMissing = -1;
constexpr int kTwice = -2;

// Per node of `source` the node of `rig` with the same names from the root on.
std::vector<int> counterparts(const model::Rig& source, const model::Rig& rig) {
  const auto label = [](const model::Rig& of, int node) {
    const std::string& name = of.nodes[static_cast<std::size_t>(node)].name;
    return name.empty() ? fmt::format("#{}", node) : name;
  };
  std::map<std::pair<int, std::string>, int> children;  // by parent and name
  for (const int node : rig.walk) {
    const int parent = rig.nodes[static_cast<std::size_t>(node)].parent;
    const auto [at, added] = children.emplace(std::pair(parent, label(rig, node)), node);
    if (!added) at->second = kTwice;
  }
  std::vector<int> found(source.nodes.size(), kMissing);
  for (const int node : source.walk) {
    const int parent = source.nodes[static_cast<std::size_t>(node)].parent;
    const int above = parent < 0 ? -1 : found[static_cast<std::size_t>(parent)];
    int& target = found[static_cast<std::size_t>(node)];
    if (parent >= 0 && above < 0) {
      target = above;
    } else if (const auto at = children.find({above, label(source, node)}); at != children.end()) {
      target = at->second;
    }
  }
  return found;
}

void move_to_rig(const model::MotionSpec& spec, const model::Rig& source, const model::Rig& rig,
                 std::vector<model::Track>& tracks) {
  // A camera or a light may move along; only a file that says which nodes are joints can tell.
  if (source.has_skin()) {
    const std::vector<bool> carries = carries_joint(source);
    std::erase_if(tracks, [&](const model::Track& track) {
      return !carries[static_cast<std::size_t>(track.node)];
    });
  }
  const std::vector<int> targets = counterparts(source, rig);
  for (model::Track& track : tracks) {
    const int target = targets[static_cast<std::size_t>(track.node)];
    if (target < 0)
      fail(spec, fmt::format("the clip '{}' of {} moves '{}', and {} has {} of that path; nodes go "
                             "by their names from the root on",
                             spec.clip, source.file, model::node_path(source, track.node), rig.file,
                             target == kTwice ? "several nodes" : "no node"));
    track.node = target;
  }
}

std::vector<double> key_times(std::span<const model::Track> tracks) {
  std::vector<double> keys;
  for (const model::Track& track : tracks) {
    keys.insert(keys.end(), track.times.begin(), track.times.end());
  }
  std::sort(keys.begin(), keys.end());
  return keys;
}

}  // namespace

model::Rig read_clip_file(const std::filesystem::path& path, const std::string& shown,
                          const std::filesystem::path& root) {
  gltf::Document document(gltf::open_container(base::read_file(path, shown), shown), shown,
                          path.parent_path(), root);
  gltf::check_version(document);
  model::Rig rig;
  rig.file = shown;
  gltf::read_nodes(document, rig);
  std::vector<std::size_t> skins(document.count("skins"));
  std::iota(skins.begin(), skins.end(), std::size_t{0});
  gltf::read_skins(document, skins, rig);
  gltf::read_clips(document, skins, rig);
  return rig;
}

std::vector<double> frame_times(std::span<const double> keys, const model::MotionSpec& spec) {
  const double start = spec.span ? spec.span->first : spec.span_keys ? keys.front() : 0;
  const double end = spec.span ? spec.span->second : keys.back();
  if (!(start <= end))
    fail(spec, fmt::format("the clip '{}' would run from {} s to {} s; set \"span\" to [from, to]",
                           spec.clip, start, end));
  std::vector<double> times;
  if (spec.rate) {
    const double steps = std::floor((end - start) * *spec.rate + 0.01);
    if (!(steps < static_cast<double>(kMostFrames)))
      fail(spec, fmt::format("the clip '{}' from {} s to {} s at {} frames a second has more than "
                             "{} frames; lower \"rate\" or shorten \"span\"",
                             spec.clip, start, end, *spec.rate, kMostFrames));
    times.resize(static_cast<std::size_t>(steps) + 1);
    for (std::size_t k = 0; k < times.size(); ++k) {
      times[k] = std::min(start + static_cast<double>(k) / *spec.rate, end);
    }
    return times;
  }
  for (const double key : keys) {
    const bool inside = key >= start - kSameTime && key <= end + kSameTime;
    if (inside && (times.empty() || key - times.back() > kSameTime)) times.push_back(key);
  }
  if (times.empty())
    fail(spec, fmt::format("no key of the clip '{}' lies from {} s to {} s (the keys are from {} s "
                           "to {} s); change \"span\" or set \"rate\"",
                           spec.clip, start, end, keys.front(), keys.back()));
  if (times.size() > kMostFrames)
    fail(spec, fmt::format("the clip '{}' has keys at {} different times, more than {} frames; set "
                           "\"rate\" or shorten \"span\"",
                           spec.clip, times.size(), kMostFrames));
  return times;
}

model::Motion clip_motion(const model::MotionSpec& spec, const model::Rig& source,
                          const model::Rig& rig) {
  const std::vector<std::size_t> chosen = chosen_clips(spec, source);
  std::vector<model::Track> tracks = merged_tracks(spec, source, chosen);
  model::Motion motion;
  motion.name = spec.name;
  motion.times = frame_times(key_times(tracks), spec);
  if (&source != &rig) move_to_rig(spec, source, rig, tracks);
  const std::vector<bool> carries = carries_joint(rig);
  std::erase_if(tracks, [&](const model::Track& track) {
    return !carries[static_cast<std::size_t>(track.node)];
  });
  if (tracks.empty())
    fail(spec, fmt::format("the clip '{}' of {} moves no joint of {} nor a node above one; choose "
                           "another clip",
                           spec.clip, source.file, rig.file));
  motion.pose = model::Play{std::move(tracks)};
  return motion;
}

}  // namespace input
