// What text and page say about a measurement, in the same words.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "analysis/measurement.h"
#include "base/number_text.h"

namespace coilassay {

/// "Ring-down" for "ringdown".
std::string test_in_words(std::string_view test);

/// A value ready to be set in columns.
struct ValueText {
  std::string words;   // "series inductance"
  std::string symbol;  // "L_s"
  std::string value;   // "47.02 µH"
  std::string
      deviation;      // "± 0.46 µH", "19.2 to 23.0" where the interval is not symmetric, "at least 10 MHz" of a bound
  std::string where;  // "at 232.0 kHz"; may be empty
};
ValueText value_text(const Estimate& estimate, Script script);
ValueText value_text(const Bound& bound, Script script);

/// All that was established, the leading quantities of the test first, then bounds; quantities without a value are left
/// out.
std::vector<ValueText> values_of(const Measurement& measurement, Script script);

/// "frequency 232.0 kHz", "peak current 72.9 mA"; only what is known.
std::vector<std::string> conditions_in_words(const Conditions& conditions, Script script);

/// The points of a measurement as a table, a line of headings first: where each holds and its main quantities in GUM
/// notation, "47.02(28) µH". Empty when there are no points.
std::vector<std::vector<std::string>> points_of(const Measurement& measurement, Script script);

/// "20 ns" rather than "20.00 ns": a setting, known exactly.
std::string setting_in_words(double value, Unit unit, Script script, int digits = 6);

/// "ring.csv: 20000 samples every 20 ns".
std::string source_in_words(const SourceRecord& record, Script script);

/// The symbols whose uncertainty a reader asks about first: what the test is made for.
std::vector<std::string> main_symbols(const Measurement& measurement);

/// "capacitor 99 %, fit 1 %": the largest terms of the variance, what is left as "the rest".
std::string made_of(const std::vector<BudgetLine>& lines);

/// Largest first.
std::vector<BudgetLine> by_share(std::vector<BudgetLine> lines);

/// "probe capacitance: default: 20 %": what entered those budgets (at least one percent of the variance) because nobody
/// stated it.
std::vector<std::string> defaults_taken(const Measurement& measurement, const std::vector<std::string>& of);

/// Refusals first, then cautions, then notes.
std::vector<Finding> by_weight(std::vector<Finding> findings);

/// "1.2 mJ; threshold from memory"; without the number when the message has it. May be empty.
std::string figure_in_words(const Caution& caution, Script script);

/// "99 %", "under 1 %".
std::string share_in_words(double share);

/// Whether the quantity the test is made for was established.
bool was_measured(const Measurement& measurement);

/// "the natural frequency f_0".
std::string named(std::string_view symbol);

}  // namespace coilassay
