// What a fixture added to a sweep, taken out, with what stays uncertain about it.
#pragma once

#include <chrono>
#include <optional>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "acquire/fixture_set.h"
#include "analysis/budget.h"
#include "analysis/sweep.h"
#include "base/result.h"

namespace coilassay {

/// Default tolerances of a fixture set (docs/uncertainty.md).
namespace fixture_defaults {
inline constexpr double kShortInductance_h = 0.3e-9;   // conventions for the same short differ by 0.4 nH
inline constexpr double kShortResistance_ohm = 2e-3;   // contacts of a short repeat to some milliohm
inline constexpr double kOpenCapacitance_f = 20e-15;   // the gap of the open is not quite the part's length
inline constexpr double kLoadRatio = 0.01;             // the usual grade of a resistor
inline constexpr double kLoadInductance_h = 1e-9;      // of a small resistor
inline constexpr double kTwoPortS = 0.005;             // of each S of a file of what lies between
inline constexpr double kLineDelayRatio = 0.05;        // a ruler and a velocity factor
}  // namespace fixture_defaults

/// A line of known length between where the analyser was calibrated and the part.
struct ReferencePlane {
  StatedValue shift;               // s of one-way delay, or m of length; positive: towards the part
  double velocity_factor = 1;      // of a length
  double line_ohm = 50;
};

/// A sweep of one port, with what is known of its errors so far and, after each step, then.
struct CorrectedSweep {
  Sweep sweep;
  SweepKnowledge knowledge;
};

/// Takes the fixture of a set out. Random errors of the points, where given, are carried along; the standards' errors
/// come as terms, common to all parts measured with this set. Noise in the standards' own captures is not among them: it stays in
/// the points and shows as scatter.
///
/// Between the set's frequencies the open's admittance, the short's and the load's impedance go by a cubic through the four
/// nearest; what a straight line would give otherwise is an error too.
///
/// Findings: fixture_expired (today is after the set's last day), fixture_in_future (it was made after today), fixture_residual (the fixture changed the value by more
/// than a tenth, as a caution by more than half).
/// @return usage: the sweep leaves the set's frequencies, or the set belongs to another connection or port
Result<CorrectedSweep> without_fixture(CorrectedSweep corrected, const FixtureSet& set, Connection connection, std::size_t port,
                                       std::chrono::year_month_day today, const PropagationOptions& options);

/// Takes a two-port between analyser (port 1 of the file) and part out of a reflection. Its S are known within 0.005 each,
/// unless the bench is exact. usage as check_two_port(), which names `option`.
Result<CorrectedSweep> without_two_port(CorrectedSweep corrected, const Sweep& file, const char* option, const PropagationOptions& options);

/// Moves the reference plane; usage for a line without impedance or a velocity factor outside 0 to 1.
Result<CorrectedSweep> at_reference_plane(CorrectedSweep corrected, const ReferencePlane& plane, const PropagationOptions& options);

/// The set from its sweeps: the same frequencies in all of them, points that one of them marks as bad left out.
/// @return usage, with the place and a sentence: other frequencies, or a standard that looks like another one (an open that is
///         closed, a short that does not touch, open and short exchanged, a load that is not there)
struct StandardSweeps {
  Sweep open, short_circuit;
  std::optional<Sweep> load;
};
Result<FixtureSet> make_fixture_set(const StandardSweeps& standards, FixtureSet described);

/// What a set corrects at one frequency.
struct FixtureEffect {
  double frequency_hz = 0;
  double series_ohm = 0, series_h = 0;        // of leads and contacts
  double parallel_f = 0, parallel_s = 0;      // across the part
  double part_share = std::nan("");           // change of the inductance of such a part, as a ratio
};
std::vector<FixtureEffect> fixture_effects(const FixtureSet& set, std::optional<double> part_h);

}  // namespace coilassay
