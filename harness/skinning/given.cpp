#include "harness/skinning/methods.h"

#include <cassert>

namespace skinning {
namespace {

Deformer prepare(const Prepared& prepared, const model::MethodSpec& /*method*/) {
  assert(prepared.given);
  return [given = *prepared.given](std::size_t frame, std::span<const Affine> /*matrices*/,
                                   model::Points& out) { given.read(frame, out); };
}

}  // namespace

Method given() {
  model::ParameterSpec frames;
  frames.kind = model::ParameterSpec::Kind::File;
  frames.name = "frames";
  frames.summary =
      ".npy of positions (frames, vertices, 3) in model space; {rig} and {motion} are filled in";
  frames.required = true;

  Method method;
  method.spec.name = "given";
  method.spec.summary = "takes the positions that an engine computed";
  method.spec.source = "none: nothing is computed";
  method.spec.parameters = {frames};
  method.spec.computes = false;
  method.prepare = prepare;
  return method;
}

}  // namespace skinning
