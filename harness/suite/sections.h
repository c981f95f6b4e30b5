#pragma once

#include "harness/base/json.h"
#include "harness/model/suite.h"

#include <optional>
#include <set>
#include <span>
#include <string>
#include <vector>

namespace suite {

/// "name", "x", ... joined as an error message that says what a name may be; empty when it is fine.
std::string name_fault(const std::string& name);

/// Checks the names of one group of a suite (rigs, motions, methods): form, unique ignoring case.
void check_names(const base::JsonView& group);

std::optional<model::FileRef> file_ref(base::JsonView& object, const std::string& key);

std::vector<model::RigSpec> read_rigs(base::JsonView& root);
std::vector<model::MotionSpec> read_motions(base::JsonView& root);
std::vector<model::MethodSpec> read_methods(base::JsonView& root,
                                            std::span<const model::SkinningSpec> skinnings);

/// Bounds as one place of a suite sets them; null takes a bound away.
struct Bounds {
  std::map<std::string, std::optional<model::LimitBound>> limits;
  std::map<std::string, std::optional<model::DriftBound>> drift;
  std::optional<model::Profile> profile;
};

/// Reads the keys `limits` and `drift` of the suite or of one override.
Bounds read_bounds(base::JsonView& object);

/// Lays `bounds` over what a case has; later ones win.
void apply_bounds(const Bounds& bounds, model::CaseSpec& spec);

}  // namespace suite
