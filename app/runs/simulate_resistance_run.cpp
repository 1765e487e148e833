#include "app/runs/simulate_resistance_run.h"

#include <array>
#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/capture_writer.h"
#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using synthetic::DrivenResistanceBench;
using synthetic::DrivenResistanceRecord;
using synthetic::DrivenResistanceTruth;

constexpr std::array kParameters = {
    DrivenResistanceParameter{"resistance", Unit::ohm, &DrivenResistanceBench::resistance_20_ohm},
    DrivenResistanceParameter{"temperature_coefficient", Unit::one, &DrivenResistanceBench::coefficient_per_k},
    DrivenResistanceParameter{"temperature", Unit::degree_celsius, &DrivenResistanceBench::temperature_degc},
    DrivenResistanceParameter{"thermal_resistance", Unit::one, &DrivenResistanceBench::thermal_resistance_k_per_w},
    DrivenResistanceParameter{"thermal_time", Unit::second, &DrivenResistanceBench::thermal_time_s},
    DrivenResistanceParameter{"preheat", Unit::second, &DrivenResistanceBench::preheat_s},
    DrivenResistanceParameter{"current", Unit::ampere, &DrivenResistanceBench::current_a},
    DrivenResistanceParameter{"ripple", Unit::ampere, &DrivenResistanceBench::current_noise_a},
    DrivenResistanceParameter{"thermal_offset", Unit::volt, &DrivenResistanceBench::thermal_offset_v},
    DrivenResistanceParameter{"noise", Unit::volt, &DrivenResistanceBench::noise_v},
    DrivenResistanceParameter{"current_noise", Unit::ampere, &DrivenResistanceBench::noise_a},
    DrivenResistanceParameter{"scale", Unit::one, &DrivenResistanceBench::scale_v},
    DrivenResistanceParameter{"current_scale", Unit::one, &DrivenResistanceBench::scale_a},
    DrivenResistanceParameter{"digit", Unit::volt, &DrivenResistanceBench::digit_v},
    DrivenResistanceParameter{"current_digit", Unit::ampere, &DrivenResistanceBench::digit_a},
    DrivenResistanceParameter{"shunt", Unit::ohm, &DrivenResistanceBench::shunt_ohm},
    DrivenResistanceParameter{"interval", Unit::second, &DrivenResistanceBench::interval_s},
};

std::string truth_document(const SimulateResistanceJob& job, const DrivenResistanceTruth& t, const std::string& capture) {
  nlohmann::ordered_json parameters;
  for (const DrivenResistanceParameter& each : kParameters) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    parameters[key] = job.bench.*each.member;
  }
  parameters["readings"] = job.bench.readings;
  parameters["before_reversal"] = job.bench.before_reversal;
  parameters["one_polarity"] = job.bench.one_polarity;
  const nlohmann::ordered_json truth = {{"R_dc", t.r_dc_ohm},
                                        {"R_dc_20", t.r_dc_20_ohm},
                                        {"R_dc_last", t.r_dc_last_ohm},
                                        {"warming_K", t.warming_k}};
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "resistance"},
                    {"seed", job.bench.seed},
                    {"capture", {{"file", json_safe(job.capture_file)}, {"sha256", sha256_of(capture)}}},
                    {"parameters", parameters},
                    {"truth", truth}});
}

}  // namespace

std::span<const DrivenResistanceParameter> driven_resistance_parameters() { return kParameters; }

Result<DrivenResistanceTruth> run_simulate_resistance(const SimulateResistanceJob& job, const RunContext& context) {
  if (job.truth_file == job.capture_file) {
    return failure(Problem::usage, "--truth", "readings and truth would go to the same place",
                   "give --truth a file of its own");
  }
  Result<DrivenResistanceRecord> record = simulate_driven_resistance(job.bench);
  if (!record) return failure(record);
  // Whoever meets the file later must not take it for a measurement.
  record->capture.dialect.settings["origin"] =
      "simulated: coilassay simulate resistance --seed " + std::to_string(job.bench.seed);
  std::ostringstream capture;
  write_capture_csv(capture, record->capture);
  if (const Result<void> written = context.write(job.capture_file, capture.str()); !written) return failure(written);
  if (job.truth_file) {
    const std::string truth = truth_document(job, record->truth, capture.str());
    if (const Result<void> written = context.write(*job.truth_file, truth); !written) return failure(written);
  }
  return record->truth;
}

}  // namespace coilassay
