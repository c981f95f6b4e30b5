#include "harness/input/formats.h"

namespace input {

std::vector<Format> formats() {
  return {
#define READER(name) name##_format(),
#include "harness/input/readers.def"
#undef READER
  };
}

}  // namespace input
