#include "app/runs/simulate_sweep_run.h"

#include <array>
#include <cmath>
#include <nlohmann/json.hpp>
#include <sstream>

#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using synthetic::CoilSweepBench;
using synthetic::CoilSweepRecord;
using synthetic::CoilSweepTruth;

constexpr std::array kParameters = {
    SweepParameter{"inductance", Unit::henry, &CoilSweepBench::inductance_h},
    SweepParameter{"resistance", Unit::ohm, &CoilSweepBench::resistance_ohm},
    SweepParameter{"skin_resistance", Unit::ohm, &CoilSweepBench::skin_ohm},
    SweepParameter{"skin_frequency", Unit::hertz, &CoilSweepBench::skin_frequency_hz},
    SweepParameter{"proximity_resistance", Unit::ohm, &CoilSweepBench::proximity_ohm},
    SweepParameter{"proximity_frequency", Unit::hertz, &CoilSweepBench::proximity_frequency_hz},
    SweepParameter{"parallel_capacitance", Unit::farad, &CoilSweepBench::parallel_capacitance_f},
    SweepParameter{"parallel_resistance", Unit::ohm, &CoilSweepBench::parallel_resistance_ohm},
    SweepParameter{"second_frequency", Unit::hertz, &CoilSweepBench::second_frequency_hz},
    SweepParameter{"second_capacitance", Unit::farad, &CoilSweepBench::second_capacitance_f},
    SweepParameter{"second_q", Unit::one, &CoilSweepBench::second_q},
    SweepParameter{"residual_inductance", Unit::henry, &CoilSweepBench::residual_inductance_h},
    SweepParameter{"residual_resistance", Unit::ohm, &CoilSweepBench::residual_resistance_ohm},
    SweepParameter{"residual_capacitance", Unit::farad, &CoilSweepBench::residual_capacitance_f},
    SweepParameter{"residual_conductance", Unit::siemens, &CoilSweepBench::residual_conductance_s},
    SweepParameter{"start", Unit::hertz, &CoilSweepBench::start_hz},
    SweepParameter{"stop", Unit::hertz, &CoilSweepBench::stop_hz},
    SweepParameter{"noise", Unit::one, &CoilSweepBench::noise_ratio},
    SweepParameter{"scattering_noise", Unit::one, &CoilSweepBench::scattering_noise},
    SweepParameter{"reference", Unit::ohm, &CoilSweepBench::reference_ohm},
    SweepParameter{"scale", Unit::one, &CoilSweepBench::gain},
    SweepParameter{"phase_error", Unit::radian, &CoilSweepBench::phase_error_rad},
    SweepParameter{"step", Unit::one, &CoilSweepBench::step_ratio},
    SweepParameter{"step_frequency", Unit::hertz, &CoilSweepBench::step_frequency_hz},
};

nlohmann::ordered_json number(double value) {
  return std::isfinite(value) ? nlohmann::ordered_json(value) : nlohmann::ordered_json(nullptr);
}

std::string truth_document(const SimulateSweepJob& job, const CoilSweepRecord& record, const std::string& written) {
  const CoilSweepBench& b = job.bench;
  nlohmann::ordered_json parameters;
  for (const SweepParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = b.*each.member;
  }
  parameters["points"] = b.points;
  parameters["linear"] = b.linear;
  const CoilSweepTruth& t = record.truth;
  nlohmann::ordered_json truth = {{"L", b.inductance_h},
                                  {"R_dc", b.resistance_ohm},
                                  {"C_par", b.parallel_capacitance_f},
                                  {"R_par", b.parallel_resistance_ohm > 0 ? number(b.parallel_resistance_ohm) : nullptr},
                                  {"f_r", number(t.f_r_hz)},
                                  {"outliers", t.outliers},
                                  {"marked", t.marked}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "sweep"},
                    {"seed", b.seed},
                    {"capture", {{"file", json_safe(job.sweep_file)}, {"sha256", sha256_of(written)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const SweepParameter> sweep_parameters() { return kParameters; }

Result<CoilSweepTruth> run_simulate_sweep(const SimulateSweepJob& job, const RunContext& context) {
  if (job.truth_file == job.sweep_file) {
    return failure(Problem::usage, "--truth", "sweep and truth would go to the same place", "give --truth a file of its own");
  }
  Result<CoilSweepRecord> record = simulate_coil_sweep(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  const std::string origin = "simulated: coilassay simulate sweep --seed " + std::to_string(job.bench.seed);
  std::ostringstream text;
  record->sweep.reference_ohm = {job.bench.reference_ohm};
  if (job.sweep_file.ends_with(".s1p")) {
    write_touchstone(text, record->sweep, origin);
  } else {
    record->sweep.dialect.settings["origin"] = origin;
    write_sweep_csv(text, record->sweep, job.columns);
  }
  if (const Result<void> written = context.write(job.sweep_file, text.str()); !written) return failure(written);
  if (job.truth_file) {
    const Result<void> written = context.write(*job.truth_file, truth_document(job, *record, text.str()));
    if (!written) return failure(written);
  }
  return record->truth;
}

}  // namespace coilassay
