// What measurements say about one limit: the values whose conditions fit, and why others do not.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <vector>

#include "inspection/verdict.h"

namespace coilassay {

/// An estimate together with the conditions it holds at.
struct EvidenceValue {
  Estimate estimate;
  std::optional<double> u_own;   // part of u that is the unit's alone
  std::string from;              // "measured", "model at 100 kHz"
};

/// Everything there is for one limit from one test, repeat by repeat.
struct Evidence {
  std::string test;
  std::size_t repeats = 0;
  std::vector<EvidenceValue> values;     // comparable: one for each repeat
  std::vector<Bound> bounds;             // only a limit of the value is known
  std::string not_comparable;            // the reason of the first repeat whose value cannot be compared
  std::string missing;                   // the reason of the first repeat that has no value
};

/// Evidence from the measurements of one test (repeats).
Evidence evidence_of(const Limit& limit, const ConditionTolerances& tolerances, const std::string& test,
                     std::span<const TestedUnit* const> repeats);

}  // namespace coilassay
