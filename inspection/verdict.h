// From measured quantities to verdicts: decision rules of JCGM 106 and ISO 14253-1, never blind to conditions.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "analysis/measurement.h"
#include "base/finding.h"
#include "inspection/part_sheet.h"

namespace coilassay {

enum class Verdict { pass, fail, undecided, not_comparable };
std::string_view name(Verdict verdict);

/// What a limit says of one unit. What is not known is absent: no value, no probability.
struct LimitVerdict {
  std::string quantity;               // symbol
  Unit unit = Unit::one;
  std::string test;                   // name of the test it was judged from; empty when there was none
  LimitConditions at;                 // as the limit states them
  std::optional<double> value, u, U;  // U: half-width of the 95 % interval, the larger half
  std::optional<double> low, high;    // the interval
  std::optional<double> u_own;        // part of u that is this unit's alone (scatter, reading); the rest is common to the lot
  std::optional<double> min, max;     // the limit
  std::optional<double> guard;        // g, in the unit of the quantity; 0 under the simple rule
  std::optional<double> p_conform;    // probability that the unit conforms, given its value
  std::optional<double> capability;   // C_m = tolerance/(2 U) (JCGM 106, 7.6.3); of two-sided limits
  Verdict verdict = Verdict::undecided;
  std::string why;                    // one sentence
  std::string from;                   // "measured", "model at 100 kHz", "bound", "mean of 3"
};

struct UnitVerdict {
  std::string serial;
  std::uint64_t attempt = 1;
  Verdict verdict = Verdict::undecided;
  std::vector<LimitVerdict> limits;   // in the order of the sheet
  std::vector<Finding> findings;
};

/// A measurement and the test of the sheet it belongs to. A reading of an instrument is a Measurement with test "reading".
struct TestedUnit {
  std::string test;          // name of the [test.NAME]; for a sheet without sections the kind
  Measurement measurement;   // a refused one too: its findings say why there is no value
};

/// Judges one limit from all that was measured of a unit. Several measurements of one test are repeats: judged by their
/// mean. Where several tests fit, the first that is comparable and has a value counts, in the order given.
LimitVerdict judge_limit(const Limit& limit, const PartSheet& sheet, std::span<const TestedUnit> measured);

/// All limits: fail as soon as one fails, else not_comparable, else undecided, else pass. Raises not_comparable and
/// guard_band_too_wide, each once per limit.
UnitVerdict judge_unit(const PartSheet& sheet, const std::string& serial, std::uint64_t attempt,
                       std::span<const TestedUnit> measured);

/// The verdict of several limits together.
Verdict combined(std::span<const LimitVerdict> limits);

/// What stands for a unit after several attempts (docs/formulas.md#retests): policy `first` takes the first attempt in
/// which every limit had a comparable value, `mean` judges the mean of all such attempts again. Attempts beyond the
/// policy's number are kept and not counted; finding retest_limit says so. `attempts` in order, at least one.
struct StandingVerdict {
  UnitVerdict verdict;               // attempt: the one it rests on, or the last one of a mean
  std::uint64_t counted = 0, made = 0;
};
StandingVerdict standing(const PartSheet& sheet, std::span<const UnitVerdict> attempts);

/// "passes only what lies at least g inside ...": the rule and which risk it limits, for reports.
std::string rule_in_words(const Decision& decision);

}  // namespace coilassay
