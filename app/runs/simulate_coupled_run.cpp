#include "app/runs/simulate_coupled_run.h"

#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/port_writer.h"
#include "acquire/sweep_writer.h"
#include "app/runs/version.h"
#include "base/digest.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

std::string origin(const SimulateCoupledJob& job) {
  return "simulated: coilassay simulate coupled --seed " + std::to_string(job.windings.seed);
}

/// "pair.s2p" says two ports; zero: no port file.
std::size_t ports_of(const std::string& output) {
  const std::size_t dot = output.rfind(".s");
  if (dot == std::string::npos || dot + 4 != output.size() || output.back() != 'p') return 0;
  const char digit = output[dot + 2];
  return digit >= '1' && digit <= '9' ? static_cast<std::size_t>(digit - '0') : 0;
}

std::string truth_document(const SimulateCoupledJob& job, const synthetic::CoupledTruth& t, const Json& captures) {
  const synthetic::CoupledWindings& w = job.windings;
  Json windings = Json::array();
  for (const synthetic::Winding& each : w.windings) {
    windings.push_back({{"inductance_H", each.inductance_h},
                        {"resistance_ohm", each.resistance_ohm},
                        {"skin_ohm", each.skin_ohm},
                        {"capacitance_F", each.capacitance_f}});
  }
  return json_text({{"schema", "coilassay.truth/1"},
                    {"program", program_name()},
                    {"kind", "coupled"},
                    {"seed", w.seed},
                    {"capture", captures.front()},
                    {"captures", captures},
                    {"parameters",
                     {{"windings", windings},
                      {"coupling", w.coupling},
                      {"link_inductance_H", w.link_h},
                      {"link_resistance_ohm", w.link_ohm},
                      {"swapped_ports", w.swapped_ports},
                      {"not_reciprocal", w.not_reciprocal},
                      {"noise", w.noise_ratio},
                      {"from_Hz", w.first_hz},
                      {"to_Hz", w.last_hz},
                      {"points", w.points}}},
                    {"truth",
                     {{"L_1", t.l1_h},
                      {"L_2", t.l2_h},
                      {"M", t.m_h},
                      {"k", t.k},
                      {"n", t.n},
                      {"L_leak_1", t.leak1_h},
                      {"L_leak_2", t.leak2_h}}}});
}

}  // namespace

Result<SimulateCoupledDone> run_simulate_coupled(const SimulateCoupledJob& job, const RunContext& context) {
  const std::size_t n = job.windings.windings.size(), ports = ports_of(job.output);
  if (job.output == "-" || (ports != 0 && ports != n)) {
    return failure(Problem::usage, "-o", job.output == "-" ? "there are several files to write" : "the ending does not suit the number of windings",
                   "write it like -o pair.s" + std::to_string(n) + "p for a port file, or -o pair for one table each connection");
  }
  if (job.truth_file == job.output) {
    return failure(Problem::usage, "--truth", "capture and truth would go to the same place", "give --truth a file of its own");
  }
  const Result<synthetic::CoupledTruth> truth = synthetic::coupled_truth(job.windings);
  if (!truth) return failure(truth);
  SimulateCoupledDone done{*truth, {}};
  Json captures = Json::array();
  const auto store = [&](const std::string& file, const std::string& text) -> Result<void> {
    if (const Result<void> written = context.write(file, text); !written) return failure(written);
    done.files.push_back(file);
    captures.push_back({{"file", json_safe(file)}, {"sha256", sha256_of(text)}});
    return {};
  };
  if (ports != 0) {
    Result<Sweep> sweep = synthetic::simulate_ports(job.windings);
    if (!sweep) return failure(sweep);
    std::ostringstream text;
    write_touchstone_impedance(text, *sweep, "origin " + origin(job));
    if (const auto stored = store(job.output, text.str()); !stored) return failure(stored);
  } else {
    using enum synthetic::Connection;
    for (const synthetic::Connection connection : {primary_open, primary_short, secondary_open, secondary_short, aiding, opposing}) {
      Result<Sweep> sweep = synthetic::simulate_connection(job.windings, connection);
      if (!sweep) return failure(sweep);
      // Whoever meets the file later must not take it for a measurement.
      sweep->dialect.settings["origin"] = origin(job);
      std::ostringstream text;
      write_sweep_csv(text, *sweep, SweepColumns::impedance);
      if (const auto stored = store(job.output + "-" + std::string(name(connection)) + ".csv", text.str()); !stored) return failure(stored);
    }
  }
  if (job.truth_file) {
    if (const auto written = context.write(*job.truth_file, truth_document(job, *truth, captures)); !written) return failure(written);
  }
  return done;
}

}  // namespace coilassay
