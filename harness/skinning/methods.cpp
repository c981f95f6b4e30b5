#include "harness/skinning/methods.h"

#include <algorithm>
#include <cassert>

namespace skinning {
namespace {

/// Parameters of every method that computes; they act on the weights before the method sees them.
std::vector<model::ParameterSpec> common_parameters() {
  model::ParameterSpec keep;
  keep.kind = model::ParameterSpec::Kind::Integer;
  keep.name = "keep_influences";
  keep.summary =
      "keep the heaviest influences of a vertex and scale them to the sum it had; 0: all";
  keep.high = 1000;

  model::ParameterSpec bits;
  bits.kind = model::ParameterSpec::Kind::Integer;
  bits.name = "weight_bits";
  bits.summary = "round weights to that many bits, the sum of a vertex kept; 0: as they are";
  bits.high = 16;
  bits.choices = {"0", "8", "16"};
  return {keep, bits};
}

std::vector<Method> all_methods() {
  std::vector<Method> all = {
#define METHOD(name) name(),
#include "harness/skinning/methods.def"
#undef METHOD
  };
  const std::vector<model::ParameterSpec> common = common_parameters();
  for (Method& method : all) {
    std::vector<model::ParameterSpec>& own = method.spec.parameters;
    if (method.spec.computes) own.insert(own.end(), common.begin(), common.end());
  }
  return all;
}

}  // namespace

const std::vector<Method>& methods() {
  static const std::vector<Method> all = all_methods();
  return all;
}

const Method& find_method(const std::string& name) {
  const auto found = std::find_if(methods().begin(), methods().end(),
                                  [&](const Method& method) { return method.spec.name == name; });
  assert(found != methods().end());
  return *found;
}

std::vector<model::SkinningSpec> specs() {
  std::vector<model::SkinningSpec> all;
  for (const Method& method : methods()) all.push_back(method.spec);
  return all;
}

}  // namespace skinning
