// What a reply says: values with units, over-range and not-a-number codes, status.
#pragma once

#include <cmath>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/instrument/profile.h"
#include "base/result.h"

namespace coilassay {

enum class ValueState {
  measured,
  over_range,  // one of the replies that stand for "no value"
};

struct ReadingValue {
  std::string symbol;
  Unit unit = Unit::one;
  double value = std::nan("");       // SI; NaN when there is none
  double resolution = std::nan("");  // one step of the last digit that came, SI
  ValueState state = ValueState::measured;
};

/// One reply to one question.
struct Reading {
  std::vector<ReadingValue> values;  // of the fields that are values, in their order
  std::string status;                // as it came; empty when there is no such field
  bool status_ok = true;
  std::string reply;                 // the whole line; outside text
  const ReadingValue* find(std::string_view symbol) const;
  /// Every value is there and the status says so.
  bool good() const;
};

/// Replies everyone uses where there is no value, beside those a profile names: 9.9E37 and -9.9E37 (infinite) and 9.91E37
/// (not a number) of SCPI-99 (from memory), and the words OL, OVLD, OVERLOAD, INF, NAN in capitals or not.
bool means_no_value(std::string_view text, const std::vector<std::string>& more);

/// Takes a line apart. instrument, with what was expected and what came: another number of fields, something that is no value of
/// the unit, a control character or bytes that are no text. A garbled reply is refused, never mended.
Result<Reading> parse_reading(const ReadingSetup& setup, const std::string& line, const std::string& place);

/// One row of a record: a value per field that is not "-"; NaN where the reply stands for no value.
Result<std::vector<double>> parse_row(const RecordSetup& setup, const std::string& line, const std::string& place);

}  // namespace coilassay
