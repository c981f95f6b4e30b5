#include "harness/input/gltf_accessors.h"
#include "harness/input/gltf_parts.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <numeric>
#include <optional>

namespace input::gltf {

namespace {

using model::Index;

constexpr Use kPosition{.type = "VEC3", .allowed = kF32, .vertex = true};
constexpr Use kJoints{.type = "VEC4", .allowed = kU8 | kU16, .vertex = true};
constexpr Use kWeights{.type = "VEC4", .allowed = kF32 | kUnormU8 | kUnormU16, .vertex = true};
constexpr Use kCorners{.type = "SCALAR", .allowed = kU8 | kU16 | kU32};

// Values of "mode" in the file.
constexpr std::size_t kTriangles = 4;
constexpr std::size_t kStrip = 5;
constexpr std::size_t kFan = 6;

struct Tally {
  std::size_t count = 0;
  std::string first;

  void add(const std::string& name) {
    if (count++ == 0) first = name;
  }
};

// Number of sets "PREFIX0", "PREFIX1", ...; none may be missing.
std::size_t set_count(const Object& attributes, std::string_view prefix) {
  std::vector<bool> present(attributes.json().members.size(), false);
  std::size_t count = 0;
  for (const auto& [name, value] : attributes.json().members) {
    if (!name.starts_with(prefix)) continue;
    std::size_t set = 0;
    const char* const end = name.data() + name.size();
    const auto [rest, error] = std::from_chars(name.data() + prefix.size(), end, set);
    if (error != std::errc{} || rest != end || name != fmt::format("{}{}", prefix, set))
      attributes.fail(name, fmt::format("'{}' does not end in the number of a set", name));
    if (set < present.size()) present[set] = true;
    ++count;
  }
  for (std::size_t set = 0; set < count; ++set)
    if (!present[set])
      attributes.fail(
          fmt::format("'{}{}' is missing: sets are numbered from 0 without gaps", prefix, set));
  return count;
}

// Every attribute has an element for every vertex, those that are not read here too.
void check_counts(const Document& document, const Object& attributes, std::size_t vertices) {
  for (const auto& [name, value] : attributes.json().members) {
    const std::size_t index = document.reference(attributes, name, "accessors");
    const std::size_t count = document.at("accessors", index).whole("count");
    if (count != vertices)
      attributes.fail(name, fmt::format("accessor #{} ({}) has {} elements for {} positions", index,
                                        name, count, vertices));
  }
}

void append_positions(const Accessor& accessor, model::Points& points) {
  const std::vector<double> numbers = decode_numbers(accessor);
  points.reserve(points.size() + accessor.count);
  for (std::size_t i = 0; i < numbers.size(); i += 3)
    points.emplace_back(numbers[i], numbers[i + 1], numbers[i + 2]);
}

struct Set {
  std::vector<Index> joints;
  std::vector<double> weights;
};

Set read_set(Document& document, const Object& attributes, std::size_t set,
             const model::Skin& skin) {
  const Accessor joints =
      open_accessor(document, attributes, fmt::format("JOINTS_{}", set), kJoints);
  const Accessor weights =
      open_accessor(document, attributes, fmt::format("WEIGHTS_{}", set), kWeights);
  Set out{decode_indices(joints), decode_numbers(weights)};
  for (std::size_t i = 0; i < out.joints.size(); ++i)
    if (out.joints[i] >= skin.joint_count)
      joints.object.fail(
          fmt::format("{}: component {} of element {} is joint {}, and the skin "
                      "has {} joints",
                      joints.what, i % 4, i / 4, out.joints[i], skin.joint_count));
  return out;
}

void append_influences(Document& document, const Object& attributes, std::size_t vertices,
                       const model::Skin& skin, model::Influences& influences) {
  const std::size_t count = set_count(attributes, "JOINTS_");
  if (const std::size_t weights = set_count(attributes, "WEIGHTS_"); weights != count)
    attributes.fail(
        fmt::format("{} sets of joints and {} sets of weights do not match", count, weights));
  if (count == 0) attributes.fail("a primitive of a node with a skin needs JOINTS_0 and WEIGHTS_0");
  std::vector<Set> sets;
  for (std::size_t set = 0; set < count; ++set)
    sets.push_back(read_set(document, attributes, set, skin));
  for (std::size_t v = 0; v < vertices; ++v) {
    for (const Set& set : sets)
      for (std::size_t c = 4 * v; c < 4 * v + 4; ++c) {
        if (set.weights[c] == 0) continue;
        influences.joint.push_back(skin.first_joint + set.joints[c]);
        influences.weight.push_back(set.weights[c]);
      }
    influences.first.push_back(static_cast<Index>(influences.joint.size()));
  }
}

std::vector<Index> read_corners(Document& document, const Object& primitive, std::size_t vertices) {
  std::vector<Index> corners;
  if (!primitive.has("indices")) {
    corners.resize(vertices);
    std::iota(corners.begin(), corners.end(), Index{0});
    return corners;
  }
  const Accessor accessor = open_accessor(document, primitive, "indices", kCorners);
  corners = decode_indices(accessor);
  for (std::size_t i = 0; i < corners.size(); ++i)
    if (corners[i] >= vertices)
      accessor.object.fail(fmt::format("{}: element {} is vertex {}, and the primitive has {}",
                                       accessor.what, i, corners[i], vertices));
  // The largest value of the type would restart a strip on some hardware; glTF forbids it.
  const Index restart = accessor.storage == kU8    ? 0xFF
                        : accessor.storage == kU16 ? 0xFFFF
                                                   : 0xFFFFFFFF;
  const auto found = std::find(corners.begin(), corners.end(), restart);
  if (found != corners.end())
    accessor.object.fail(
        fmt::format("{}: element {} is {}, the largest value of its type, which "
                    "glTF forbids",
                    accessor.what, found - corners.begin(), restart));
  return corners;
}

void append_faces(const Object& primitive, std::size_t mode, const std::vector<Index>& corners,
                  Index base, std::vector<model::Face>& faces) {
  const std::size_t count = corners.size();
  if (mode == kTriangles ? count % 3 != 0 : count < 3)
    primitive.fail(
        fmt::format("{} corners do not make {}", count,
                    mode == kTriangles ? "triangles: 3 each" : "a strip or fan: 3 at least"));
  const auto add = [&](std::size_t a, std::size_t b, std::size_t c) {
    faces.push_back({base + corners[a], base + corners[b], base + corners[c]});
  };
  if (mode == kTriangles)
    for (std::size_t i = 0; i < count; i += 3) add(i, i + 1, i + 2);
  if (mode == kStrip)
    for (std::size_t i = 0; i + 2 < count; ++i) add(i, i + 1 + i % 2, i + 2 - i % 2);
  if (mode == kFan)
    for (std::size_t i = 0; i + 2 < count; ++i) add(i + 1, i + 2, 0);
}

void append_morphs(Document& document, const Object& primitive, const std::vector<double>& weights,
                   Index first, std::size_t vertices, std::vector<model::MorphTarget>& morphs) {
  const std::vector<Object> targets = primitive.children("targets");
  if (!weights.empty() && weights.size() != targets.size())
    primitive.fail(fmt::format("{} morph targets and {} default weights do not match",
                               targets.size(), weights.size()));
  for (std::size_t t = 0; t < targets.size(); ++t) {
    check_counts(document, targets[t], vertices);
    if (!targets[t].has("POSITION")) continue;
    model::MorphTarget morph{.first_vertex = first, .deltas = {}};
    if (!weights.empty()) morph.weight = weights[t];
    append_positions(open_accessor(document, targets[t], "POSITION", kPosition), morph.deltas);
    morphs.push_back(std::move(morph));
  }
}

void read_primitive(Document& document, const Object& primitive, std::size_t mode,
                    const std::vector<double>& weights, Index skin, model::Rig& rig) {
  const Object attributes = primitive.child("attributes");
  const auto first = static_cast<Index>(rig.positions.size());
  if (!attributes.has("POSITION")) attributes.fail("POSITION is missing");
  const Accessor position = open_accessor(document, attributes, "POSITION", kPosition);
  check_counts(document, attributes, position.count);
  append_positions(position, rig.positions);
  rig.vertex_skin.resize(rig.positions.size(), skin);
  append_influences(document, attributes, position.count, rig.skins[skin], rig.influences);
  append_faces(primitive, mode, read_corners(document, primitive, position.count), first,
               rig.faces);
  append_morphs(document, primitive, weights, first, position.count, rig.morphs);
}

void read_mesh(Document& document, const Object& node, Index skin, model::Rig& rig,
               Tally& skipped) {
  const Object mesh = document.at("meshes", document.reference(node, "mesh", "meshes"));
  const std::vector<Object> primitives = mesh.children("primitives");
  if (primitives.empty()) mesh.fail("a mesh has at least one primitive");
  const std::vector<double> weights = (node.has("weights") ? node : mesh).numbers("weights");
  for (const Object& primitive : primitives) {
    const std::size_t mode = primitive.whole_or("mode", kTriangles);
    if (mode > kFan)
      primitive.fail("mode", fmt::format("{} is no mode; they go from 0 to 6", mode));
    if (primitive.children("targets").size() != primitives.front().children("targets").size())
      primitive.fail("the primitives of a mesh must have the same number of morph targets");
    if (mode < kTriangles)
      skipped.add(primitive.pointer());
    else
      read_primitive(document, primitive, mode, weights, skin, rig);
  }
}

bool is_moved(const model::Node& node) {
  const model::Transform rest;
  const model::Transform& local = node.local;
  return (node.matrix && *node.matrix != Eigen::Matrix4d::Identity()) ||
         local.translation != rest.translation || local.rotation != rest.rotation ||
         local.scale != rest.scale;
}

// Meshes without a skin that hang on a joint move with it, but do not deform.
Tally rigid_meshes(const Document& document, const model::Rig& rig) {
  std::vector<bool> below(rig.nodes.size(), false);
  for (const model::Joint& joint : rig.joints) below[static_cast<std::size_t>(joint.node)] = true;
  for (const int node : rig.walk) {
    const int parent = rig.nodes[static_cast<std::size_t>(node)].parent;
    if (parent >= 0 && below[static_cast<std::size_t>(parent)])
      below[static_cast<std::size_t>(node)] = true;
  }
  Tally tally;
  for (std::size_t i = 0; i < rig.nodes.size(); ++i) {
    const Object node = document.at("nodes", i);
    if (below[i] && node.has("mesh") && !node.has("skin")) tally.add(document.label("nodes", i));
  }
  return tally;
}

}  // namespace

void read_meshes(Document& document, std::span<const std::size_t> chosen, model::Rig& rig) {
  Tally moved;
  Tally skipped;
  std::vector<bool> carried(chosen.size(), false);
  rig.influences.first.push_back(0);
  for (std::size_t i = 0; i < rig.nodes.size(); ++i) {
    const Object node = document.at("nodes", i);
    if (!node.has("skin")) continue;
    const auto found = std::find(chosen.begin(), chosen.end(), node.whole("skin"));
    if (found == chosen.end()) continue;
    const auto skin = static_cast<std::size_t>(found - chosen.begin());
    const std::size_t faces = rig.faces.size();
    read_mesh(document, node, static_cast<Index>(skin), rig, skipped);
    if (rig.faces.size() > faces) carried[skin] = true;
    if (is_moved(rig.nodes[i])) moved.add(document.label("nodes", i));
  }
  for (std::size_t s = 0; s < chosen.size(); ++s)
    if (!carried[s])
      document.at("skins", chosen[s])
          .fail(fmt::format("no node carries skin {} with a mesh of triangles",
                            document.label("skins", chosen[s])));
  if (moved.count > 0)
    rig.notes.push_back(
        fmt::format("glTF ignores the own transform of a skinned mesh; it is not "
                    "the identity at {} nodes, first {}",
                    moved.count, moved.first));
  if (skipped.count > 0)
    rig.notes.push_back(fmt::format("{} primitives of points or lines are left out, first {}",
                                    skipped.count, skipped.first));
  if (const Tally rigid = rigid_meshes(document, rig); rigid.count > 0)
    rig.notes.push_back(
        fmt::format("{} rigid meshes on joints are left out, first {}", rigid.count, rigid.first));
}

}  // namespace input::gltf
