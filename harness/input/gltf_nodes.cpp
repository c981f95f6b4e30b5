#include "harness/input/gltf_accessors.h"
#include "harness/input/gltf_parts.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <limits>

namespace input::gltf {

namespace {

constexpr double kNear = 1e-6;           // of a last row to 0 0 0 1
constexpr std::size_t kMostListed = 20;  // names in one message

// `numbers` column by column. The last row must be 0 0 0 1, and is then exactly that.
Eigen::Matrix4d affine(const double* numbers, const Object& blamed, const std::string& what) {
  Eigen::Matrix4d M = Eigen::Map<const Eigen::Matrix4d>(numbers);
  const Eigen::RowVector4d last(0, 0, 0, 1);
  for (int c = 0; c < 4; ++c)
    if (!(std::abs(M(3, c) - last(c)) <= kNear))
      blamed.fail(fmt::format("{}: the last row is {} {} {} {} and must be 0 0 0 1", what, M(3, 0),
                              M(3, 1), M(3, 2), M(3, 3)));
  M.row(3) = last;
  return M;
}

template <typename Vector>
void read_vector(const Object& object, std::string_view key, Vector& out) {
  if (!object.has(key)) return;
  const std::vector<double> numbers = object.numbers(key, static_cast<std::size_t>(out.size()));
  for (Eigen::Index i = 0; i < out.size(); ++i) out[i] = numbers[static_cast<std::size_t>(i)];
}

model::Node read_node(const Document& document, const Object& object) {
  model::Node node;
  node.name = object.text("name");
  read_vector(object, "translation", node.local.translation);
  read_vector(object, "rotation", node.local.rotation);
  read_vector(object, "scale", node.local.scale);
  const double squared = node.local.rotation.squaredNorm();
  if (!(squared >= std::numeric_limits<double>::min()) || !std::isfinite(squared))
    object.fail("rotation", "a quaternion of zero or infinite length turns nothing");
  if (object.has("matrix")) {
    for (const std::string_view key : {"translation", "rotation", "scale"})
      if (object.has(key))
        object.fail(fmt::format("a node has either 'matrix' or '{}', not both", key));
    node.matrix = affine(object.numbers("matrix", 16).data(), object, "matrix");
  }
  if (object.has("mesh")) document.reference(object, "mesh", "meshes");
  if (object.has("skin")) {
    document.reference(object, "skin", "skins");
    if (!object.has("mesh")) object.fail("skin", "a node with 'skin' must have 'mesh' too");
  }
  return node;
}

// Parents before children: from the roots, depth first. What is not reached lies on a cycle.
std::vector<int> walk_order(const std::vector<model::Node>& nodes,
                            const std::vector<std::vector<int>>& children) {
  std::vector<int> walk;
  std::vector<int> open;
  for (std::size_t i = nodes.size(); i-- > 0;)
    if (nodes[i].parent < 0) open.push_back(static_cast<int>(i));
  while (!open.empty()) {
    const int node = open.back();
    open.pop_back();
    walk.push_back(node);
    const std::vector<int>& below = children[static_cast<std::size_t>(node)];
    open.insert(open.end(), below.rbegin(), below.rend());
  }
  return walk;
}

std::string list_skins(const Document& document) {
  const std::size_t count = document.count("skins");
  std::string out;
  for (std::size_t i = 0; i < std::min(count, kMostListed); ++i)
    out += (i == 0 ? "" : ", ") + document.label("skins", i);
  return count > kMostListed ? out + fmt::format(" and {} more", count - kMostListed) : out;
}

std::size_t find_skin(const Document& document, const std::string& address) {
  const std::size_t count = document.count("skins");
  std::vector<std::string> names;
  std::vector<std::size_t> found;
  for (std::size_t i = 0; i < count; ++i) {
    names.push_back(document.at("skins", i).text("name"));
    if (!address.empty() && names.back() == address) found.push_back(i);
  }
  if (found.size() == 1) return found.front();
  if (found.size() > 1)
    document.top().fail("skins",
                        fmt::format("{} skins are named '{}'; write '#{}' or another "
                                    "index: {}",
                                    found.size(), address, found.front(), list_skins(document)));
  std::size_t index = 0;
  const char* const end = address.data() + address.size();
  if (address.starts_with('#')) {
    const auto [rest, error] = std::from_chars(address.data() + 1, end, index);
    if (error == std::errc{} && rest == end && index < count) return index;
  }
  document.top().fail(
      "skins", fmt::format("there is no skin '{}'{}; the file has {}", address,
                           base::nearest_name(address, names).empty()
                               ? ""
                               : "; did you mean '" + base::nearest_name(address, names) + "'?",
                           list_skins(document)));
}

}  // namespace

void read_nodes(const Document& document, model::Rig& rig) {
  const std::size_t count = document.count("nodes");
  std::vector<std::vector<int>> children(count);
  for (std::size_t i = 0; i < count; ++i)
    rig.nodes.push_back(read_node(document, document.at("nodes", i)));
  for (std::size_t i = 0; i < count; ++i) {
    const Object object = document.at("nodes", i);
    for (const std::size_t child : document.references(object, "children", "nodes")) {
      int& parent = rig.nodes[child].parent;
      if (parent >= 0)
        object.fail(
            "children",
            fmt::format("node {} has two parents, {} and {}", document.label("nodes", child),
                        document.label("nodes", static_cast<std::size_t>(parent)),
                        document.label("nodes", i)));
      parent = static_cast<int>(i);
      children[i].push_back(static_cast<int>(child));
    }
  }
  rig.walk = walk_order(rig.nodes, children);
  if (rig.walk.size() == count) return;
  std::vector<bool> reached(count, false);
  for (const int node : rig.walk) reached[static_cast<std::size_t>(node)] = true;
  const auto lost = static_cast<std::size_t>(
      std::distance(reached.begin(), std::find(reached.begin(), reached.end(), false)));
  document.at("nodes", lost)
      .fail(
          fmt::format("node {} is on or below a cycle of parents", document.label("nodes", lost)));
}

std::vector<std::size_t> choose_skins(const Document& document,
                                      std::span<const std::string> addresses) {
  if (document.count("skins") == 0)
    throw base::InputError("the file has no skin, so nothing in it deforms", document.shown());
  if (addresses.empty() && document.count("skins") > 1)
    document.top().fail("skins", fmt::format("the file has {} skins; name those to read: {}",
                                             document.count("skins"), list_skins(document)));
  std::vector<std::size_t> chosen;
  if (addresses.empty()) chosen.push_back(0);
  for (const std::string& address : addresses) {
    const std::size_t skin = find_skin(document, address);
    if (std::find(chosen.begin(), chosen.end(), skin) != chosen.end())
      document.top().fail("skins",
                          fmt::format("skin {} is named twice", document.label("skins", skin)));
    chosen.push_back(skin);
  }
  return chosen;
}

void read_skins(Document& document, std::span<const std::size_t> chosen, model::Rig& rig) {
  for (const std::size_t index : chosen) {
    const Object object = document.at("skins", index);
    const std::vector<std::size_t> nodes = document.references(object, "joints", "nodes");
    if (nodes.empty())
      object.fail(fmt::format("skin {} has no joints", document.label("skins", index)));
    std::vector<std::size_t> sorted = nodes;
    std::sort(sorted.begin(), sorted.end());
    const auto twice = std::adjacent_find(sorted.begin(), sorted.end());
    if (twice != sorted.end())
      object.fail("joints", fmt::format("node {} is a joint of this skin twice",
                                        document.label("nodes", *twice)));
    if (object.has("skeleton")) document.reference(object, "skeleton", "nodes");

    std::vector<double> binds;
    if (object.has("inverseBindMatrices")) {
      const Accessor accessor =
          open_accessor(document, object, "inverseBindMatrices", {.type = "MAT4", .allowed = kF32});
      if (accessor.count < nodes.size())
        accessor.object.fail("count", fmt::format("{} has {} matrices for {} joints", accessor.what,
                                                  accessor.count, nodes.size()));
      binds = decode_numbers(accessor);
    }
    rig.skins.push_back({.name = object.text("name"),
                         .first_joint = static_cast<model::Index>(rig.joints.size()),
                         .joint_count = static_cast<model::Index>(nodes.size())});
    for (std::size_t j = 0; j < nodes.size(); ++j) {
      model::Joint joint{.node = static_cast<int>(nodes[j]),
                         .skin = static_cast<int>(rig.skins.size() - 1)};
      if (!binds.empty())
        joint.inverse_bind = affine(
            &binds[16 * j], object,
            fmt::format("inverse bind matrix {} (joint {})", j, document.label("nodes", nodes[j])));
      rig.joints.push_back(joint);
    }
  }
}

}  // namespace input::gltf
