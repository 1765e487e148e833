#include "app/runs/simulate_ramp_run.h"

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

using Bench = synthetic::DrivenRampBench;

template <double Bench::*Member>
double& of(Bench& bench) {
  return bench.*Member;
}
template <double synthetic::CoreLaw::*Member>
double& of_core(Bench& bench) {
  return bench.core.*Member;
}

constexpr std::array kParameters = {
    RampParameter{"inductance", Unit::henry, &of_core<&synthetic::CoreLaw::inductance_h>},
    RampParameter{"saturated_inductance", Unit::henry, &of_core<&synthetic::CoreLaw::saturated_inductance_h>},
    RampParameter{"knee_current", Unit::ampere, &of_core<&synthetic::CoreLaw::knee_current_a>},
    RampParameter{"exponent", Unit::one, &of_core<&synthetic::CoreLaw::exponent>},
    RampParameter{"resistance", Unit::ohm, &of<&Bench::resistance_ohm>},
    RampParameter{"core_loss", Unit::ohm, &of<&Bench::core_loss_ohm>},
    RampParameter{"first_pulse", Unit::one, &of<&Bench::first_pulse_ratio>},
    RampParameter{"supply", Unit::volt, &of<&Bench::supply_v>},
    RampParameter{"switch_resistance", Unit::ohm, &of<&Bench::switch_resistance_ohm>},
    RampParameter{"bank_capacitance", Unit::farad, &of<&Bench::bank_capacitance_f>},
    RampParameter{"current_limit", Unit::ampere, &of<&Bench::current_limit_a>},
    RampParameter{"peak_current", Unit::ampere, &of<&Bench::peak_current_a>},
    RampParameter{"drive_time", Unit::second, &of<&Bench::drive_time_s>},
    RampParameter{"diode_voltage", Unit::volt, &of<&Bench::diode_v>},
    RampParameter{"rest", Unit::one, &of<&Bench::rest_ratio>},
    RampParameter{"offset", Unit::volt, &of<&Bench::voltage_offset_v>},
    RampParameter{"scale", Unit::one, &of<&Bench::voltage_gain>},
    RampParameter{"noise", Unit::volt, &of<&Bench::voltage_noise_v>},
    RampParameter{"full_scale", Unit::volt, &of<&Bench::voltage_full_scale_v>},
    RampParameter{"shunt", Unit::ohm, &of<&Bench::shunt_ohm>},
    RampParameter{"shunt_inductance", Unit::henry, &of<&Bench::shunt_inductance_h>},
    RampParameter{"skew", Unit::second, &of<&Bench::skew_s>},
    RampParameter{"current_probe_corner", Unit::hertz, &of<&Bench::probe_corner_hz>},
    RampParameter{"current_offset", Unit::ampere, &of<&Bench::current_offset_a>},
    RampParameter{"current_scale", Unit::one, &of<&Bench::current_gain>},
    RampParameter{"current_noise", Unit::ampere, &of<&Bench::current_noise_a>},
    RampParameter{"current_full_scale", Unit::ampere, &of<&Bench::current_full_scale_a>},
    RampParameter{"interval", Unit::second, &of<&Bench::sample_interval_s>},
    RampParameter{"pretrigger", Unit::one, &of<&Bench::pretrigger_fraction>},
    RampParameter{"timebase", Unit::one, &of<&Bench::timebase_error>},
};

std::string truth_document(SimulateRampJob job, const synthetic::DrivenRampRecord& record, const std::string& capture) {
  nlohmann::ordered_json parameters = {{"core", synthetic::name(job.bench.core.kind)}};
  for (const RampParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = each.member(job.bench);
  }
  parameters["interval_s"] = record.capture.time.step_s;  // as simulated, also when it was left to the program
  parameters["samples"] = job.bench.samples;
  parameters["bits"] = job.bench.bits;
  parameters["pulses"] = job.bench.pulses;
  parameters["freewheel"] = job.bench.freewheel;
  parameters["at_supply"] = job.bench.voltage_at_supply;

  const synthetic::DrivenRampTruth& t = record.truth;
  const auto number = [](double v) { return std::isfinite(v) ? nlohmann::ordered_json(v) : nlohmann::ordered_json(nullptr); };
  nlohmann::ordered_json truth = {{"L_0", t.l_0_h},
                                  {"I_sat_10", number(t.i_sat_a[0])},
                                  {"I_sat_20", number(t.i_sat_a[1])},
                                  {"I_sat_30", number(t.i_sat_a[2])},
                                  {"I_sat_10_secant", number(t.i_sat_secant_a[0])},
                                  {"I_sat_20_secant", number(t.i_sat_secant_a[1])},
                                  {"I_sat_30_secant", number(t.i_sat_secant_a[2])},
                                  {"R_dc", t.r_dc_ohm},
                                  {"E_max", t.peak_energy_j},
                                  {"W_loop", number(t.w_loop_j)},
                                  {"peak_current_A", t.peak_current_a},
                                  {"peak_flux_Wb", t.peak_flux_wb},
                                  {"drive_time_s", t.drive_time_s}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "ramp"},
                    {"seed", job.bench.seed},
                    {"capture", {{"file", json_safe(job.capture_file)}, {"sha256", sha256_of(capture)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const RampParameter> ramp_parameters() {
  return kParameters;
}

Result<synthetic::DrivenRampTruth> run_simulate_ramp(const SimulateRampJob& job, const RunContext& context) {
  if (job.truth_file == job.capture_file) {
    return failure(Problem::usage, "--truth", "capture and truth would go to the same place",
                   "give --truth a file of its own");
  }
  Result<synthetic::DrivenRampRecord> record = simulate_driven_ramp(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  record->capture.dialect.settings["origin"] = "simulated: coilassay simulate ramp --seed " + std::to_string(job.bench.seed);
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
