#include "base/result.h"

namespace coilassay {

std::string_view name(Problem problem) {
  switch (problem) {
    case Problem::usage: return "usage";
    case Problem::unreadable: return "unreadable";
    case Problem::not_a_capture: return "not_a_capture";
    case Problem::damaged: return "damaged";
    case Problem::ambiguous: return "ambiguous";
    case Problem::missing_column: return "missing_column";
    case Problem::bad_number: return "bad_number";
    case Problem::wrong_unit: return "wrong_unit";
    case Problem::bad_sheet: return "bad_sheet";
    case Problem::too_few_samples: return "too_few_samples";
    case Problem::no_signal: return "no_signal";
    case Problem::rank_deficient: return "rank_deficient";
    case Problem::not_converged: return "not_converged";
    case Problem::cannot_write: return "cannot_write";
    case Problem::missing_helper: return "missing_helper";
    case Problem::instrument: return "instrument";
    case Problem::ledger: return "ledger";
    case Problem::interrupted: return "interrupted";
  }
  return "usage";
}

}  // namespace coilassay
