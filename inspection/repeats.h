// Several values of the same quantity of the same unit as one.
#pragma once

#include <span>

#include "inspection/evidence.h"
#include "inspection/verdict.h"

namespace coilassay {

/// Mean of repeats. What is common (standards, gains) does not average out; the unit's own part becomes that of the mean:
/// the larger of what the budgets say and what the scatter shows, the latter with the t factor of its few degrees of
/// freedom (docs/formulas.md#repeats). Needs at least one value.
EvidenceValue mean_of_repeats(std::span<const EvidenceValue> repeats);

/// A limit judged again from another value of its quantity, which holds the gauge's part already.
LimitVerdict judge_again(const LimitVerdict& before, const EvidenceValue& mean, const PartSheet& sheet);

}  // namespace coilassay
