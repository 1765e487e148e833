#include "app/runs/fixture_run.h"

#include <algorithm>
#include <cmath>
#include <filesystem>

#include "analysis/connection.h"
#include "analysis/fixture_checks.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

Result<Sweep> standard(const std::string& file, const char* option, const FixtureJob& job, const RunContext& context) {
  ReadOptions reading = job.reading;
  reading.threads = context.threads;
  reading.progress = context.progress;
  Result<Recording> recording = read_recording(file, reading);
  if (!recording) return failure(recording);
  const Sweep* sweep = std::get_if<Sweep>(&*recording);
  if (sweep == nullptr) {
    return failure(Problem::usage, file, "the file holds a waveform over time, not impedance against frequency",
                   std::string("give a sweep of the standard to ") + option);
  }
  return one_port_of(*sweep, {.connection = job.connection, .port = job.port, .at_port_1 = {}, .at_port_2 = {}});
}

Result<void> check(const FixtureJob& job, const RunContext& context) {
  if (job.load_file.has_value() != job.load_value.has_value()) {
    return failure(Problem::usage, job.load_file ? "--load-standard" : "--load",
                   job.load_file ? "the load was measured, and it is not said what it is" : "a load standard was stated, but no measurement of it",
                   job.load_file ? "state it like --load-standard 100ohm±0.1%" : "give its sweep with --load, or leave --load-standard out");
  }
  if (job.load_inductance && (!job.load_value || job.load_value->unit != Unit::ohm)) {
    return failure(Problem::usage, "--load-inductance", "there is no load in ohm that could have it", "leave it out, or state the load standard");
  }
  if (job.expires && job.valid_for_s) {
    return failure(Problem::usage, "--expires", "two ways to say until when the set is good", "give --expires or --valid-for, not both");
  }
  const std::chrono::sys_days today = std::chrono::floor<std::chrono::days>(context.now);
  if (job.expires && std::chrono::sys_days(*job.expires) < today) {
    return failure(Problem::usage, "--expires", "the day is past already", "give a day in the future, or --valid-for 90d");
  }
  std::error_code ignored;
  if (job.file != "-" && std::filesystem::exists(job.file, ignored)) {
    return failure(Problem::cannot_write, job.file, "the file exists, and a set is never edited: results name it",
                   "give another file to -o, or move the old set away");
  }
  return {};
}

}  // namespace

Result<FixtureMade> run_fixture(const FixtureJob& job, const RunContext& context) {
  if (const auto fine = check(job, context); !fine) return failure(fine);
  StandardSweeps standards;
  Result<Sweep> open = standard(job.open_file, "--open", job, context);
  if (!open) return failure(open);
  standards.open = std::move(*open);
  Result<Sweep> closed = standard(job.short_file, "--short", job, context);
  if (!closed) return failure(closed);
  standards.short_circuit = std::move(*closed);
  if (job.load_file) {
    Result<Sweep> load = standard(*job.load_file, "--load", job, context);
    if (!load) return failure(load);
    standards.load = std::move(*load);
  }
  const std::chrono::sys_days today = std::chrono::floor<std::chrono::days>(context.now);
  FixtureSet described;
  described.name = job.name;
  described.made = today;
  described.expires = job.expires;
  if (job.valid_for_s) {
    described.expires = std::chrono::floor<std::chrono::days>(context.now + std::chrono::seconds(std::llround(*job.valid_for_s)));
  }
  described.connection = job.connection;
  described.port = job.port.value_or(1);
  described.short_inductance = job.short_inductance;
  described.short_resistance = job.short_resistance;
  described.open_capacitance = job.open_capacitance;
  described.load_value = job.load_value;
  described.load_inductance = job.load_inductance;
  Result<FixtureSet> set = make_fixture_set(standards, std::move(described));
  if (!set) return failure(set);

  FixtureMade made{std::move(*set), {}, job.part_h, {}, job.file};
  made.findings = doubts_about(made.set);
  made.effects = fixture_effects(made.set, job.part_h);
  const auto worst = std::max_element(made.effects.begin(), made.effects.end(),
                                      [](const FixtureEffect& a, const FixtureEffect& b) { return a.part_share < b.part_share; });
  if (job.part_h && worst->part_share > 0.1) {
    made.findings.push_back({"fixture_residual", worst->part_share > 0.5 ? Severity::caution : Severity::note,
                             "with " + to_text(*job.part_h, Unit::henry) + " the fixture changes the inductance by " +
                                 to_percent_text(worst->part_share) + " at " + to_text(worst->frequency_hz, Unit::hertz) +
                                 ": what is corrected away there is not small; use shorter leads, or a fixture nearer to the part",
                             "L_s", worst->part_share, Unit::one});
  }
  if (const Result<void> written = context.write(job.file, fixture_set_text(made.set)); !written) return failure(written);
  return made;
}

}  // namespace coilassay
