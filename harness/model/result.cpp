#include "harness/model/result.h"

namespace model {

std::string verdict_name(Verdict verdict) {
  switch (verdict) {
    case Verdict::Within:
      return "within";
    case Verdict::Waived:
      return "waived";
    case Verdict::Unsigned:
      return "unsigned";
    case Verdict::Beyond:
      return "beyond";
    case Verdict::Broken:
      break;
  }
  return "broken";
}

}  // namespace model
