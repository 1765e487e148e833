#include "base/finding.h"

namespace coilassay {

std::string_view name(Severity severity) {
  switch (severity) {
    case Severity::note: return "note";
    case Severity::caution: return "caution";
    case Severity::refusal: return "refusal";
  }
  return "note";
}

}  // namespace coilassay
