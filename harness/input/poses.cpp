#include "harness/base/file.h"
#include "harness/input/files.h"
#include "harness/input/formats.h"
#include "harness/input/npy.h"

#include <fmt/format.h>

#include <cmath>
#include <optional>
#include <unordered_map>
#include <unordered_set>
#include <utility>

namespace input {

namespace {

using base::Json;
using base::JsonView;
using base::Problem;

constexpr std::size_t kMostProblems = 20;
constexpr double kRounding = 1e-6;

void throw_if_any(const std::vector<Problem>& problems) {
  if (!problems.empty()) throw base::InputError(problems);
}

// Reads the frames; every address is looked up once, however many frames use it.
class PoseReader {
 public:
  PoseReader(const model::Rig& rig, std::vector<Problem>& problems)
      : rig_(rig), problems_(problems) {}

  std::vector<model::PoseList::Change> frame(const Json& json, const std::string& pointer) {
    std::vector<model::PoseList::Change> changes;
    std::unordered_set<int> moved;
    const JsonView view(json, pointer, problems_);
    for (const auto& [address, value] : json.members) {
      if (problems_.size() >= kMostProblems) break;
      const std::optional<int> node = joint(address, value, pointer);
      model::PoseList::Change read =
          change(JsonView(value, base::child_pointer(pointer, address), problems_));
      if (!node) continue;
      read.node = *node;
      if (!moved.insert(*node).second)
        view.fail(address, fmt::format("the joint {} occurs twice in this frame",
                                       model::node_path(rig_, *node)));
      changes.push_back(std::move(read));
    }
    return changes;
  }

 private:
  std::optional<int> joint(const std::string& address, const Json& value,
                           const std::string& pointer) {
    const auto known = nodes_.find(address);
    if (known != nodes_.end()) return known->second;
    try {
      const int node = find_joint(rig_, address, {});
      nodes_.emplace(address, node);
      return node;
    } catch (const base::InputError& error) {
      problems_.push_back(problem_at(value, base::child_pointer(pointer, address),
                                     error.problems().front().message));
      return std::nullopt;
    }
  }

  static model::PoseList::Change change(JsonView view) {
    model::PoseList::Change change;
    if (const std::vector<double> q = view.numbers("rotate", 4); !q.empty()) {
      // Divided by the largest part first, so that no square over- or underflows.
      Eigen::Vector4d rotation(q[0], q[1], q[2], q[3]);
      const double largest = rotation.cwiseAbs().maxCoeff();
      if (largest > 0) {
        rotation /= largest;
        change.rotate = rotation / std::sqrt(rotation.squaredNorm());
      } else {
        view.fail("rotate", "a quaternion [x, y, z, w] other than zero was expected");
      }
    }
    if (const std::vector<double> t = view.numbers("move", 3); !t.empty())
      change.move = Eigen::Vector3d(t[0], t[1], t[2]);
    if (const std::vector<double> s = view.numbers("scale", 3); !s.empty())
      change.scale = Eigen::Vector3d(s[0], s[1], s[2]);
    view.close();
    return change;
  }

  const model::Rig& rig_;
  std::vector<Problem>& problems_;
  std::unordered_map<std::string, int> nodes_;
};

}  // namespace

model::PoseList read_poses(const std::filesystem::path& path, const std::string& shown,
                           const model::Rig& rig) {
  const base::JsonSource source = read_json_text(path, shown);
  const Json json = base::parse_json(source);
  std::vector<Problem> problems;
  JsonView file(json, "", problems);
  throw_if_any(problems);
  const Json* version = file.required("skinfold", Json::Kind::String);
  if (version != nullptr && version->string != "poses 1")
    file.fail("skinfold",
              fmt::format("'{}' is not read here; expected \"poses 1\"", version->string));
  const Json* frames = file.required("frames", Json::Kind::Array);
  if (frames != nullptr && frames->items.empty())
    file.fail("frames", "at least one frame was expected");
  file.close();
  throw_if_any(problems);

  model::PoseList poses;
  PoseReader reader(rig, problems);
  for (std::size_t i = 0; i < frames->items.size(); ++i) {
    if (problems.size() >= kMostProblems) break;
    poses.frames.push_back(reader.frame(frames->items[i], base::child_pointer("/frames", i)));
  }
  throw_if_any(problems);
  return poses;
}

model::MatrixList read_matrices(const std::filesystem::path& path, const std::string& shown,
                                const model::Rig& rig) {
  const NpyArray array = open_npy(path, shown, NpyItems::Double);
  const std::size_t joints = rig.joints.size();
  if (array.shape.size() != 4 || array.shape[0] == 0 || array.shape[1] != joints ||
      array.shape[2] != 4 || array.shape[3] != 4)
    throw base::InputError(
        fmt::format("has shape {}; expected (frames, {}, 4, 4), one matrix for each of the {} "
                    "joints of {} in the order of its skins",
                    shape_text(array.shape), joints, joints, rig.file),
        shown);
  if (array.items == 0) throw base::InputError("the rig has no joints to pose", shown);
  model::MatrixList list;
  std::vector<double> values(joints * 16);
  for (std::size_t f = 0; f < array.shape[0]; ++f) {
    read_items(array, f * values.size(), values);
    std::vector<Eigen::Matrix4d>& frame = list.frames.emplace_back(joints);
    for (std::size_t i = 0; i < values.size(); ++i) {
      const auto row = static_cast<Eigen::Index>(i % 16 / 4);
      const auto column = static_cast<Eigen::Index>(i % 4);
      const auto fail = [&](std::string_view what) {
        throw base::InputError(fmt::format("frame {}, joint {} ({}), row {}, column {}: {} {}", f,
                                           i / 16, model::node_path(rig, rig.joints[i / 16].node),
                                           row, column, values[i], what),
                               shown);
      };
      if (!std::isfinite(values[i])) fail("is no finite number");
      const double wanted = column == 3 ? 1 : 0;
      if (row == 3 && !(std::abs(values[i] - wanted) <= kRounding))
        fail(
            "where the last row of a matrix is 0 0 0 1; matrices are joint-to-model for column "
            "vectors, written row by row");
      frame[i / 16](row, column) = row == 3 ? wanted : values[i];
    }
  }
  return list;
}

Format poses_format() {
  return {.name = "poses",
          .extensions = ".json with \"skinfold\": \"poses 1\"",
          .holds = "per frame, turns, moves and scales of joints on top of the rest pose",
          .limits = "quaternions (x, y, z, w) are normalized",
          .source = "this program"};
}

}  // namespace input
