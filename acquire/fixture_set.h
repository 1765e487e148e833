// A fixture set: open, short and perhaps load as they were measured, and what these standards really are
// (docs/formats.md#fixture-set).
#pragma once

#include <chrono>
#include <complex>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

/// How a part hangs on the ports of an analyser.
enum class Connection {
  reflect,   // on one port: its own impedance, or S11
  series,    // from port 1 to port 2
  shunt,     // from a line between the ports to the common side
};
std::string_view name(Connection connection);
std::optional<Connection> parse_connection(std::string_view text);

/// A standard as it was measured, at the frequencies of its set.
struct MeasuredStandard {
  std::string file;     // as named when the set was made; outside text
  std::string sha256;   // of that file
  std::vector<std::complex<double>> z_ohm;
};

struct FixtureSet {
  std::string name;                      // outside text
  std::chrono::year_month_day made{};
  std::optional<std::chrono::year_month_day> expires;   // the last day on which it may be used
  Connection connection = Connection::reflect;
  std::size_t port = 1;
  std::vector<double> frequency_hz;      // rising

  MeasuredStandard open, short_circuit;
  std::optional<MeasuredStandard> load;

  // What the standards are. The short's own inductance has no default: conventions differ, and 0 is one of them.
  StatedValue short_inductance;
  std::optional<StatedValue> short_resistance;
  std::optional<StatedValue> open_capacitance;
  std::optional<StatedValue> load_value;        // in ohm or in F
  std::optional<StatedValue> load_inductance;   // in series with a load in ohm
};

/// Reads a set. bad_sheet: unknown key, a row of another length, frequencies that do not rise, a load without its value.
Result<FixtureSet> read_fixture_set(const std::string& path);
Result<FixtureSet> parse_fixture_set(std::string_view text, std::string_view name);

/// The set as a file; reads back to the same digits.
std::string fixture_set_text(const FixtureSet& set);

/// A value as a sheet has it: "0.1 ohm ± 0.001 ohm"; reads back to the same value and law.
std::string sheet_value_text(const StatedValue& value);

}  // namespace coilassay
