#include "app/runs/simulate_burst_run.h"

#include <array>
#include <cmath>
#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/capture_writer.h"
#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using synthetic::BurstKind;
using synthetic::DrivenBurstBench;
using synthetic::DrivenBurstRecord;
using synthetic::DrivenBurstTruth;

constexpr std::array kParameters = {
    BurstParameter{"inductance", Unit::henry, &DrivenBurstBench::inductance_h},
    BurstParameter{"resistance", Unit::ohm, &DrivenBurstBench::resistance_ohm},
    BurstParameter{"parallel_capacitance", Unit::farad, &DrivenBurstBench::parallel_capacitance_f},
    BurstParameter{"parallel_resistance", Unit::ohm, &DrivenBurstBench::parallel_resistance_ohm},
    BurstParameter{"amplitude", Unit::volt, &DrivenBurstBench::amplitude_v},
    BurstParameter{"source_resistance", Unit::ohm, &DrivenBurstBench::source_ohm},
    BurstParameter{"width", Unit::second, &DrivenBurstBench::width_s},
    BurstParameter{"rise", Unit::second, &DrivenBurstBench::rise_s},
    BurstParameter{"lowest", Unit::hertz, &DrivenBurstBench::from_hz},
    BurstParameter{"highest", Unit::hertz, &DrivenBurstBench::to_hz},
    BurstParameter{"filled", Unit::one, &DrivenBurstBench::filled},
    BurstParameter{"shunt", Unit::ohm, &DrivenBurstBench::shunt_ohm},
    BurstParameter{"shunt_inductance", Unit::henry, &DrivenBurstBench::shunt_inductance_h},
    BurstParameter{"skew", Unit::second, &DrivenBurstBench::skew_s},
    BurstParameter{"current_offset", Unit::ampere, &DrivenBurstBench::current_offset_a},
    BurstParameter{"current_scale", Unit::one, &DrivenBurstBench::current_gain},
    BurstParameter{"current_noise", Unit::ampere, &DrivenBurstBench::current_noise_a},
    BurstParameter{"current_full_scale", Unit::ampere, &DrivenBurstBench::current_full_scale_a},
    BurstParameter{"offset", Unit::volt, &DrivenBurstBench::voltage_offset_v},
    BurstParameter{"scale", Unit::one, &DrivenBurstBench::voltage_gain},
    BurstParameter{"noise", Unit::volt, &DrivenBurstBench::voltage_noise_v},
    BurstParameter{"full_scale", Unit::volt, &DrivenBurstBench::voltage_full_scale_v},
    BurstParameter{"interval", Unit::second, &DrivenBurstBench::sample_interval_s},
    BurstParameter{"pretrigger", Unit::one, &DrivenBurstBench::pretrigger_fraction},
    BurstParameter{"timebase", Unit::one, &DrivenBurstBench::timebase_error},
};

nlohmann::ordered_json number(double value) {
  return std::isfinite(value) ? nlohmann::ordered_json(value) : nlohmann::ordered_json(nullptr);
}

std::string truth_document(const SimulateBurstJob& job, const DrivenBurstRecord& record, const std::string& capture) {
  nlohmann::ordered_json parameters;
  for (const BurstParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = job.bench.*each.member;
  }
  parameters["burst"] = std::string(name(job.bench.kind));
  parameters["pulses"] = job.bench.pulses;
  parameters["samples"] = job.bench.samples;
  parameters["bits"] = job.bench.bits;
  const DrivenBurstTruth& t = record.truth;
  const nlohmann::ordered_json truth = {{"L", t.l_h},       {"R_dc", t.r_dc_ohm},       {"C_par", t.c_par_f}, {"R_par", number(t.r_par_ohm)},
                                        {"f_r", number(t.f_r_hz)}, {"peak_current_A", t.peak_current_a}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "burst"},
                    {"seed", job.bench.seed},
                    {"capture", {{"file", json_safe(job.capture_file)}, {"sha256", sha256_of(capture)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const BurstParameter> burst_parameters() { return kParameters; }

std::string_view name(BurstKind kind) {
  switch (kind) {
    case BurstKind::pulse: return "pulse";
    case BurstKind::chirp: return "chirp";
    case BurstKind::noise: return "noise";
  }
  return "";
}

Result<DrivenBurstTruth> run_simulate_burst(const SimulateBurstJob& job, const RunContext& context) {
  if (job.truth_file == job.capture_file) {
    return failure(Problem::usage, "--truth", "capture and truth would go to the same place",
                   "give --truth a file of its own");
  }
  Result<DrivenBurstRecord> record = simulate_driven_burst(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  record->capture.dialect.settings["origin"] = "simulated: coilassay simulate burst --seed " + std::to_string(job.bench.seed);
  std::ostringstream capture;
  write_capture_csv(capture, record->capture);
  if (const Result<void> written = context.write(job.capture_file, capture.str()); !written) return failure(written);
  if (job.truth_file) {
    const Result<void> written = context.write(*job.truth_file, truth_document(job, *record, capture.str()));
    if (!written) return failure(written);
  }
  return record->truth;
}

}  // namespace coilassay
