// What the columns mean and how well each thing on the bench is known (docs/formats.md#bench-sheet).
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/reader.h"
#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

/// One side of the capture. A column is a channel's name, otherwise a position in the file counted from 1.
struct ChannelSetup {
  std::optional<std::string> column;
  std::optional<std::string> low_column;         // subtracted first
  std::optional<StatedValue> gain;               // factor not yet applied in the file (V/V, or A/V for a probe)
  std::optional<StatedValue> full_scale;         // of a file that holds fractions of full scale
  std::optional<StatedValue> input_capacitance;  // of probe and input together
  std::optional<StatedValue> input_resistance;
  std::optional<StatedValue> shunt;              // current side only
  std::optional<StatedValue> shunt_inductance;
  std::optional<StatedValue> skew;               // delay behind the voltage channel
  std::optional<StatedValue> probe_corner;       // low corner of a current probe
};

struct CapacitorSetup {
  StatedValue value;
  std::optional<StatedValue> dissipation_factor;
};

/// How well an analyser or bridge knows the impedances it writes: the half-widths its data sheet states, which add up.
struct ImpedanceAccuracy {
  std::optional<StatedValue> ratio;            // of Z, in size and, as radians, in angle
  std::optional<StatedValue> series_floor;     // ohm: what a short may read
  std::optional<StatedValue> parallel_floor;   // S: what an open may read
  std::optional<StatedValue> scattering;       // of S where the file holds S
};

struct EquipmentItem {
  std::string id;
  std::string certificate;
  std::string calibrated;  // date as text, "2026-05-01"
  std::string due;
};

/// Everything a bench sheet and the command line can say about the set-up. Absent = not stated.
struct BenchSetup {
  ChannelSetup voltage;
  ChannelSetup current;
  std::optional<StatedValue> timebase;               // tolerance as a ratio
  std::vector<CapacitorSetup> capacitors;
  std::optional<StatedValue> across_resistance;      // whatever else stays connected
  std::optional<StatedValue> across_capacitance;
  std::optional<StatedValue> winding_resistance;     // --dcr
  std::optional<StatedValue> level;                  // V
  std::optional<StatedValue> bias;                   // A
  std::optional<StatedValue> temperature;            // degC
  std::optional<std::string> fixture_set;            // path, relative paths resolved against the sheet
  ImpedanceAccuracy impedance;                       // of sweeps
  std::vector<EquipmentItem> equipment;
  ReadOptions reading;                               // [file]
};

/// Reads a bench sheet; an unknown key, a unit of the wrong kind or an impossible value (a negative capacitor, a
/// resistance of zero) is bad_sheet / wrong_unit / bad_number with its line.
Result<BenchSetup> read_bench_sheet(const std::string& path);

/// What `over` states replaces what `base` states, item by item; capacitors as a whole.
BenchSetup overridden(BenchSetup base, const BenchSetup& over);

/// The channel a COL names: a name that matches exactly, otherwise a position in the file counted from 1.
/// missing_column names what the file has; `option` is for the remedy ("--voltage").
Result<std::size_t> find_channel(const Capture& capture, const std::string& column, const std::string& option);

}  // namespace coilassay
