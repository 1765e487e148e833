// Units as column headings write them.
#pragma once

#include <optional>
#include <string>
#include <string_view>

#include "base/unit.h"

namespace coilassay {

/// What a heading's unit means: a number in the column times ten to the exponent is in SI.
struct ColumnUnit {
  Unit unit = Unit::one;
  int exponent = 0;
  bool degrees = false;   // an angle in degrees: the factor is no power of ten
  bool decibels = false;  // twenty times the decimal logarithm
  friend bool operator==(const ColumnUnit&, const ColumnUnit&) = default;
};

/// "V", "mV", "Volt", "volts", "us", "µs", "seconds", "Amp", "kHz", "Ohm", "Ω", "deg"; std::nullopt when it is none.
std::optional<ColumnUnit> understand_column_unit(std::string_view text);

/// The way back: "mV", "deg", "dB"; empty for a unit that headings do not write.
std::string column_unit_text(const ColumnUnit& unit);

/// A heading taken apart: "CH1 (V)" and "CH1 [V]" are CH1 in volts; "time_us" keeps its whole name, and has a unit when
/// the ending can mean only one thing. What stands in brackets and is no unit stays in the name.
struct Heading {
  std::string name;
  std::optional<ColumnUnit> unit;
};
Heading understand_heading(const std::string& heading);

/// Whether a name says that the column is time: "time", "t", "t_s", "x-axis", "Zeit", "second".
bool names_time(std::string_view name);
/// Whether a name says that the column counts rows: "index", "sample", "no", "#", "point", "sequence".
bool names_index(std::string_view name);
/// Whether a name says that the column is an angle: "phase", "phi", "theta", "arg".
bool names_angle(std::string_view name);

}  // namespace coilassay
