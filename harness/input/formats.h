#pragma once

#include "harness/input/input.h"

/// What each reader of readers.def says about its format; defined beside the reader.
namespace input {

#define READER(name) Format name##_format();
#include "harness/input/readers.def"
#undef READER

}  // namespace input
