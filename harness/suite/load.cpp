#include "harness/base/file.h"
#include "harness/suite/sections.h"
#include "harness/suite/suite.h"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <deque>

namespace suite {

namespace fs = std::filesystem;
using base::Json;
using base::JsonView;

namespace {

constexpr std::size_t kMostUses = 32;
constexpr std::size_t kMostCases = 100000;
constexpr std::uintmax_t kLargestSuite = std::uintmax_t{4} << 20;

// The files a suite is made of, and the values read from them.
struct Sources {
  std::deque<base::JsonSource> files;  // values point into them
  std::vector<fs::path> open;          // files whose `use` is being followed: a cycle shows here
  fs::path root;
};

// Lays `over` on `under`: objects key by key, everything else replaced. A null stays as a mark that
// the key was taken away.
void merge(Json& under, Json&& over) {
  if (under.kind != Json::Kind::Object || over.kind != Json::Kind::Object) {
    under = std::move(over);
    return;
  }
  under.offset = over.offset;
  under.source = over.source;
  for (auto& [key, value] : over.members) {
    if (Json* old = under.find(key))
      merge(*old, std::move(value));
    else
      under.members.push_back({key, std::move(value)});
  }
}

// Takes the marks away. Bounds keep theirs: there null removes what is set without being written.
void strip_nulls(Json& value, bool bounds = false) {
  for (Json& item : value.items) strip_nulls(item);
  for (auto& [key, member] : value.members) strip_nulls(member, key == "limits" || key == "drift");
  std::erase_if(value.members, [&](const auto& m) {
    return m.value.kind == Json::Kind::Null && !(bounds && m.key != "profile");
  });
}

Json read_merged(const fs::path& path, const std::string& shown, Sources& sources);

// Everything the file's `use` names, merged in order.
Json read_used(const Json& own, Sources& sources) {
  Json merged;
  merged.kind = Json::Kind::Object;
  const Json* use = own.find("use");
  if (use == nullptr) return merged;
  std::vector<base::Problem> problems;
  JsonView view(own, "", problems);
  const std::vector<std::string> paths = view.texts("use");
  if (!problems.empty()) throw base::InputError(std::move(problems));
  for (std::size_t i = 0; i < paths.size(); ++i) {
    base::Problem place = base::problem_at(use->items[i], base::child_pointer("/use", i), "");
    try {
      const fs::path file = base::path_inside(sources.root, use->source->folder, paths[i]);
      const fs::path shown = fs::path(own.source->file).parent_path() / paths[i];
      merge(merged, read_merged(file, shown.lexically_normal().generic_string(), sources));
    } catch (const base::InputError& error) {
      if (!error.problems().front().file.empty() && error.problems().front().line > 0) throw;
      place.message = fmt::format("{}: {}", paths[i], error.problems().front().message);
      throw base::InputError(place);
    }
  }
  return merged;
}

Json read_merged(const fs::path& path, const std::string& shown, Sources& sources) {
  if (std::find(sources.open.begin(), sources.open.end(), path) != sources.open.end())
    throw base::InputError("uses itself, through what it uses", shown);
  if (sources.files.size() >= kMostUses)
    throw base::InputError(fmt::format("more than {} files are used in all", kMostUses), shown);
  sources.open.push_back(path);
  const base::JsonSource& source =
      sources.files.emplace_back(base::read_json_source(path, shown, kLargestSuite));
  Json own = base::parse_json(source, {.comments = true});
  if (own.kind != Json::Kind::Object)
    throw base::InputError(base::problem_at(own, "", "a suite is a JSON object"));
  const Json* version = own.find("skinfold");
  if (version == nullptr || version->kind != Json::Kind::String || version->string != "suite 1")
    throw base::InputError(
        base::problem_at(version == nullptr ? own : *version, version == nullptr ? "" : "/skinfold",
                         "no suite of this version: \"skinfold\": \"suite 1\" was "
                         "expected"));
  Json merged = read_used(own, sources);
  merge(merged, std::move(own));
  sources.open.pop_back();
  return merged;
}

nlohmann::ordered_json to_library(const Json& value) {
  switch (value.kind) {
    case Json::Kind::Null:
      return nullptr;
    case Json::Kind::Boolean:
      return value.boolean;
    case Json::Kind::Number:
      if (value.integer) return static_cast<std::int64_t>(value.number);
      return value.number;
    case Json::Kind::String:
      return value.string;
    case Json::Kind::Array: {
      auto out = nlohmann::ordered_json::array();
      for (const Json& item : value.items) out.push_back(to_library(item));
      return out;
    }
    case Json::Kind::Object:
      break;
  }
  auto out = nlohmann::ordered_json::object();
  for (const auto& [key, member] : value.members) out[key] = to_library(member);
  return out;
}

struct Override {
  std::string glob;
  Bounds bounds;
  const Json* place = nullptr;
  std::string pointer;
};

std::vector<Override> read_overrides(JsonView& root) {
  std::vector<Override> overrides;
  const Json* array = root.member("overrides", Json::Kind::Array);
  if (array == nullptr) return overrides;
  for (std::size_t i = 0; i < array->items.size(); ++i) {
    const std::string pointer = base::child_pointer("/overrides", i);
    JsonView view(array->items[i], pointer, root.problems());
    const Json* cases = view.required("cases", Json::Kind::String);
    Override each;
    each.bounds = read_bounds(view);
    if (cases != nullptr) {
      each.glob = cases->string;
      each.place = cases;
      each.pointer = pointer + "/cases";
      overrides.push_back(std::move(each));
    }
    view.close();
  }
  return overrides;
}

// One pattern of the suite, and where it stands.
struct Glob {
  std::string text;
  const Json* place = nullptr;
  std::string pointer;
};

// A pattern that fits nothing is a mistake, unless it came from a file shared by several suites.
void check_used(const Glob& glob, const std::vector<std::string>& names, const Json& own,
                std::vector<base::Problem>& problems) {
  const bool fits = std::any_of(names.begin(), names.end(), [&](const std::string& name) {
    return base::glob_match(glob.text, name);
  });
  if (fits || glob.place->source != own.source) return;
  problems.push_back(base::problem_at(
      *glob.place, glob.pointer,
      fmt::format("'{}' fits no case{}", glob.text, base::hint(glob.text, names))));
}

// A case needs joints where its method computes, and a pose where it computes.
void check_case(const model::Suite& suite, const model::CaseSpec& spec,
                const model::MethodSpec& method, std::span<const model::SkinningSpec> skinnings,
                std::vector<base::Problem>& problems) {
  const auto skinning = std::find_if(skinnings.begin(), skinnings.end(),
                                     [&](const auto& s) { return s.name == method.skinning; });
  if (skinning == skinnings.end() || !skinning->computes) return;
  const model::RigSpec& rig = suite.rigs[spec.rig];
  const model::MotionSpec& motion = suite.motions[spec.motion];
  base::Problem problem;
  if (rig.mesh && !rig.binding) {
    problem = rig.place;
    problem.message = fmt::format("the mesh has no \"binding\", which method '{}' needs (case {})",
                                  method.name, spec.name);
  } else if (motion.kind == model::MotionSpec::Kind::Frames) {
    problem = motion.place;
    problem.message = fmt::format(
        "only \"frames\" are given, no pose: method '{}' needs a \"sweep\", a \"clip\" or "
        "\"poses\" "
        "(case {})",
        method.name, spec.name);
  } else {
    return;
  }
  const bool known = std::any_of(problems.begin(), problems.end(), [&](const base::Problem& other) {
    return other.line == problem.line && other.pointer == problem.pointer &&
           other.file == problem.file;
  });
  if (!known) problems.push_back(std::move(problem));
}

void expand_cases(JsonView& root, model::Suite& suite) {
  std::vector<Glob> globs;
  if (const Json* cases = root.member("cases", Json::Kind::Array)) {
    const std::vector<std::string> texts = root.texts("cases");
    for (std::size_t i = 0; i < texts.size(); ++i)
      globs.push_back({texts[i], &cases->items[i], base::child_pointer("/cases", i)});
    if (cases->items.empty())
      root.fail("cases", "no case is named; leave the key out for all of them");
  }
  const Bounds bounds = read_bounds(root);
  const std::vector<Override> overrides = read_overrides(root);

  const std::size_t cases = suite.rigs.size() * suite.motions.size() * suite.methods.size();
  if (cases > kMostCases) {
    root.fail(fmt::format(
        "{} rigs, {} motions and {} methods make {} cases; at most {} are allowed in "
        "one suite",
        suite.rigs.size(), suite.motions.size(), suite.methods.size(), cases, kMostCases));
    return;
  }
  std::vector<std::string> all;
  for (std::size_t r = 0; r < suite.rigs.size(); ++r)
    for (std::size_t m = 0; m < suite.motions.size(); ++m)
      for (std::size_t k = 0; k < suite.methods.size(); ++k) {
        model::CaseSpec spec;
        spec.name = fmt::format("{}/{}/{}", suite.rigs[r].name, suite.motions[m].name,
                                suite.methods[k].name);
        all.push_back(spec.name);
        const bool chosen = globs.empty() || std::any_of(globs.begin(), globs.end(), [&](auto& g) {
                              return base::glob_match(g.text, spec.name);
                            });
        if (!chosen) continue;
        spec.rig = r;
        spec.motion = m;
        spec.method = k;
        apply_bounds(bounds, spec);
        for (const Override& each : overrides)
          if (base::glob_match(each.glob, spec.name)) apply_bounds(each.bounds, spec);
        suite.cases.push_back(std::move(spec));
      }
  std::vector<std::string> chosen;
  for (const auto& spec : suite.cases) chosen.push_back(spec.name);
  for (const Glob& glob : globs) check_used(glob, all, root.json(), root.problems());
  for (const Override& each : overrides)
    check_used({each.glob, each.place, each.pointer}, chosen, root.json(), root.problems());
}

fs::path whole_path(const fs::path& path) {
  std::error_code error;
  const fs::path whole = fs::weakly_canonical(path, error);
  if (error) throw base::InputError("cannot be found: " + error.message(), path.generic_string());
  return whole;
}

void refuse_reserved(JsonView& root) {
  for (const char* key : {"regions", "waivers", "symmetry", "bounds", "units", "up"})
    if (root.member(key) != nullptr) root.fail(key, fmt::format("not in this version: '{}'", key));
  if (const Json* precision = root.member("precision", Json::Kind::String)) {
    const std::vector<std::string> known{"double", "single"};
    if (precision->string == "single")
      root.fail("precision", "not in this version: precision 'single'");
    else if (precision->string != "double")
      root.fail("precision", fmt::format("unknown value '{}'{}", precision->string,
                                         base::hint(precision->string, known)));
  }
}

}  // namespace

fs::path root_folder(const fs::path& suite_file) {
  const fs::path folder = whole_path(suite_file).parent_path();
  std::error_code error;
  for (fs::path at = folder;; at = at.parent_path()) {
    const fs::path mark = at / "skinfold.root";
    if (fs::is_regular_file(mark, error) && fs::file_size(mark, error) == 0) return at;
    if (at == at.parent_path()) break;
  }
  for (fs::path at = folder; at != at.parent_path(); at = at.parent_path())
    if (at.filename() == "suites") return at.parent_path();
  return folder;
}

model::Suite load_suite(const fs::path& path, std::span<const model::SkinningSpec> skinnings) {
  Sources sources;
  sources.root = root_folder(path);
  Json merged = read_merged(whole_path(path), path.generic_string(), sources);
  strip_nulls(merged);

  std::vector<base::Problem> problems;
  JsonView root(merged, "", problems);
  root.member("skinfold");
  root.member("use");
  model::Suite suite;
  suite.file = path.generic_string();
  suite.root = sources.root;
  if (const Json* name = root.required("name", Json::Kind::String)) {
    suite.name = name->string;
    if (const std::string fault = name_fault(suite.name); !fault.empty()) root.fail("name", fault);
  }
  refuse_reserved(root);
  const std::string weights = root.choice("weights", {"as_is", "normalize", "refuse"});
  suite.weights = weights == "normalize" ? model::WeightRule::Normalize
                  : weights == "refuse"  ? model::WeightRule::Refuse
                                         : model::WeightRule::AsIs;
  suite.weld = root.number("weld", 1e-7, {0, 0.1});
  suite.rigs = read_rigs(root);
  suite.motions = read_motions(root);
  suite.methods = read_methods(root, skinnings);
  expand_cases(root, suite);
  for (const model::CaseSpec& spec : suite.cases) {
    const model::MethodSpec& own = suite.methods[spec.method];
    for (const model::MethodSpec& method : suite.methods)
      if (&method == &own || method.name == own.against)
        check_case(suite, spec, method, skinnings, problems);
  }
  root.close();
  if (!problems.empty()) throw base::InputError(std::move(problems));
  std::erase_if(merged.members, [](const auto& member) { return member.key == "use"; });
  suite.resolved = to_library(merged).dump(2) + "\n";
  return suite;
}

}  // namespace suite
