#include "app/runs/sweep_run.h"

#include <algorithm>
#include <cmath>
#include <sstream>
#include <utility>

#include "analysis/sweep_of_sines.h"
#include "acquire/sweep_writer.h"
#include "analysis/sweep_circuit.h"
#include "app/runs/captures.h"
#include "app/runs/saturation_law.h"
#include "app/runs/version.h"
#include "report/sweep_netlist.h"

namespace coilassay {

namespace {

Result<SweepInput> sines(std::vector<Capture> captures, const SweepJob& job, const BenchSetup& bench) {
  SineRequest request;
  request.bench = bench;
  request.from_s = job.from_s;
  request.to_s = job.to_s;
  request.propagation = job.propagation;
  Result<SweepOfSines> made = sweep_of_sines(captures, request);
  if (!made) return failure(made);
  return SweepInput{std::move(made->sweep), std::move(made->knowledge), std::move(made->sources), {}};
}

Result<void> write_netlist(Measurement& measured, const Sweep& sweep, const SweepJob& job, const RunContext& context) {
  std::optional<SaturationLaw> law;
  if (job.saturation_file) {
    Result<SaturationLaw> read = read_saturation_law(*job.saturation_file);
    if (!read) return failure(read);
    law = std::move(*read);
  }
  double low = HUGE_VAL, high = 0;
  for (const double f : sweep.frequency_hz) {
    if (!(std::isfinite(f) && f > 0)) continue;
    low = std::fmin(low, f);
    high = std::fmax(high, f);
  }
  const auto netlist = sweep_netlist(measured, low, high, program_name(), law ? &*law : nullptr);
  if (!netlist) {
    measured.advice.push_back("no netlist was written: there is no circuit to write");
    return {};
  }
  return context.write(*job.netlist_file, *netlist);
}

Result<void> write_model_sweep(Measurement& measured, const Sweep& sweep, const SweepJob& job, const RunContext& context) {
  const std::optional<Circuit> circuit = circuit_of(measured);
  if (!circuit) {
    measured.advice.push_back("no Touchstone file was written: there is no circuit to write");
    return {};
  }
  std::ostringstream text;
  write_touchstone(text, swept(*circuit, sweep),
                   "the circuit fitted to " + sweep.source.name + " (" + name(circuit->family) + "), not the points measured\nby " + program_name());
  return context.write(*job.touchstone_file, text.str());
}

Result<void> check_models(const SweepJob& job) {
  if (job.saturation_file && !job.netlist_file) {
    return failure(Problem::usage, "--saturation", "there is no netlist it could go into", "add --netlist coil.cir, or leave it out");
  }
  if (job.touchstone_file && !job.touchstone_file->ends_with(".s1p")) {
    return failure(Problem::usage, "--touchstone", "a Touchstone file of one port ends in .s1p", "give a file name that ends in .s1p");
  }
  return {};
}

Result<SweepInput> burst(const SweepJob& job, const BenchSetup& bench, const RunContext& context) {
  SweepInput input;
  Result<WaveformSweep> made =
      read_waveforms({job.files, job.segment, job.from_s, job.to_s}, bench, job.propagation, context, input.notes);
  if (!made) return failure(made);
  input.refused = !made->sweep;
  if (made->sweep) input.sweep = std::move(*made->sweep);
  input.sweep.findings = std::move(made->findings);
  input.knowledge = std::move(made->knowledge);
  input.sources = std::move(made->sources);
  return input;
}

/// What can be said when no sweep could be made.
Measurement refused(SweepInput input, const BenchSetup& bench) {
  Measurement result;
  result.test = "sweep";
  result.sources = std::move(input.sources);
  result.equipment = bench.equipment;
  result.corrections = std::move(input.knowledge.corrections);
  result.findings = std::move(input.sweep.findings);
  result.advice = std::move(input.notes);
  return result;
}

/// The files as they stand.
Result<SweepInput> read_files(const SweepJob& job, const BenchSetup& bench, const RunContext& context) {
  if (job.preparation.from_waveform) return burst(job, bench, context);
  if (std::count(job.files.begin(), job.files.end(), "-") > 1) {
    return failure(Problem::usage, "-", "standard input can be read only once", "give '-' once and name the other files");
  }
  ReadOptions reading = bench.reading;
  reading.threads = context.threads;
  reading.progress = context.progress;
  SweepInput input;
  std::vector<Capture> captures;
  for (const std::string& file : job.files) {
    Result<Recording> recording = read_recording(file, reading);
    if (!recording) return failure(recording);
    if (Sweep* sweep = std::get_if<Sweep>(&*recording)) {
      if (job.files.size() > 1) {
        return failure(Problem::usage, file, "the file holds a sweep of its own, and one circuit is fitted to one sweep",
                       "measure the files one by one; several files are captures of a steady sine, one frequency each");
      }
      input.sweep = std::move(*sweep);
      return input;
    }
    if (job.files.size() == 1) {
      return failure(Problem::usage, file, "the file holds a waveform over time, not impedance against frequency",
                     "add --from-waveform for a pulse, a chirp or noise; give five or more captures of a steady sine, one frequency each; "
                     "or measure this one with coilassay sine");
    }
    Result<Capture> capture = chosen_capture(std::move(*recording), file, {job.files, job.segment, reading, "sweep"}, input.notes);
    if (!capture) return failure(capture);
    captures.push_back(std::move(*capture));
  }
  Result<SweepInput> made = sines(std::move(captures), job, bench);
  if (!made) return failure(made);
  made->notes = std::move(input.notes);
  return made;
}

}  // namespace

Result<SweepInput> read_sweep(const SweepJob& job, const BenchSetup& bench, const RunContext& context) {
  Result<SweepInput> input = read_files(job, bench, context);
  if (!input || input->refused) return input;
  if (!job.preparation.anything() && !bench.fixture_set) return input;
  Result<CorrectedSweep> prepared =
      prepared_sweep({std::move(input->sweep), std::move(input->knowledge)}, job.preparation, bench, job.propagation, context);
  if (!prepared) return failure(prepared);
  input->sweep = std::move(prepared->sweep);
  input->knowledge = std::move(prepared->knowledge);
  return input;
}

Result<Measurement> run_sweep(const SweepJob& job, const RunContext& context) {
  if (job.from_s && job.to_s && *job.from_s >= *job.to_s) {
    return failure(Problem::usage, "--to", "the window ends before it begins", "give a time after that of --from");
  }
  if (const auto fine = check_models(job); !fine) return failure(fine);
  SweepRequest request;
  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    request.bench = std::move(*sheet);
  }
  request.bench = overridden(std::move(request.bench), job.stated);
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.at_hz = job.at_hz;
  request.traces = job.traces;

  Result<SweepInput> input = read_sweep(job, request.bench, context);
  if (!input) return failure(input);
  if (input->refused) return refused(std::move(*input), request.bench);
  request.knowledge = std::move(input->knowledge);
  Result<Measurement> measured = measure_sweep(input->sweep, request);
  if (!measured) return measured;
  if (!input->sources.empty()) measured->sources = std::move(input->sources);
  measured->advice.insert(measured->advice.end(), input->notes.begin(), input->notes.end());
  if (job.netlist_file) {
    if (auto written = write_netlist(*measured, input->sweep, job, context); !written) return failure(written);
  }
  if (job.touchstone_file) {
    if (auto written = write_model_sweep(*measured, input->sweep, job, context); !written) return failure(written);
  }
  return measured;
}

}  // namespace coilassay
