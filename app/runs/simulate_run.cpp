#include "app/runs/simulate_run.h"

#include <array>
#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/capture_writer.h"
#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using synthetic::RingDownBench;
using synthetic::RingDownRecord;
using synthetic::RingDownTruth;

constexpr std::array kParameters = {
    RingDownParameter{"inductance", Unit::henry, &RingDownBench::inductance_h},
    RingDownParameter{"resistance", Unit::ohm, &RingDownBench::resistance_ohm},
    RingDownParameter{"parallel_capacitance", Unit::farad, &RingDownBench::parallel_capacitance_f},
    RingDownParameter{"saturation", Unit::one, &RingDownBench::saturation_per_a2},
    RingDownParameter{"capacitor", Unit::farad, &RingDownBench::capacitance_f},
    RingDownParameter{"capacitor_dissipation", Unit::one, &RingDownBench::capacitor_dissipation},
    RingDownParameter{"probe_capacitance", Unit::farad, &RingDownBench::probe_capacitance_f},
    RingDownParameter{"probe_resistance", Unit::ohm, &RingDownBench::probe_resistance_ohm},
    RingDownParameter{"across", Unit::ohm, &RingDownBench::across_resistance_ohm},
    RingDownParameter{"across_capacitance", Unit::farad, &RingDownBench::across_capacitance_f},
    RingDownParameter{"second_amplitude", Unit::one, &RingDownBench::second_amplitude_ratio},
    RingDownParameter{"second_frequency", Unit::one, &RingDownBench::second_frequency_ratio},
    RingDownParameter{"second_decay", Unit::one, &RingDownBench::second_decay_ratio},
    RingDownParameter{"initial_current", Unit::ampere, &RingDownBench::initial_current_a},
    RingDownParameter{"initial_voltage", Unit::volt, &RingDownBench::initial_voltage_v},
    RingDownParameter{"drive_time", Unit::second, &RingDownBench::drive_time_s},
    RingDownParameter{"drive_frequency", Unit::hertz, &RingDownBench::drive_frequency_hz},
    RingDownParameter{"transient", Unit::one, &RingDownBench::transient_ratio},
    RingDownParameter{"transient_time", Unit::second, &RingDownBench::transient_tau_s},
    RingDownParameter{"interval", Unit::second, &RingDownBench::sample_interval_s},
    RingDownParameter{"pretrigger", Unit::one, &RingDownBench::pretrigger_fraction},
    RingDownParameter{"noise", Unit::volt, &RingDownBench::noise_v},
    RingDownParameter{"offset", Unit::volt, &RingDownBench::offset_v},
    RingDownParameter{"scale", Unit::one, &RingDownBench::gain},
    RingDownParameter{"timebase", Unit::one, &RingDownBench::timebase_error},
    RingDownParameter{"full_scale", Unit::volt, &RingDownBench::full_scale_v},
};

std::string truth_document(const SimulateRingDownJob& job, const RingDownRecord& record, const std::string& capture) {
  nlohmann::ordered_json parameters;
  for (const RingDownParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = job.bench.*each.member;
  }
  parameters["interval_s"] = record.capture.time.step_s;  // as simulated, also when it was left to the program
  parameters["samples"] = job.bench.samples;
  parameters["bits"] = job.bench.bits;
  parameters["drive_channel"] = job.bench.drive_channel;

  const RingDownTruth& t = record.truth;
  // As docs/formulas.md defines L_s and R_s: with the capacitance that a bench can state, the coil's own apart.
  nlohmann::ordered_json truth = {{"L_s", t.apparent_l_s_h},
                                  {"R_s", t.apparent_r_s_ohm},
                                  {"f_0", t.f_0_hz},
                                  {"f_d", t.f_d_hz > 0 ? nlohmann::ordered_json(t.f_d_hz) : nlohmann::ordered_json()},
                                  {"alpha", t.alpha_per_s},
                                  {"Q", t.q},
                                  {"Q_coil", t.q_coil},
                                  {"L", job.bench.inductance_h},
                                  {"R_dc", job.bench.resistance_ohm},
                                  {"C_par", job.bench.parallel_capacitance_f},
                                  {"C_total", t.c_total_f},
                                  {"peak_current_A", t.peak_current_a},
                                  {"peak_voltage_V", t.peak_voltage_v}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "ringdown"},
                    {"seed", job.bench.seed},
                    {"capture", {{"file", json_safe(job.capture_file)}, {"sha256", sha256_of(capture)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const RingDownParameter> ring_down_parameters() {
  return kParameters;
}

Result<RingDownTruth> run_simulate_ring_down(const SimulateRingDownJob& job, const RunContext& context) {
  if (job.truth_file == job.capture_file) {
    return failure(Problem::usage, "--truth", "capture and truth would go to the same place",
                   "give --truth a file of its own");
  }
  Result<RingDownRecord> record = simulate_ring_down(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  record->capture.dialect.settings["origin"] = "simulated: coilassay simulate ringdown --seed " + std::to_string(job.bench.seed);
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
