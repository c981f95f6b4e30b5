#include "harness/skinning/methods.h"

namespace skinning {
namespace {

Deformer prepare(const Prepared& prepared, const model::MethodSpec& /*method*/) {
  return [rest = prepared.rest, influences = prepared.influences](
             std::size_t /*frame*/, std::span<const Affine> matrices, model::Points& out) {
    out = rest;
    for (std::size_t v = 0; v < rest.size(); ++v) {
      const std::size_t begin = influences.first[v];
      const std::size_t end = influences.first[v + 1];
      if (begin == end) continue;
      out[v].setZero();
      for (std::size_t i = begin; i < end; ++i) {
        out[v] += influences.weight[i] * transform(matrices[influences.joint[i]], rest[v]);
      }
    }
  };
}

}  // namespace

Method linear_blend() {
  Method method;
  method.spec.name = "linear_blend";
  method.spec.summary =
      "weighted sum of where each joint takes the vertex; weights are not normalized";
  method.spec.source =
      "Magnenat-Thalmann, Laperriere, Thalmann, Joint-dependent local deformations for hand "
      "animation and object grasping, Graphics Interface 1988";
  method.prepare = prepare;
  return method;
}

}  // namespace skinning
