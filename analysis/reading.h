// An instrument's own values as a measurement: what its profile states of their accuracy makes the budget.
#pragma once

#include <string>
#include <utility>
#include <vector>

#include "acquire/instrument/profile.h"
#include "acquire/instrument/reply_values.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

namespace reading_defaults {
inline constexpr double kAccuracyRatio = 0.01;  // of an instrument whose profile does not state it
}

/// wrong_unit or bad_sheet, with the profile's line: a field whose symbol is none of analysis/symbols.h, or whose unit does
/// not fit it. Plain voltage and current (V, I), as of a waveform, are known besides. With `judged` false, names that are
/// no symbols pass: what is only written down may be called anything.
Result<void> check_profile_symbols(const InstrumentProfile& profile, bool judged);

/// Replies to [[setting]] questions by name; outside text.
using InstrumentSettings = std::vector<std::pair<std::string, std::string>>;

/// One reading as a Measurement with test "reading": y = reading + accuracy + rounding - subtracted. Accuracy is
/// rectangular (as stated, or the default unless `exact_bench`) and common to all units of this instrument; rounding is half a
/// step of the last digit that came and the unit's own; what is subtracted brings its stated tolerance, and with none, one
/// of its own size. Conditions are those the profile states, and those the instrument itself gave as replies to
/// [[setting]] questions named frequency, level, bias or temperature; where both speak and differ by more than 1 %, all
/// values are withheld: finding setting_contradicts.
/// A value that is over range, and all values under a bad status, are withheld: findings over_range and bad_status.
Measurement measure_reading(const Reading& reading, const InstrumentProfile& profile, const std::string& identity,
                            const InstrumentSettings& settings = {}, bool exact_bench = false);

}  // namespace coilassay
