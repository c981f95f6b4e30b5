#pragma once

#include "harness/skinning/skinning.h"

namespace skinning {

// One function per line of methods.def; its specification lists the method's own parameters only.
#define METHOD(name) Method name();
#include "harness/skinning/methods.def"
#undef METHOD

/// The point moved by a matrix, summed from left to right.
inline model::Point transform(const Affine& M, const model::Point& p) {
  return {M(0, 0) * p.x() + M(0, 1) * p.y() + M(0, 2) * p.z() + M(0, 3),
          M(1, 0) * p.x() + M(1, 1) * p.y() + M(1, 2) * p.z() + M(1, 3),
          M(2, 0) * p.x() + M(2, 1) * p.y() + M(2, 2) * p.z() + M(2, 3)};
}

}  // namespace skinning
