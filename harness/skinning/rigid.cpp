#include "harness/skinning/methods.h"

namespace skinning {
namespace {

Deformer prepare(const Prepared& prepared, const model::MethodSpec& /*method*/) {
  std::vector<metrics::Index> owner(prepared.rest.size(), metrics::kNone);
  for (std::size_t v = 0; v < owner.size(); ++v) {
    const metrics::Index place = heaviest(prepared.influences, v, prepared.joint_rank);
    if (place != metrics::kNone) {
      owner[v] = prepared.influences.joint[prepared.influences.first[v] + place];
    }
  }
  return [rest = prepared.rest, owner](std::size_t /*frame*/, std::span<const Affine> matrices,
                                       model::Points& out) {
    out = rest;
    for (std::size_t v = 0; v < rest.size(); ++v) {
      if (owner[v] != metrics::kNone) out[v] = transform(matrices[owner[v]], rest[v]);
    }
  };
}

}  // namespace

Method rigid() {
  Method method;
  method.spec.name = "rigid";
  method.spec.summary = "each vertex follows its heaviest joint; a vertex without any stays";
  method.spec.source = "common practice, no source";
  method.prepare = prepare;
  return method;
}

}  // namespace skinning
