#pragma once

#include "harness/judge.h"

#include <string>

/// What judging of limits and of drift have in common: making one check.
namespace harness {

/// A check of a plan in this frame, within and without a value.
model::Check blank_check(const Plan& plan, const FrameEvidence& evidence);

/// Fills in element, vertices and place; nothing for kNone and for domains without elements.
void place_check(model::Check& check, const FrameEvidence& evidence, std::size_t element);

/// Sets `used`, or `over` where it is no finite number.
void set_used(model::Check& check, double used);

/// The check as beyond, for a reason that no number says.
model::Check undefined_check(model::Check check, std::string reason);

}  // namespace harness
