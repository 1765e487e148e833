// Options of every test that drives the coil, and what they say about the bench.
#pragma once

#include "acquire/bench_sheet.h"
#include "app/commands/arguments.h"
#include "app/commands/option_table.h"
#include "base/result.h"

namespace coilassay {

/// --current, --current-low, --shunt, --shunt-inductance, --current-gain, --skew, --current-probe-corner, --dcr.
OptionGroup current_options();

/// Takes those of current_options() into the bench. bad_number or wrong_unit for a gain that is neither a plain number
/// nor in A/V.
Result<void> take_current(const Arguments& arguments, BenchSetup& bench);

}  // namespace coilassay
