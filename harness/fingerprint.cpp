#include "harness/fingerprint.h"

#include "harness/base/sha256.h"

namespace harness {

using base::Sha256;

namespace {

void add(Sha256& hash, const Eigen::Vector3d& v) {
  for (int i = 0; i < 3; ++i) hash.add(v[i]);
}

void add(Sha256& hash, const Eigen::Vector4d& v) {
  for (int i = 0; i < 4; ++i) hash.add(v[i]);
}

void add(Sha256& hash, const Eigen::Matrix4d& M) {
  for (int row = 0; row < 4; ++row)
    for (int column = 0; column < 4; ++column) hash.add(M(row, column));
}

void add(Sha256& hash, std::size_t count) {
  hash.add(static_cast<std::uint64_t>(count));
}

std::string positions(const model::Rig& rig) {
  Sha256 hash;
  add(hash, rig.positions.size());
  for (const auto& point : rig.positions) add(hash, point);
  for (const auto& morph : rig.morphs) {
    add(hash, std::size_t{morph.first_vertex});
    hash.add(morph.weight);
    add(hash, morph.deltas.size());
    for (const auto& delta : morph.deltas) add(hash, delta);
  }
  return hash.hex();
}

std::string faces(const model::Rig& rig) {
  Sha256 hash;
  add(hash, rig.faces.size());
  for (const auto& face : rig.faces)
    for (const auto corner : face) add(hash, std::size_t{corner});
  add(hash, rig.diagonals.size());
  for (const auto& diagonal : rig.diagonals)
    for (const auto end : diagonal) add(hash, std::size_t{end});
  return hash.hex();
}

std::string weights(const model::Rig& rig) {
  Sha256 hash;
  const model::Influences& all = rig.influences;
  for (const auto first : all.first) add(hash, std::size_t{first});
  for (std::size_t i = 0; i < all.joint.size(); ++i) {
    add(hash, std::size_t{all.joint[i]});
    hash.add(all.weight[i]);
  }
  return hash.hex();
}

// Joints and their ancestors, in the order of the joints, by name and place in the tree: how a file
// numbers its nodes does not matter.
std::string joints(const model::Rig& rig) {
  Sha256 hash;
  add(hash, rig.joints.size());
  for (const model::Joint& joint : rig.joints) {
    hash.add(model::node_path(rig, joint.node));
    for (int at = joint.node; at >= 0; at = rig.nodes[static_cast<std::size_t>(at)].parent) {
      const model::Node& node = rig.nodes[static_cast<std::size_t>(at)];
      hash.add(node.name);
      if (!rig.file_binds.empty()) continue;
      if (node.matrix) {
        add(hash, *node.matrix);
      } else {
        add(hash, node.local.translation);
        add(hash, node.local.rotation);
        add(hash, node.local.scale);
      }
    }
  }
  return hash.hex();
}

std::string bind(const model::Rig& rig) {
  Sha256 hash;
  for (const Eigen::Matrix4d& bind : rig.file_binds) add(hash, bind);
  if (rig.file_binds.empty())
    for (const model::Joint& joint : rig.joints) add(hash, joint.inverse_bind);
  return hash.hex();
}

struct PoseHash {
  Sha256& hash;
  const model::Rig& rig;

  void name(int node) const { hash.add(model::node_path(rig, node)); }

  void operator()(const model::NoPose&) const { hash.add("none"); }
  void operator()(const model::Sweep&) const { hash.add("sweep"); }  // the suite's own words follow
  void operator()(const model::Play& play) const {
    hash.add("play");
    for (const model::Track& track : play.tracks) {
      name(track.node);
      add(hash, static_cast<std::size_t>(track.channel));
      add(hash, static_cast<std::size_t>(track.interpolation));
      add(hash, track.times.size());
      for (const double time : track.times) hash.add(time);
      for (const auto& value : track.values) add(hash, value);
    }
  }
  void operator()(const model::PoseList& list) const {
    hash.add("poses");
    for (const auto& frame : list.frames) {
      add(hash, frame.size());
      for (const auto& change : frame) {
        name(change.node);
        hash.add(change.rotate ? "rotate" : "");
        if (change.rotate) add(hash, *change.rotate);
        hash.add(change.move ? "move" : "");
        if (change.move) add(hash, *change.move);
        hash.add(change.scale ? "scale" : "");
        if (change.scale) add(hash, *change.scale);
      }
    }
  }
  void operator()(const model::MatrixList& list) const {
    hash.add("matrices");
    for (const auto& frame : list.frames)
      for (const auto& matrix : frame) add(hash, matrix);
  }
};

}  // namespace

model::Fingerprints rig_fingerprints(const model::Rig& rig) {
  model::Fingerprints prints{{"positions", positions(rig)}, {"faces", faces(rig)}};
  if (rig.has_skin()) {
    prints["weights"] = weights(rig);
    prints["joints"] = joints(rig);
    prints["bind"] = bind(rig);
  }
  return prints;
}

std::string motion_fingerprint(const model::MotionSpec& spec, const model::Motion& motion,
                               const model::Rig& rig) {
  Sha256 hash;
  std::visit(PoseHash{hash, rig}, motion.pose);
  const auto* sweep = std::get_if<model::Sweep>(&motion.pose);
  for (std::size_t i = 0; i < spec.sweep.size(); ++i) {
    const model::SweepEntrySpec& entry = spec.sweep[i];
    if (sweep != nullptr) hash.add(model::node_path(rig, sweep->entries[i].node));
    for (const double component : entry.axis) hash.add(component);
    hash.add(entry.from);
    hash.add(entry.to);
  }
  add(hash, spec.frames);
  hash.add(spec.rate.value_or(0));
  hash.add(spec.span_keys ? "keys" : "");
  if (spec.span) {
    hash.add(spec.span->first);
    hash.add(spec.span->second);
  }
  return hash.hex();
}

std::string method_fingerprint(const model::MethodSpec& method, model::WeightRule weights) {
  Sha256 hash;
  hash.add(method.skinning);
  for (const auto& [key, value] : method.parameters) {
    hash.add(key);
    if (const auto* number = std::get_if<double>(&value)) hash.add(*number);
    if (const auto* text = std::get_if<std::string>(&value)) hash.add(*text);
    if (const auto* file = std::get_if<model::FileRef>(&value)) hash.add(file->path);
  }
  hash.add(method.against);
  add(hash, static_cast<std::size_t>(weights));
  return hash.hex();
}

}  // namespace harness
