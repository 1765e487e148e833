// Inputs of a coupling measurement that cannot all be what they are called.
#pragma once

#include <utility>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/coupling_solution.h"
#include "analysis/measurement.h"

namespace coilassay {

/// Inductance shorted over inductance open where files show that it is larger by more than chance and accuracies explain; 0
/// otherwise. A short lowers the inductance at every frequency below the resonances: from the lowest up, the first frequency
/// at which the two differ for certain decides. Of stated values alone the solution itself tells.
double short_above_open(const CouplingSolution& solution);

/// Takes away quantities, limits and equivalents, where a finding says that the inputs are not what they are called; `coupled`
/// leaves L_1 and L_2, where it says only that they do not belong together.
enum class Withheld { all, coupled };
void withhold_coupling(Measurement& m, Withheld what = Withheld::all);

/// Compares what was stated on both sides of the diagonal (NaN: not given) and refuses pairs whose two values differ by more
/// than their tolerances allow, with the quantities of the pair that was asked for; true when all pairs are fine.
bool judge_reciprocity(Measurement& result, const std::vector<std::vector<StatedValue>>& rows, std::pair<std::size_t, std::size_t> pair);

}  // namespace coilassay
