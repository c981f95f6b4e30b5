#include "harness/suite/sections.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cctype>
#include <cmath>

namespace suite {

using base::Json;
using base::JsonView;

namespace {

constexpr double kMostFrames = 1e6;

std::string lower(std::string text) {
  for (char& c : text) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
  return text;
}

base::Problem place(const Json& value, const std::string& pointer) {
  return base::problem_at(value, pointer, "");
}

bool is_device_name(const std::string& name) {
  const std::string stem = lower(name.substr(0, name.find('.')));
  static const std::array<std::string_view, 4> kDevices{"con", "prn", "aux", "nul"};
  if (std::find(kDevices.begin(), kDevices.end(), stem) != kDevices.end()) return true;
  return stem.size() == 4 && (stem.starts_with("com") || stem.starts_with("lpt")) &&
         std::isdigit(static_cast<unsigned char>(stem[3])) != 0;
}

model::RigSpec read_rig(JsonView view, std::string name) {
  model::RigSpec rig;
  rig.name = std::move(name);
  rig.place = place(view.json(), view.pointer());
  rig.file = file_ref(view, "file");
  rig.mesh = file_ref(view, "mesh");
  rig.binding = file_ref(view, "binding");
  rig.skins = view.texts("skins");
  if (rig.file && (rig.mesh || rig.binding))
    view.fail("a rig is either a glTF \"file\" or a \"mesh\" with a \"binding\", not both");
  if (view.is_object() && !rig.file && !rig.mesh)
    view.fail("a rig needs a glTF \"file\", or an OBJ \"mesh\" and its \"binding\"");
  if (!rig.skins.empty() && rig.mesh)
    view.fail("skins", "only a glTF file has skins to choose from");
  if (view.json().find("skins") != nullptr && rig.skins.empty())
    view.fail("skins", "at least one skin must be named; leave the key out for the only one");
  view.close();
  return rig;
}

model::SweepEntrySpec read_sweep_entry(JsonView view) {
  model::SweepEntrySpec entry;
  entry.place = place(view.json(), view.pointer());
  if (const Json* joint = view.required("joint", Json::Kind::String)) entry.joint = joint->string;
  if (view.required("axis", Json::Kind::Array) != nullptr) {
    entry.axis = view.numbers("axis", 3);
    const bool zero =
        std::all_of(entry.axis.begin(), entry.axis.end(), [](double a) { return a == 0; });
    if (!entry.axis.empty() && zero) view.fail("axis", "the axis has length zero");
  }
  if (view.required("degrees", Json::Kind::Array) != nullptr) {
    const std::vector<double> degrees = view.numbers("degrees", 2);
    if (!degrees.empty()) {
      entry.from = degrees[0];
      entry.to = degrees[1];
    }
    for (const double angle : degrees)
      if (std::abs(angle) > 36000)
        view.fail("degrees",
                  fmt::format("angles from -36000 to 36000 were expected, not {}", angle));
  }
  view.close();
  return entry;
}

void read_span(JsonView& view, model::MotionSpec& motion) {
  const Json* span = view.member("span");
  if (span == nullptr) return;
  if (span->kind == Json::Kind::Array) {
    const std::vector<double> ends = view.numbers("span", 2);
    if (ends.empty()) return;
    motion.span = {ends[0], ends[1]};
    if (!(ends[0] <= ends[1])) view.fail("span", "the first time must not be after the second");
  } else if (span->kind == Json::Kind::String && span->string == "keys") {
    motion.span_keys = true;
  } else {
    view.fail("span", "\"keys\" or [from, to] in seconds was expected");
  }
}

model::MotionSpec read_motion(JsonView view, std::string name) {
  using Kind = model::MotionSpec::Kind;
  model::MotionSpec motion;
  motion.name = std::move(name);
  motion.place = place(view.json(), view.pointer());
  motion.tags = view.texts("tags");
  if (view.member("bvh") != nullptr)
    view.fail("bvh", "not in this version: motions from BVH files");

  int kinds = view.json().find("bvh") != nullptr ? 1 : 0;
  if (const Json* sweep = view.member("sweep", Json::Kind::Array)) {
    ++kinds;
    motion.kind = Kind::Sweep;
    const std::string pointer = base::child_pointer(view.pointer(), "sweep");
    for (std::size_t i = 0; i < sweep->items.size(); ++i)
      motion.sweep.push_back(
          read_sweep_entry({sweep->items[i], base::child_pointer(pointer, i), view.problems()}));
    if (sweep->items.empty()) view.fail("sweep", "a sweep needs at least one entry");
  }
  if (const Json* clip = view.member("clip", Json::Kind::String)) {
    ++kinds;
    motion.kind = Kind::Clip;
    motion.clip = clip->string;
    motion.file = file_ref(view, "file");
    read_span(view, motion);
  }
  if (view.member("poses") != nullptr) {
    ++kinds;
    motion.kind = Kind::Poses;
    motion.file = file_ref(view, "poses");
  }
  if (view.json().find("rate") != nullptr) motion.rate = view.number("rate", 24, {1e-3, 1e6});
  view.member("rate");
  if (kinds > 1)
    view.fail(
        "a motion is one of \"sweep\", \"clip\", \"poses\", or \"frames\" alone, not several");
  if (motion.kind == Kind::Sweep || kinds == 0) {
    if (view.is_object() && view.required("frames", Json::Kind::Number) != nullptr)
      motion.frames = static_cast<std::size_t>(view.integer("frames", 1, {1, kMostFrames}));
  }
  view.close();
  return motion;
}

// The value of one parameter, checked; the default when it is not said.
model::Parameter read_parameter(JsonView& view, const model::ParameterSpec& spec) {
  using Kind = model::ParameterSpec::Kind;
  if (spec.required && view.is_object() && view.json().find(spec.name) == nullptr)
    view.fail(fmt::format("the parameter '{}' is missing: {}", spec.name, spec.summary));
  switch (spec.kind) {
    case Kind::Number:
      return view.number(spec.name, spec.fallback, {spec.low, spec.high});
    case Kind::Integer: {
      const auto number =
          view.integer(spec.name, static_cast<std::int64_t>(spec.fallback), {spec.low, spec.high});
      const std::string text = fmt::format("{}", number);
      const bool open = spec.choices.empty();  // every whole number of the range will do
      if (!open && std::find(spec.choices.begin(), spec.choices.end(), text) == spec.choices.end())
        view.fail(spec.name,
                  fmt::format("unknown value {}; known: {}", text, fmt::join(spec.choices, ", ")));
      return static_cast<double>(number);
    }
    case Kind::Text:
      return view.text(spec.name);
    case Kind::File:
      return file_ref(view, spec.name).value_or(model::FileRef{});
    case Kind::Choice:
      break;
  }
  const std::string fallback = spec.choices.empty() ? "" : spec.choices.front();
  // Choices that are numbers, such as a bit depth, are written as numbers.
  const Json* value = view.member(spec.name);
  if (value == nullptr) return fallback;
  const std::string text =
      value->kind == Json::Kind::Number ? fmt::format("{}", value->number) : value->string;
  if (std::find(spec.choices.begin(), spec.choices.end(), text) != spec.choices.end()) return text;
  view.fail(spec.name, fmt::format("unknown value '{}'{}", text, base::hint(text, spec.choices)));
  return fallback;
}

model::MethodSpec read_method(JsonView view, std::string name,
                              std::span<const model::SkinningSpec> skinnings) {
  static const std::array<std::string_view, 4> kLater{"optimized_centers", "delta_mush",
                                                      "direct_delta_mush", "engine"};
  model::MethodSpec method;
  method.name = std::move(name);
  method.place = place(view.json(), view.pointer());
  const Json* skinning = view.required("skinning", Json::Kind::String);
  if (skinning == nullptr) return method;
  method.skinning = skinning->string;
  method.against = view.text("against");
  const auto spec = std::find_if(skinnings.begin(), skinnings.end(),
                                 [&](const auto& s) { return s.name == method.skinning; });
  if (spec == skinnings.end()) {
    std::vector<std::string> names;
    for (const auto& known : skinnings) names.push_back(known.name);
    const bool later = std::find(kLater.begin(), kLater.end(), method.skinning) != kLater.end();
    view.fail("skinning", later ? fmt::format("not in this version: method '{}'", method.skinning)
                                : fmt::format("unknown method '{}'{}", method.skinning,
                                              base::hint(method.skinning, names)));
    return method;
  }
  for (const model::ParameterSpec& parameter : spec->parameters)
    method.parameters[parameter.name] = read_parameter(view, parameter);
  view.close();
  return method;
}

// Calls read(view, name) for each member of a group.
template <typename Read>
void each_member(JsonView& root, const std::string& key, Read read) {
  const Json* group = root.required(key, Json::Kind::Object);
  if (group == nullptr) return;
  const JsonView view = root.child(key, *group);
  check_names(view);
  if (group->members.empty()) view.fail("at least one entry is needed");
  for (const auto& [name, value] : group->members) read(view.child(name, value), name);
}

}  // namespace

std::string name_fault(const std::string& name) {
  const auto plain = [](char c) { return std::isalnum(static_cast<unsigned char>(c)) != 0; };
  const bool form = !name.empty() && name.size() <= 64 && plain(name.front()) &&
                    std::all_of(name.begin(), name.end(), [&](char c) {
                      return plain(c) || c == '.' || c == '_' || c == '-';
                    });
  if (!form)
    return fmt::format(
        "'{}' is no name: 1 to 64 letters, digits, '.', '_', '-', the first a letter or digit",
        name);
  if (name.back() == '.') return fmt::format("the name '{}' ends with a dot", name);
  if (is_device_name(name))
    return fmt::format("the name '{}' is a device on some systems and cannot be a file there",
                       name);
  return {};
}

void check_names(const JsonView& group) {
  std::map<std::string, std::string> seen;
  for (const auto& [name, value] : group.json().members) {
    if (const std::string fault = name_fault(name); !fault.empty()) group.fail(name, fault);
    const auto [other, fresh] = seen.emplace(lower(name), name);
    if (!fresh)
      group.fail(name,
                 fmt::format("the names '{}' and '{}' differ only in case", other->second, name));
  }
}

std::optional<model::FileRef> file_ref(JsonView& object, const std::string& key) {
  const Json* value = object.member(key, Json::Kind::String);
  if (value == nullptr) return std::nullopt;
  return model::FileRef{value->string, value->source->folder,
                        place(*value, base::child_pointer(object.pointer(), key))};
}

std::vector<model::RigSpec> read_rigs(JsonView& root) {
  std::vector<model::RigSpec> rigs;
  if (const Json* rig = root.member("rig", Json::Kind::Object)) {
    if (root.json().find("rigs") != nullptr)
      root.fail("rig",
                "\"rig\" is short for \"rigs\" with one rig called main; use one of the two");
    rigs.push_back(read_rig(root.child("rig", *rig), "main"));
    root.member("rigs");
    return rigs;
  }
  each_member(root, "rigs", [&](JsonView view, const std::string& name) {
    rigs.push_back(read_rig(std::move(view), name));
  });
  return rigs;
}

std::vector<model::MotionSpec> read_motions(JsonView& root) {
  std::vector<model::MotionSpec> motions;
  each_member(root, "motions", [&](JsonView view, const std::string& name) {
    motions.push_back(read_motion(std::move(view), name));
  });
  return motions;
}

std::vector<model::MethodSpec> read_methods(JsonView& root,
                                            std::span<const model::SkinningSpec> skinnings) {
  std::vector<model::MethodSpec> methods;
  each_member(root, "methods", [&](JsonView view, const std::string& name) {
    methods.push_back(read_method(std::move(view), name, skinnings));
  });
  std::vector<std::string> names;
  for (const auto& method : methods) names.push_back(method.name);
  for (const auto& method : methods) {
    if (method.against.empty()) continue;
    base::Problem problem = method.place;
    problem.pointer += "/against";
    if (method.against == method.name)
      problem.message = "a method cannot be compared with itself";
    else if (std::find(names.begin(), names.end(), method.against) == names.end())
      problem.message =
          fmt::format("unknown method '{}'{}", method.against, base::hint(method.against, names));
    if (!problem.message.empty()) root.problems().push_back(std::move(problem));
  }
  return methods;
}

}  // namespace suite
