#include "harness/base/file.h"
#include "harness/input/clip.h"
#include "harness/input/files.h"
#include "harness/input/input.h"
#include "harness/input/npy.h"
#include "metrics/elementary.h"

#include <Eigen/LU>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <system_error>
#include <utility>

namespace input {

namespace fs = std::filesystem;

namespace {

constexpr double kDefaultRate = 24;       // frames a second
constexpr std::size_t kMostNames = 1000;  // of a folder, looked at for the nearest

[[noreturn]] void fail(base::Problem place, std::string message) {
  place.message = std::move(message);
  throw base::InputError(std::move(place));
}

// A file named in a suite, found: where it lies and how messages name it.
struct Located {
  fs::path path;
  std::string shown;
};

std::string nearest_file(const fs::path& path) {
  std::vector<std::string> names;
  std::error_code error;
  for (fs::directory_iterator at(path.parent_path(), error), end;
       !error && at != end && names.size() < kMostNames; at.increment(error)) {
    names.push_back(at->path().filename().string());
  }
  std::sort(names.begin(), names.end());
  const std::string near = base::nearest_name(path.filename().string(), names);
  return near.empty() ? "" : fmt::format("; did you mean '{}'?", near);
}

Located locate(const model::FileRef& file, const fs::path& root) {
  fs::path path;
  try {
    path = base::path_inside(root, file.folder, file.path);
  } catch (const base::InputError& error) {
    fail(file.place, error.problems().front().message);
  }
  const std::string shown = shown_path(path, root);
  std::error_code error;
  if (!fs::exists(path, error))
    fail(file.place, fmt::format("there is no file {}{}", shown, nearest_file(path)));
  return {std::move(path), shown};
}

// The scale that a joint has at rest against its bind.
double joint_scale(const model::Rig& rig, const model::Joint& joint,
                   const std::vector<Eigen::Matrix4d>& rest) {
  const Eigen::Matrix4d& pose = rest[static_cast<std::size_t>(joint.node)];
  const Eigen::Matrix3d A = pose.block<3, 3>(0, 0) * joint.inverse_bind.block<3, 3>(0, 0);
  const double determinant = std::abs(A.determinant());
  if (!std::isfinite(determinant))
    throw base::InputError(fmt::format("the joint '{}' has a rest or bind matrix too large to "
                                       "compute with",
                                       model::node_path(rig, joint.node)),
                           rig.file);
  return metrics::cube_root(determinant);
}

double bind_scale(const model::Rig& rig, const model::Skin& skin,
                  const std::vector<Eigen::Matrix4d>& rest) {
  std::vector<double> scales;
  for (model::Index i = 0; i < skin.joint_count; ++i) {
    scales.push_back(joint_scale(rig, rig.joints[skin.first_joint + i], rest));
  }
  std::sort(scales.begin(), scales.end());
  const double median = scales[(scales.size() - 1) / 2];
  if (!(median > 0))
    throw base::InputError(fmt::format("the skin '{}' has bind scale 0: half of its joints or more "
                                       "are flattened at rest or at bind time",
                                       skin.name),
                           rig.file);
  return std::abs(median - 1) <= 1e-4 ? 1 : median;
}

void set_bind_scales(model::Rig& rig) {
  const std::vector<Eigen::Matrix4d> rest = model::rest_pose(rig);
  for (std::size_t node = 0; node < rest.size(); ++node) {
    if (!rest[node].allFinite())
      throw base::InputError(fmt::format("the node '{}' has a transform too large to compute with",
                                         model::node_path(rig, static_cast<int>(node))),
                             rig.file);
  }
  for (model::Skin& skin : rig.skins) {
    if (skin.joint_count == 0) continue;
    skin.bind_scale = bind_scale(rig, skin, rest);
    if (skin.bind_scale != 1)
      rig.notes.push_back(
          fmt::format("bind scale of skin '{}' is {:.6g}", skin.name, skin.bind_scale));
  }
  for (const model::Point& point : model::rest_shape(rig)) {
    if (!point.allFinite())
      throw base::InputError("the rest shape has coordinates too large to compute with", rig.file);
  }
}

std::vector<double> uniform_times(std::size_t frames, const model::MotionSpec& spec) {
  if (frames == 0 || frames > kMostFrames)
    fail(spec.place, fmt::format("the motion '{}' has {} frames; expected 1 to {} (\"frames\")",
                                 spec.name, frames, kMostFrames));
  const double rate = spec.rate.value_or(kDefaultRate);
  std::vector<double> times(frames);
  for (std::size_t f = 0; f < frames; ++f) times[f] = static_cast<double>(f) / rate;
  return times;
}

model::Sweep sweep(const model::MotionSpec& spec, const model::Rig& rig) {
  model::Sweep sweep;
  for (const model::SweepEntrySpec& entry : spec.sweep) {
    model::Sweep::Entry& turn = sweep.entries.emplace_back();
    turn.node = find_joint(rig, entry.joint, entry.place);
    turn.from = entry.from;
    turn.to = entry.to;
    if (entry.axis.size() != 3) fail(entry.place, "an axis of three numbers was expected");
    // Divided by the largest part first, so that no square over- or underflows.
    const Eigen::Vector3d axis(entry.axis[0], entry.axis[1], entry.axis[2]);
    const double largest = axis.cwiseAbs().maxCoeff();
    if (!(largest > 0) || !axis.allFinite())
      fail(entry.place, "an axis other than zero was expected");
    const Eigen::Vector3d part = axis / largest;
    turn.axis = part / std::sqrt(part.squaredNorm());
  }
  return sweep;
}

model::Motion poses(const model::MotionSpec& spec, const model::Rig& rig, const fs::path& root) {
  if (!spec.file) fail(spec.place, fmt::format("the motion '{}' names no poses", spec.name));
  const Located file = locate(*spec.file, root);
  model::Motion motion;
  motion.name = spec.name;
  std::size_t frames = 0;
  if (is_npy(file.path, file.shown)) {
    model::MatrixList list = read_matrices(file.path, file.shown, rig);
    frames = list.frames.size();
    motion.pose = std::move(list);
  } else {
    model::PoseList list = read_poses(file.path, file.shown, rig);
    frames = list.frames.size();
    motion.pose = std::move(list);
  }
  motion.times = uniform_times(frames, spec);
  return motion;
}

model::Motion clip(const model::MotionSpec& spec, const model::Rig& rig, const fs::path& root) {
  if (!spec.file) return clip_motion(spec, rig, rig);
  const Located file = locate(*spec.file, root);
  return clip_motion(spec, read_clip_file(file.path, file.shown, root), rig);
}

}  // namespace

model::Rig load_rig(const model::RigSpec& spec, const fs::path& root) {
  if (!spec.file && !spec.mesh)
    fail(spec.place, fmt::format("the rig '{}' names neither 'file' nor 'mesh'", spec.name));
  const Located file = locate(spec.file ? *spec.file : *spec.mesh, root);
  model::Rig rig;
  if (spec.file) {
    if (file.path.extension() == ".obj")
      fail(spec.file->place, fmt::format("'file' is for glTF; write \"mesh\": \"{}\" with a "
                                         "\"binding\" for an OBJ",
                                         spec.file->path));
    rig = read_gltf(file.path, file.shown, root, spec.skins);
  } else {
    rig = read_obj(file.path, file.shown);
    if (spec.binding) {
      const Located binding = locate(*spec.binding, root);
      read_binding(binding.path, binding.shown, root, rig);
    }
  }
  if (rig.positions.empty() || rig.faces.empty())
    throw base::InputError(fmt::format("has {} vertices and {} faces; a mesh to skin was expected",
                                       rig.positions.size(), rig.faces.size()),
                           file.shown);
  set_bind_scales(rig);
  return rig;
}

model::Motion load_motion(const model::MotionSpec& spec, const model::Rig& rig,
                          const fs::path& root) {
  using Kind = model::MotionSpec::Kind;
  switch (spec.kind) {
    case Kind::Clip:
      return clip(spec, rig, root);
    case Kind::Poses:
      return poses(spec, rig, root);
    case Kind::Sweep:
      return {spec.name, uniform_times(spec.frames, spec), sweep(spec, rig)};
    case Kind::Frames:
      break;
  }
  return {spec.name, uniform_times(spec.frames, spec), model::NoPose{}};
}

}  // namespace input
