#include "app/runs/sweep_preparation.h"

#include <utility>

#include "analysis/connection.h"
#include "app/runs/captures.h"

namespace coilassay {

namespace {

Result<std::optional<Sweep>> two_port_file(const std::optional<std::string>& file, const char* option, const RunContext& context) {
  if (!file) return std::nullopt;
  ReadOptions reading;
  reading.threads = context.threads;
  Result<Recording> recording = read_recording(*file, reading);
  if (!recording) return failure(recording);
  Sweep* sweep = std::get_if<Sweep>(&*recording);
  if (sweep == nullptr) {
    return failure(Problem::usage, option, *file + " holds a waveform, not a two-port over frequency", "give a Touchstone file of two ports");
  }
  return std::move(*sweep);
}

Result<void> check(const SweepPreparation& p) {
  if (p.connection != Connection::reflect) {
    if (p.plane) {
      return failure(Problem::usage, "--reference-plane", "a plane is moved for a reflection at one port",
                     "take lines at two ports out with --remove-port1 and --remove-port2");
    }
    return {};
  }
  const std::size_t port = p.port.value_or(1);
  const bool other = (p.remove_port1 && port != 1) || (p.remove_port2 && port != 2);
  if (!other) return {};
  return failure(Problem::usage, p.remove_port1 && port != 1 ? "--remove-port1" : "--remove-port2",
                 "what lies at another port has no part in the reflection at port " + std::to_string(port),
                 "leave it out, or say --connection series or shunt, or another --port");
}

}  // namespace

Result<CorrectedSweep> prepared_sweep(CorrectedSweep input, const SweepPreparation& p, const BenchSetup& bench,
                                      const PropagationOptions& options, const RunContext& context) {
  if (const auto fine = check(p); !fine) return failure(fine);
  Result<std::optional<Sweep>> at_1 = two_port_file(p.remove_port1, "--remove-port1", context);
  if (!at_1) return failure(at_1);
  Result<std::optional<Sweep>> at_2 = two_port_file(p.remove_port2, "--remove-port2", context);
  if (!at_2) return failure(at_2);
  const bool reflect = p.connection == Connection::reflect;
  if (bench.fixture_set && !reflect && (*at_1 || *at_2)) {
    return failure(Problem::usage, "--fixture", "a set was measured with the two-ports in place: both would be taken out twice",
                   "use the set, or the two-port files");
  }

  ConnectionRequest request{.connection = p.connection, .port = p.port, .at_port_1 = {}, .at_port_2 = {}};
  if (!reflect) {
    request.at_port_1 = *at_1;
    request.at_port_2 = *at_2;
  }
  Result<Sweep> one = one_port_of(input.sweep, request);
  if (!one) return failure(one);
  Result<CorrectedSweep> c = CorrectedSweep{std::move(*one), std::move(input.knowledge)};
  if (!reflect && *at_1) c->knowledge.corrections.push_back({"two-port removed at port 1", 1, Unit::one});
  if (!reflect && *at_2) c->knowledge.corrections.push_back({"two-port removed at port 2", 2, Unit::one});
  if (bench.fixture_set) {
    const Result<FixtureSet> set = read_fixture_set(*bench.fixture_set);
    if (!set) return failure(set);
    const std::chrono::year_month_day today = std::chrono::floor<std::chrono::days>(context.now);
    c = without_fixture(std::move(*c), *set, p.connection, p.port.value_or(1), today, options);
    if (!c) return c;
  }
  if (reflect && *at_1) c = without_two_port(std::move(*c), **at_1, "--remove-port1", options);
  if (c && reflect && *at_2) c = without_two_port(std::move(*c), **at_2, "--remove-port2", options);
  if (c && p.plane) c = at_reference_plane(std::move(*c), *p.plane, options);
  return c;
}

Result<WaveformSweep> read_waveforms(const WaveformFiles& files, const BenchSetup& bench, const PropagationOptions& options,
                                     const RunContext& context, std::vector<std::string>& notes) {
  Result<CapturesRead> read =
      read_captures({.files = files.files, .segment = files.segment, .reading = bench.reading, .test = "sweep --from-waveform"}, context);
  if (!read) return failure(read);
  notes.insert(notes.end(), read->notes.begin(), read->notes.end());
  return sweep_of_waveforms(read->captures, {.bench = bench, .from_s = files.from_s, .to_s = files.to_s, .propagation = options});
}

}  // namespace coilassay
