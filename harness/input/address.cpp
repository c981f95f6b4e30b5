#include "harness/input/clip.h"
#include "harness/input/input.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <string_view>
#include <utility>

namespace input {

namespace {

constexpr std::size_t kMostListed = 8;

enum class Fit { None, End, Whole };

// Whether `address` is the path of a node from the root, or the end of it. Names may hold '/'.
Fit path_fit(const model::Rig& rig, int node, std::string_view address) {
  for (int at = node; at >= 0;) {
    const model::Node& here = rig.nodes[static_cast<std::size_t>(at)];
    const std::string label = here.name.empty() ? fmt::format("#{}", at) : here.name;
    if (!address.ends_with(label)) return Fit::None;
    address.remove_suffix(label.size());
    at = here.parent;
    if (address.empty()) return at < 0 ? Fit::Whole : Fit::End;
    if (!address.ends_with('/')) return Fit::None;
    address.remove_suffix(1);
  }
  return Fit::None;
}

// Nodes among `candidates` that the address means by name, else by path, else by the end of a path.
std::vector<int> matches(const model::Rig& rig, const std::vector<int>& candidates,
                         const std::string& address) {
  std::vector<int> named;
  std::vector<int> whole;
  std::vector<int> end;
  for (const int node : candidates) {
    if (rig.nodes[static_cast<std::size_t>(node)].name == address) named.push_back(node);
    const Fit fit = path_fit(rig, node, address);
    if (fit == Fit::Whole) whole.push_back(node);
    if (fit == Fit::End) end.push_back(node);
  }
  if (!named.empty()) return named;
  return whole.empty() ? end : whole;
}

[[noreturn]] void fail(base::Problem place, std::string message) {
  place.message = std::move(message);
  throw base::InputError(std::move(place));
}

std::string listed(const model::Rig& rig, const std::vector<int>& nodes) {
  std::string text;
  for (std::size_t i = 0; i < std::min(nodes.size(), kMostListed); ++i) {
    text +=
        fmt::format("{}{} (#{})", i == 0 ? "" : ", ", model::node_path(rig, nodes[i]), nodes[i]);
  }
  return nodes.size() > kMostListed ? text + fmt::format(" and {} more", nodes.size() - kMostListed)
                                    : text;
}

// Joints of the rig's skins and the nodes above them, by index.
std::vector<int> nodes_that_move(const model::Rig& rig) {
  const std::vector<bool> carries = carries_joint(rig);
  std::vector<int> nodes;
  for (std::size_t i = 0; i < carries.size(); ++i)
    if (carries[i]) nodes.push_back(static_cast<int>(i));
  return nodes;
}

std::vector<std::string> names_of(const model::Rig& rig, const std::vector<int>& nodes) {
  std::vector<std::string> names;
  for (const int node : nodes) {
    const std::string& name = rig.nodes[static_cast<std::size_t>(node)].name;
    if (!name.empty()) names.push_back(name);
  }
  return names;
}

}  // namespace

std::vector<bool> carries_joint(const model::Rig& rig) {
  std::vector<bool> carries(rig.nodes.size(), false);
  for (const model::Joint& joint : rig.joints) {
    for (int at = joint.node; at >= 0 && !carries[static_cast<std::size_t>(at)];
         at = rig.nodes[static_cast<std::size_t>(at)].parent) {
      carries[static_cast<std::size_t>(at)] = true;
    }
  }
  return carries;
}

int find_joint(const model::Rig& rig, const std::string& address, const base::Problem& place) {
  if (rig.nodes.empty())
    fail(place,
         fmt::format("'{}' names a joint, and {} is a mesh without a skeleton; give the rig a "
                     "'binding'",
                     address, rig.file));
  if (address.starts_with('#')) {
    std::size_t index = 0;
    const char* const end = address.data() + address.size();
    const auto [stop, error] = std::from_chars(address.data() + 1, end, index);
    if (stop == end && error == std::errc{} && index < rig.nodes.size()) {
      const std::vector<int> movers = nodes_that_move(rig);
      if (std::find(movers.begin(), movers.end(), static_cast<int>(index)) == movers.end())
        fail(place, fmt::format("{} '{}' is no joint of the skin, nor above one: moving it would "
                                "change nothing",
                                address, model::node_path(rig, static_cast<int>(index))));
      return static_cast<int>(index);
    }
    if (stop == end)
      fail(place, fmt::format("there is no joint {}; {} has {} nodes, #0 to #{}", address, rig.file,
                              rig.nodes.size(), rig.nodes.size() - 1));
  }
  std::vector<int> joints;
  for (const model::Joint& joint : rig.joints) joints.push_back(joint.node);
  std::sort(joints.begin(), joints.end());
  joints.erase(std::unique(joints.begin(), joints.end()), joints.end());
  std::vector<int> nodes = nodes_that_move(rig);

  for (const std::vector<int>* candidates : {&joints, &nodes}) {
    if (address.empty()) break;
    const std::vector<int> found = matches(rig, *candidates, address);
    if (found.size() == 1) return found.front();
    if (found.size() > 1)
      fail(place,
           fmt::format("'{}' occurs {} times in {}: {}; write the path or the # and the index",
                       address, found.size(), rig.file, listed(rig, found)));
  }
  const std::vector<std::string> known = names_of(rig, joints.empty() ? nodes : joints);
  fail(place, fmt::format("no joint is named '{}' in {}{}", address, rig.file,
                          base::hint(address, known)));
}

}  // namespace input
