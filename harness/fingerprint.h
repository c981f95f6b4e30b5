#pragma once

#include "harness/model/motion.h"
#include "harness/model/result.h"
#include "harness/model/suite.h"

namespace harness {

/// SHA-256 of each group of inputs as decoded from the files, before any arithmetic of ours: a
/// fault in our own evaluation must never look like a change of the asset.
model::Fingerprints rig_fingerprints(const model::Rig& rig);
std::string motion_fingerprint(const model::MotionSpec& spec, const model::Motion& motion,
                               const model::Rig& rig);
std::string method_fingerprint(const model::MethodSpec& method, model::WeightRule weights);

}  // namespace harness
