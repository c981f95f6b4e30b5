#include "harness/base/file.h"
#include "harness/input/files.h"
#include "harness/input/formats.h"
#include "harness/input/npy.h"

#include <Eigen/Geometry>
#include <Eigen/LU>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <unordered_map>

namespace input {

namespace {

using base::Json;
using base::JsonView;
using base::Problem;
using Names = std::unordered_map<std::string, int>;

constexpr std::size_t kMostProblems = 20;
constexpr std::size_t kBlock = 65536;  // influences read at a time
constexpr std::size_t kMostInfluences = std::numeric_limits<model::Index>::max() - 1;

void throw_if_any(const std::vector<Problem>& problems) {
  if (!problems.empty()) throw base::InputError(problems);
}

// Joint-to-model at bind time, or nothing and a problem.
std::optional<Eigen::Matrix4d> bind_matrix(JsonView& view) {
  const std::size_t before = view.problems().size();
  const std::vector<double> numbers = view.numbers("bind", 16);
  if (view.json().find("bind") == nullptr)
    view.fail("the key 'bind' is missing (16 numbers, row by row)");
  if (view.problems().size() > before) return std::nullopt;
  Eigen::Matrix4d bind;
  for (Eigen::Index i = 0; i < 16; ++i) {
    bind(i / 4, i % 4) = numbers[static_cast<std::size_t>(i)];
  }
  const Eigen::Vector4d last(0, 0, 0, 1);
  if (!((bind.row(3).transpose() - last).cwiseAbs().maxCoeff() <= 1e-6)) {
    view.fail("bind",
              "the last row is not 0 0 0 1; 'bind' is written row by row, with the "
              "translation as 4th, 8th and 12th number");
    return std::nullopt;
  }
  bind.row(3) = last.transpose();
  const Eigen::Matrix3d A = bind.block<3, 3>(0, 0);
  const double lengths = A.col(0).norm() * A.col(1).norm() * A.col(2).norm();
  if (!(std::abs(A.determinant()) > 1e-12 * lengths) || !std::isfinite(lengths)) {
    view.fail("bind", "this matrix has no inverse; a joint may not be flattened at bind time");
    return std::nullopt;
  }
  return bind;
}

Eigen::Matrix4d affine_inverse(const Eigen::Matrix4d& M) {
  Eigen::Matrix4d inverse = Eigen::Matrix4d::Identity();
  const Eigen::Matrix3d A = M.block<3, 3>(0, 0).inverse();
  inverse.block<3, 3>(0, 0) = A;
  inverse.block<3, 1>(0, 3) = -(A * M.block<3, 1>(0, 3));
  return inverse;
}

// Rest pose of a node: translation, rotation and scale where these give the matrix back, so that a
// sweep turns between rotation and scale; a sheared matrix is kept as it is.
void set_local(model::Node& node, const Eigen::Matrix4d& local) {
  const Eigen::Matrix3d A = local.block<3, 3>(0, 0);
  model::Transform parts;
  Eigen::Matrix3d R;
  for (Eigen::Index i = 0; i < 3; ++i) {
    parts.scale[i] = A.col(i).norm();
    if (i == 0 && A.determinant() < 0) parts.scale[0] = -parts.scale[0];
    R.col(i) = A.col(i) / parts.scale[i];
  }
  parts.translation = local.block<3, 1>(0, 3);
  parts.rotation = Eigen::Quaterniond(R).coeffs();
  const double difference = (model::local_matrix(parts) - local).cwiseAbs().maxCoeff();
  if (difference <= 1e-9 * A.cwiseAbs().maxCoeff())
    node.local = parts;
  else
    node.matrix = local;
}

struct JointEntry {
  std::string name;
  const Json* parent = nullptr;  // a string, or null for a root
  Eigen::Matrix4d bind = Eigen::Matrix4d::Identity();
};

std::vector<JointEntry> joint_entries(const JsonView& file, const Json& list) {
  std::vector<JointEntry> entries;
  std::vector<Problem>& problems = file.problems();
  const std::string pointer = base::child_pointer(file.pointer(), "joints");
  for (std::size_t i = 0; i < list.items.size() && problems.size() < kMostProblems; ++i) {
    JsonView view(list.items[i], base::child_pointer(pointer, i), problems);
    if (!view.is_object()) continue;
    JointEntry entry;
    const Json* name = view.required("name", Json::Kind::String);
    if (name != nullptr) entry.name = name->string;
    if (name != nullptr && name->string.empty()) view.fail("name", "a joint needs a name");
    entry.parent = view.member("parent");
    if (entry.parent == nullptr)
      view.fail("the key 'parent' is missing (the name of a joint, or null for a root)");
    else if (entry.parent->kind != Json::Kind::String && entry.parent->kind != Json::Kind::Null)
      view.fail("parent", "the name of a joint, or null, was expected");
    entry.bind = bind_matrix(view).value_or(entry.bind);
    view.close();
    entries.push_back(std::move(entry));
  }
  if (list.items.empty()) file.fail("joints", "at least one joint was expected");
  throw_if_any(problems);
  return entries;
}

Names joint_names(const JsonView& file, const std::vector<JointEntry>& entries) {
  Names names;
  for (std::size_t i = 0; i < entries.size(); ++i) {
    const auto [at, added] = names.emplace(entries[i].name, static_cast<int>(i));
    if (!added)
      file.fail("joints", fmt::format("the joints {} and {} are both named '{}'; parents go by "
                                      "name, so that each name may occur once",
                                      at->second, i, entries[i].name));
    if (file.problems().size() >= kMostProblems) break;
  }
  throw_if_any(file.problems());
  return names;
}

std::string known_names_hint(const Names& names, const std::string& wanted) {
  std::vector<std::string> known;
  for (const auto& [name, index] : names) known.push_back(name);
  std::sort(known.begin(), known.end());
  return base::hint(wanted, known);
}

// Nodes with the parents before the children. Throws when joints go round in a circle.
std::vector<int> walk_order(const std::vector<model::Node>& nodes, const std::string& shown) {
  std::vector<std::vector<int>> children(nodes.size());
  std::vector<int> walk;
  for (std::size_t i = 0; i < nodes.size(); ++i) {
    const int node = static_cast<int>(i);
    const int parent = nodes[i].parent;
    (parent < 0 ? walk : children[static_cast<std::size_t>(parent)]).push_back(node);
  }
  std::vector<bool> reached(nodes.size(), false);
  for (std::size_t i = 0; i < walk.size(); ++i) {
    const auto node = static_cast<std::size_t>(walk[i]);
    reached[node] = true;
    walk.insert(walk.end(), children[node].begin(), children[node].end());
  }
  if (walk.size() == nodes.size()) return walk;
  // Whoever is not reached leads upwards into a circle within as many steps as there are joints.
  auto at =
      static_cast<std::size_t>(std::find(reached.begin(), reached.end(), false) - reached.begin());
  for (std::size_t step = 0; step < nodes.size(); ++step) {
    at = static_cast<std::size_t>(nodes[at].parent);
  }
  throw base::InputError(fmt::format("the joint '{}' is its own ancestor; follow its 'parent' "
                                     "upwards, which must end at null",
                                     nodes[at].name),
                         shown);
}

void add_skeleton(const JsonView& file, const std::vector<JointEntry>& entries, const Names& names,
                  model::Rig& rig) {
  const std::string pointer = base::child_pointer(file.pointer(), "joints");
  for (std::size_t i = 0; i < entries.size(); ++i) {
    model::Node node;
    node.name = entries[i].name;
    if (entries[i].parent->kind == Json::Kind::String) {
      const std::string& parent = entries[i].parent->string;
      const auto found = names.find(parent);
      if (found != names.end())
        node.parent = found->second;
      else
        file.problems().push_back(problem_at(
            *entries[i].parent, base::child_pointer(base::child_pointer(pointer, i), "parent"),
            fmt::format("no joint is named '{}'{}", parent, known_names_hint(names, parent))));
      if (file.problems().size() >= kMostProblems) break;
    }
    rig.nodes.push_back(std::move(node));
  }
  throw_if_any(file.problems());
  rig.walk = walk_order(rig.nodes, file.json().source->file);
  for (std::size_t i = 0; i < entries.size(); ++i) {
    model::Joint joint;
    joint.node = static_cast<int>(i);
    joint.inverse_bind = affine_inverse(entries[i].bind);
    rig.file_binds.push_back(entries[i].bind);
    rig.joints.push_back(joint);
  }
  for (std::size_t i = 0; i < entries.size(); ++i) {
    const int parent = rig.nodes[i].parent;
    const Eigen::Matrix4d& bind = entries[i].bind;
    set_local(rig.nodes[i],
              parent < 0 ? bind : rig.joints[static_cast<std::size_t>(parent)].inverse_bind * bind);
  }
}

// The joint an influence names by index or name; nothing when there is none such.
std::optional<model::Index> influence_joint(const Json& value, const Names& names) {
  if (value.kind == Json::Kind::String) {
    const auto found = names.find(value.string);
    if (found == names.end()) return std::nullopt;
    return static_cast<model::Index>(found->second);
  }
  const bool usable = value.kind == Json::Kind::Number && value.integer && value.number >= 0 &&
                      value.number < static_cast<double>(names.size());
  return usable ? std::optional(static_cast<model::Index>(value.number)) : std::nullopt;
}

// What is wrong with one [joint, weight] pair; empty when nothing is, and then it is added.
std::string add_influence(const Json& pair, const Names& names, model::Influences& influences) {
  if (pair.kind != Json::Kind::Array || pair.items.size() != 2 ||
      pair.items[1].kind != Json::Kind::Number)
    return "a pair [joint, weight] was expected";
  const std::optional<model::Index> joint = influence_joint(pair.items[0], names);
  if (!joint && pair.items[0].kind == Json::Kind::String)
    return fmt::format("no joint is named '{}'{}", pair.items[0].string,
                       known_names_hint(names, pair.items[0].string));
  if (!joint)
    return fmt::format("a joint was expected: a name, or an index from 0 to {}", names.size() - 1);
  const double weight = pair.items[1].number;
  if (weight == 0) return {};
  influences.joint.push_back(*joint);
  influences.weight.push_back(weight);
  return {};
}

void read_listed(const JsonView& file, const Json& list, const Names& names, model::Rig& rig) {
  std::vector<Problem>& problems = file.problems();
  const std::string pointer = base::child_pointer(file.pointer(), "influences");
  if (list.items.size() != rig.positions.size())
    file.fail(
        "influences",
        fmt::format("{} entries, but the mesh {} has {} vertices; one list of [joint, weight] "
                    "pairs per vertex was expected",
                    list.items.size(), rig.file, rig.positions.size()));
  throw_if_any(problems);
  rig.influences.first.assign(1, 0);
  for (std::size_t v = 0; v < list.items.size() && problems.size() < kMostProblems; ++v) {
    const Json& vertex = list.items[v];
    if (vertex.kind != Json::Kind::Array)
      problems.push_back(problem_at(vertex, base::child_pointer(pointer, v),
                                    "a list of [joint, weight] pairs was expected"));
    for (std::size_t i = 0; i < vertex.items.size() && problems.size() < kMostProblems; ++i) {
      std::string wrong = add_influence(vertex.items[i], names, rig.influences);
      if (!wrong.empty())
        problems.push_back(problem_at(vertex.items[i],
                                      base::child_pointer(base::child_pointer(pointer, v), i),
                                      std::move(wrong)));
    }
    rig.influences.first.push_back(static_cast<model::Index>(rig.influences.joint.size()));
  }
  throw_if_any(problems);
}

// One of the two arrays that 'influences' may name, opened and of the right shape.
NpyArray influence_array(const JsonView& view, const char* key, NpyItems items,
                         const model::Rig& rig, const std::filesystem::path& root) {
  const std::string& name = view.json().find(key)->string;
  std::filesystem::path path;
  try {
    path = base::path_inside(root, view.json().source->folder, name);
  } catch (const base::InputError& error) {
    view.fail(key, error.problems().front().message);
    throw_if_any(view.problems());
  }
  const std::string shown = shown_path(path, root);
  NpyArray array = open_npy(path, shown, items);
  if (array.shape.size() != 2 || array.shape[0] != rig.positions.size())
    throw base::InputError(
        fmt::format("has shape {}; expected (vertices, influences per vertex), and the mesh {} has "
                    "{} vertices",
                    shape_text(array.shape), rig.file, rig.positions.size()),
        shown);
  return array;
}

void read_arrays(JsonView view, model::Rig& rig, const std::filesystem::path& root) {
  view.required("joints", Json::Kind::String);
  view.required("weights", Json::Kind::String);
  view.close();
  throw_if_any(view.problems());
  const NpyArray joints = influence_array(view, "joints", NpyItems::Integer, rig, root);
  const NpyArray weights = influence_array(view, "weights", NpyItems::Real, rig, root);
  if (joints.shape != weights.shape)
    throw base::InputError(
        fmt::format("has shape {}, but {} has {}; both need the same", shape_text(weights.shape),
                    joints.file->shown(), shape_text(joints.shape)),
        weights.file->shown());
  if (joints.items > kMostInfluences)
    throw base::InputError("holds more influences than can be counted in 32 bits",
                           joints.file->shown());
  const std::size_t width = joints.shape[1];
  std::vector<double> joint(std::min(kBlock, joints.items));
  std::vector<double> weight(joint.size());
  rig.influences.first.assign(rig.positions.size() + 1, 0);
  for (std::size_t item = 0; item < joints.items; ++item) {
    const std::size_t at = item % kBlock;
    const auto place = [&] {
      return fmt::format("vertex {}, influence {}: ", item / width, item % width);
    };
    if (at == 0) {
      const std::size_t count = std::min(kBlock, joints.items - item);
      read_items(joints, item, std::span(joint).first(count));
      read_items(weights, item, std::span(weight).first(count));
    }
    if (!(joint[at] >= 0 && joint[at] < static_cast<double>(rig.joints.size())))
      throw base::InputError(
          fmt::format("{}joint {}; expected an index from 0 to {} (padding: joint 0, weight 0)",
                      place(), joint[at], rig.joints.size() - 1),
          joints.file->shown());
    if (!std::isfinite(weight[at]))
      throw base::InputError(fmt::format("{}weight {} is no finite number", place(), weight[at]),
                             weights.file->shown());
    if (weight[at] == 0) continue;
    rig.influences.joint.push_back(static_cast<model::Index>(joint[at]));
    rig.influences.weight.push_back(weight[at]);
    ++rig.influences.first[item / width + 1];
  }
  for (std::size_t v = 0; v < rig.positions.size(); ++v) {
    rig.influences.first[v + 1] += rig.influences.first[v];
  }
}

}  // namespace

void read_binding(const std::filesystem::path& path, const std::string& shown,
                  const std::filesystem::path& root, model::Rig& rig) {
  const base::JsonSource source = read_json_text(path, shown);
  const Json json = base::parse_json(source);
  std::vector<Problem> problems;
  JsonView file(json, "", problems);
  throw_if_any(problems);
  const Json* version = file.required("skinfold", Json::Kind::String);
  if (version != nullptr && version->string != "binding 1")
    file.fail("skinfold",
              fmt::format("'{}' is not read here; expected \"binding 1\"", version->string));
  const Json* joints = file.required("joints", Json::Kind::Array);
  const Json* influences = file.member("influences");
  if (influences == nullptr)
    file.fail(
        "the key 'influences' is missing (an array with one entry per vertex, or an object "
        "that names two .npy files)");
  file.close();
  throw_if_any(problems);

  const std::vector<JointEntry> entries = joint_entries(file, *joints);
  const Names names = joint_names(file, entries);
  add_skeleton(file, entries, names, rig);
  rig.skins.push_back({path.stem().string(), 0, static_cast<model::Index>(rig.joints.size()), 1});
  rig.vertex_skin.assign(rig.positions.size(), 0);
  if (influences->kind == Json::Kind::Array)
    read_listed(file, *influences, names, rig);
  else
    read_arrays(file.child("influences", *influences), rig, root);
}

Format binding_format() {
  return {.name = "binding",
          .extensions = ".json with \"skinfold\": \"binding 1\"",
          .holds = "skeleton, bind matrices and weights for a mesh from an OBJ file",
          .limits =
              "joint names occur once; joints of influences by index or name, in .npy files "
              "by index",
          .source = "this program"};
}

}  // namespace input
