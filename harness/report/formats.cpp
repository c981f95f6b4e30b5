#include "harness/report/formats.h"

namespace report {

const std::vector<Format>& formats() {
  static const std::vector<Format> all = {
#define FORMAT(name) name##_format(),
#include "harness/report/formats.def"
#undef FORMAT
  };
  return all;
}

}  // namespace report
