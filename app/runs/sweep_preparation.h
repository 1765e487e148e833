// From what a file holds to the impedance of the part: ports, fixture, two-ports, reference plane; and sweeps from waveforms.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "acquire/fixture_set.h"
#include "analysis/budget.h"
#include "analysis/fixture.h"
#include "analysis/waveform_sweep.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

/// How the part hung on the ports, and what lay between. The fixture set is the bench's.
struct SweepPreparation {
  Connection connection = Connection::reflect;
  std::optional<std::size_t> port;
  std::optional<std::string> remove_port1, remove_port2;   // two-port files, their port 1 on the analyser's side
  std::optional<ReferencePlane> plane;
  bool from_waveform = false;

  bool anything() const { return connection != Connection::reflect || port || remove_port1 || remove_port2 || plane; }
};

/// The sweep of the part: one port, then the fixture set of the bench, then a two-port, then the reference plane, each where it is asked
/// for; findings stand in the sweep. A set's last day is compared with the context's.
/// @return usage and the like in a sentence: what one_port_of(), without_fixture() and the others refuse; a two-port or a
///         plane where it cannot be meant
Result<CorrectedSweep> prepared_sweep(CorrectedSweep input, const SweepPreparation& preparation, const BenchSetup& bench,
                                      const PropagationOptions& options, const RunContext& context);

/// A burst in one file or several, made into a sweep; what was chosen where a file left a choice is added to `notes`. usage: a file
/// that holds a sweep.
struct WaveformFiles {
  std::vector<std::string> files;
  std::optional<std::string> segment;
  std::optional<double> from_s, to_s;
};
Result<WaveformSweep> read_waveforms(const WaveformFiles& files, const BenchSetup& bench, const PropagationOptions& options,
                                     const RunContext& context, std::vector<std::string>& notes);

}  // namespace coilassay
