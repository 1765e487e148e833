#include "app/runs/simulate_sine_run.h"

#include <array>
#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/capture_writer.h"
#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using synthetic::DrivenSineBench;
using synthetic::DrivenSineRecord;
using synthetic::DrivenSineTruth;

constexpr std::array kParameters = {
    SineParameter{"inductance", Unit::henry, &DrivenSineBench::inductance_h},
    SineParameter{"resistance", Unit::ohm, &DrivenSineBench::resistance_ohm},
    SineParameter{"parallel_capacitance", Unit::farad, &DrivenSineBench::parallel_capacitance_f},
    SineParameter{"saturation", Unit::one, &DrivenSineBench::saturation_per_a2},
    SineParameter{"third_harmonic", Unit::one, &DrivenSineBench::third_harmonic_ratio},
    SineParameter{"frequency", Unit::hertz, &DrivenSineBench::frequency_hz},
    SineParameter{"amplitude", Unit::volt, &DrivenSineBench::amplitude_v},
    SineParameter{"phase", Unit::radian, &DrivenSineBench::phase_rad},
    SineParameter{"bias", Unit::ampere, &DrivenSineBench::bias_a},
    SineParameter{"shunt", Unit::ohm, &DrivenSineBench::shunt_ohm},
    SineParameter{"shunt_inductance", Unit::henry, &DrivenSineBench::shunt_inductance_h},
    SineParameter{"skew", Unit::second, &DrivenSineBench::skew_s},
    SineParameter{"current_probe_corner", Unit::hertz, &DrivenSineBench::probe_corner_hz},
    SineParameter{"current_offset", Unit::ampere, &DrivenSineBench::current_offset_a},
    SineParameter{"current_scale", Unit::one, &DrivenSineBench::current_gain},
    SineParameter{"current_noise", Unit::ampere, &DrivenSineBench::current_noise_a},
    SineParameter{"current_full_scale", Unit::ampere, &DrivenSineBench::current_full_scale_a},
    SineParameter{"offset", Unit::volt, &DrivenSineBench::voltage_offset_v},
    SineParameter{"scale", Unit::one, &DrivenSineBench::voltage_gain},
    SineParameter{"noise", Unit::volt, &DrivenSineBench::voltage_noise_v},
    SineParameter{"full_scale", Unit::volt, &DrivenSineBench::voltage_full_scale_v},
    SineParameter{"interval", Unit::second, &DrivenSineBench::sample_interval_s},
    SineParameter{"timebase", Unit::one, &DrivenSineBench::timebase_error},
};

std::string truth_document(const SimulateSineJob& job, const DrivenSineRecord& record, const std::string& capture) {
  nlohmann::ordered_json parameters;
  for (const SineParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = job.bench.*each.member;
  }
  parameters["interval_s"] = record.capture.time.step_s;  // as simulated, also when it was left to the program
  parameters["samples"] = job.bench.samples;
  parameters["bits"] = job.bench.bits;
  parameters["over_shunt"] = job.bench.over_shunt;
  const DrivenSineTruth& t = record.truth;
  nlohmann::ordered_json truth = {{"f", t.f_hz},     {"Z", t.z_ohm},     {"phi", t.phi_rad}, {"R_s", t.r_s_ohm},
                                  {"X_s", t.x_s_ohm}, {"L_s", t.l_s_h},   {"R_p", t.r_p_ohm}, {"L_p", t.l_p_h},
                                  {"Q", t.q},        {"D", t.d},         {"P", t.p_w},       {"peak_current_A", t.current_a}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "sine"},
                    {"seed", job.bench.seed},
                    {"capture", {{"file", json_safe(job.capture_file)}, {"sha256", sha256_of(capture)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const SineParameter> sine_parameters() { return kParameters; }

Result<DrivenSineTruth> run_simulate_sine(const SimulateSineJob& job, const RunContext& context) {
  if (job.truth_file == job.capture_file) {
    return failure(Problem::usage, "--truth", "capture and truth would go to the same place",
                   "give --truth a file of its own");
  }
  Result<DrivenSineRecord> record = simulate_driven_sine(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  record->capture.dialect.settings["origin"] = "simulated: coilassay simulate sine --seed " + std::to_string(job.bench.seed);
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
