// The four decision rules on one limit (docs/formulas.md#rules).
#pragma once

#include <optional>

#include "inspection/part_sheet.h"
#include "inspection/value_law.h"
#include "inspection/verdict.h"

namespace coilassay {

struct RuleOutcome {
  Verdict verdict = Verdict::undecided;
  double guard = 0;              // g at the limit nearest to the value
  double p_conform = 0;
  double p_below = 0, p_above = 0;  // of min, of max
  bool nothing_can_pass = false; // the interval leaves no room between two limits
};

RuleOutcome apply_rule(const Decision& decision, const ValueLaw& law, std::optional<double> min, std::optional<double> max);

}  // namespace coilassay
