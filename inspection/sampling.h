// How many units of a lot are measured, which ones, and what their verdicts say of the lot.
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/result.h"
#include "base/utc_time.h"
#include "inspection/part_sheet.h"
#include "inspection/verdict.h"

namespace coilassay {

struct SamplingPlan {
  SamplingScheme scheme = SamplingScheme::all;
  std::uint64_t lot_size = 0;
  std::uint64_t n = 0;                    // units to be measured; the lot size for a whole lot
  std::uint64_t accept = 0, reject = 1;   // attributes, claim, all: Ac and Re
  std::optional<double> k;                // variables: acceptability constant of the s method
  std::string code_letter, plan_letter;   // attributes, variables: of the lot size; of the plan the arrow leads to
  double aql_percent = 0;
  Severity105 severity = Severity105::normal;
  bool whole_lot = false;                 // the plan asks for as many as there are, or more
  std::uint64_t draw_seed = 1;
  std::string why;                        // "lot of 500, level II: letter H; AQL 1.0: n 50, Ac 1, Re 2"
};

/// The plan for a lot. usage or bad_sheet with the place "sampling": a lot of no units, an AQL or level the tables do not
/// have, severity reduced that the sheet does not allow, discontinued.
Result<SamplingPlan> plan_for(const Sampling& sampling, std::uint64_t lot_size, Severity105 severity);

/// Positions in the lot, counted from 1, rising: a simple random draw without replacement; the same seed draws the same.
std::vector<std::uint64_t> draw_positions(std::uint64_t lot_size, std::uint64_t n, std::uint64_t seed);

/// Which of the units present decide. With exactly n present they are the sample; with more, n of them are drawn; with
/// fewer the lot stays undecided. Indices into the units present, rising.
std::vector<std::size_t> choose_sample(const SamplingPlan& plan, std::size_t units_present);

struct LotCounts {
  std::uint64_t inspected = 0, nonconforming = 0, undecided = 0, not_comparable = 0;
};
LotCounts count(std::span<const UnitVerdict> sample);

enum class LotResult { accept, reject, undecided };
std::string_view name(LotResult result);

struct LotDecision {
  LotResult decision = LotResult::undecided;
  LotCounts counts;
  std::string why;
  /// variables: mean, standard deviation between units, the indices (U - mean)/s and (mean - L)/s.
  std::optional<double> mean, deviation, upper_index, lower_index;
  std::optional<double> fraction_estimated;  // variables: nonconforming in the lot, estimated from these
  bool between_accept_and_reject = false;  // reduced: accepted, and back to normal
};

/// Decides from the sample's verdicts (those of choose_sample, one for each unit, as they stand after retests).
LotDecision decide_lot(const PartSheet& sheet, const SamplingPlan& plan, std::span<const UnitVerdict> sample);

/// Probability that a lot with this fraction nonconforming is accepted: hypergeometric for whole units of a finite lot
/// (`finite`), else binomial; non-central t for variables (one limit). As the tables are made: one unit, right or wrong.
double acceptance_probability(const SamplingPlan& plan, double fraction_nonconforming, bool finite = false);

/// "a lot with 5 % bad passes 66 times in 100"
std::string passes_in_words(const SamplingPlan& plan, double fraction_nonconforming);

/// Points for a figure of the operating characteristic.
struct OperatingPoint {
  double fraction_nonconforming, acceptance;
};
std::vector<OperatingPoint> operating_characteristic(const SamplingPlan& plan);

/// One lot of the past, oldest first, original inspections only.
struct LotHistory {
  UtcTime time{};
  LotResult decision = LotResult::undecided;
  Severity105 severity = Severity105::normal;
  bool between_accept_and_reject = false;
};

/// Severity of the next lot (docs/formulas.md#switching): normal to tightened when 2 of 5 or fewer lots in a row were
/// rejected, back after 5 accepted in a row, discontinued after 5 in all rejected on tightened; reduced after 10 accepted
/// in a row where the sheet allows it. Lots before the sheet's `resumed` date do not count.
struct NextSeverity {
  Severity105 severity = Severity105::normal;
  std::string why;
};
NextSeverity next_severity(const Sampling& sampling, std::span<const LotHistory> history);

}  // namespace coilassay
