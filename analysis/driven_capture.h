// Voltage over and current through a coil: two channels of a capture, scaled as the bench says, with what still has to be
// corrected and how well each of it is known. Shared by every test that drives the coil.
#pragma once

#include <cmath>
#include <complex>
#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// Two channels on one time base. `volts` and `amps` are scaled (difference columns subtracted, gain, shunt value) but not
/// yet corrected in time: skew, the shunt's inductance and a current probe's droop are kept aside, because a steady sine
/// takes them out exactly at its frequency and a pulse sample by sample.
struct DrivenRecord {
  double start_s = 0, step_s = 0;
  std::vector<double> volts, amps;               // NaN = missing
  double volt_resolution = std::nan("");         // after scaling
  double amp_resolution = std::nan("");
  std::string volt_name, amp_name;               // of the channels, for findings; outside text
  struct Columns {                               // places among the capture's channels
    std::size_t voltage = 0, current = 0;
    std::optional<std::size_t> voltage_low, current_low;
  } columns;

  // Still to be taken out of the current channel.
  double skew_s = 0;                             // delay of the current channel behind the voltage channel
  double shunt_tau_s = 0;                        // shunt inductance over shunt resistance
  double probe_corner_hz = 0;                    // low corner of a current probe; 0: none

  std::vector<Correction> corrections;           // everything that was or will be corrected, by name
  std::vector<Finding> findings;                 // of the capture, and scale or clipping remarks

  /// Independent errors, each with its law and basis; values are best values. The ratio errors are around 1, the rest in SI.
  struct Errors {
    InputError voltage_gain;                     // "voltage gain"
    InputError current_gain;                     // "shunt" or "current gain"
    InputError skew;                             // s
    InputError shunt_tau;                        // s
    InputError probe_corner;                     // Hz
    InputError timebase;                         // ratio, around 0
  } errors;
};

/// Default tolerances of driven tests (docs/uncertainty.md).
namespace driven_defaults {
inline constexpr double kVoltageGainRatio = 0.02;    // a bench oscilloscope's usual DC gain with its probe
inline constexpr double kCurrentGainRatio = 0.02;    // of a current channel that is in ampere
inline constexpr double kShuntRatio = 0.01;          // a shunt given without tolerance
inline constexpr double kSkew_s = 2e-9;              // two channels of one instrument with unlike probes
inline constexpr double kShuntInductance_h = 5e-9;   // of a shunt whose inductance is not stated: a small four-wire one
inline constexpr double kStatedInductanceRatio = 0.5;  // of a shunt inductance given without tolerance
inline constexpr double kStatedCornerRatio = 0.2;      // of a probe corner given without tolerance
inline constexpr double kTimebaseRatio = 100e-6;     // a poor crystal
}  // namespace driven_defaults

/// Picks the two channels (named in the bench, else the first in volts and the first in amperes; with a shunt or a gain in
/// A/V the next one in volts), scales them and collects errors. A column of a file that does not say its units is volts
/// when a shunt or a gain in A/V is stated, and amperes when the current gain is a plain number.
/// @return missing_column; usage when the current is in volts and no shunt or gain in A/V is stated, when what is stated
///         contradicts the column's unit, or when no time is given.
Result<DrivenRecord> driven_record(const Capture& capture, const BenchSetup& bench, const PropagationOptions& options);

/// The voltage was taken from a sense winding: scales it by driven turns over sense turns to what the flux induces in the
/// driven winding. Turns are counted, so a ratio given without tolerance is exact; otherwise its error joins the voltage
/// gain's. A negative ratio turns the sense winding round.
void take_turns_ratio(DrivenRecord& record, const StatedValue& ratio, const PropagationOptions& options);

/// What the current channel's chain does to a phasor at angular frequency omega: multiply the measured current phasor by
/// the inverse. Delay exp(-j omega skew), shunt 1 + j omega tau, probe j omega/(j omega + omega_1).
std::complex<double> current_chain(double omega, double skew_s, double shunt_tau_s, double probe_corner_hz);

/// The record with skew, shunt inductance and droop taken out sample by sample (for pulses); the kept-aside values are 0
/// afterwards. Shifts by a fraction of a sample go through a cubic; the samples at the ends whose partner lies outside the
/// record are missing (NaN). The shunt's inductance is a first-order lag taken from the first sample on, the droop the
/// integral from there: the record should begin before the pulse, with no offset left in the current.
DrivenRecord corrected_in_time(const DrivenRecord& record);

}  // namespace coilassay
