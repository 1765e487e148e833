// coilassay simulate ringdown
#include <ostream>
#include <vector>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_run.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using synthetic::RingDownBench;

Option parameter(std::string_view name, std::string_view value_name, Unit unit, Range range, std::string_view help,
                 std::string_view example) {
  return {.name = name,
          .kind = ValueKind::plain,
          .value_name = value_name,
          .help = help,
          .example = example,
          .unit = unit,
          .range = range};
}

/// The option of a parameter of the run: "--probe-capacitance" for "probe_capacitance".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateRingDownJob job;
  for (const RingDownParameter& each : ring_down_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) job.bench.*each.member = *given;
  }
  if (const auto samples = arguments.count("--samples")) job.bench.samples = static_cast<std::size_t>(*samples);
  if (const auto bits = arguments.count("--bits")) job.bench.bits = static_cast<int>(*bits);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  job.bench.drive_channel = arguments.has("--drive-channel");
  const auto capture_file = arguments.text("-o");
  if (!capture_file) {
    return failure(Problem::usage, "-o", "it is not said where the capture goes",
                   "write it like -o ring.csv; '-' is standard output");
  }
  job.capture_file = *capture_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_ring_down(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.capture_file != "-") {
    const Script script = console.surroundings().script;
    console.say("wrote " + shown(job.capture_file) + ": L_s " + to_text(truth->l_s_h, Unit::henry, script) + ", R_s " +
                to_text(truth->r_s_ohm, Unit::ohm, script) + ", f_0 " + to_text(truth->f_0_hz, Unit::hertz, script) +
                ", Q " + to_text(truth->q, Unit::one, script));
  }
  return ExitCode::done;
}

OptionGroup coil() {
  using enum Range;
  return {
      "Coil",
      {parameter("--inductance", "VALUE", Unit::henry, positive, "inductance, 47 µH unless given", "22uH"),
       parameter("--resistance", "VALUE", Unit::ohm, not_negative,
                 "series resistance at resonance, 0.35 Ω unless given", "0.5ohm"),
       parameter("--parallel-capacitance", "VALUE", Unit::farad, not_negative, "the winding's own capacitance", "8pF"),
       parameter("--saturation", "NUMBER", Unit::one, not_negative,
                 "how the inductance falls with current i: L / (1 + NUMBER i²), in 1/A²", "2")}};
}

OptionGroup across() {
  using enum Range;
  return {
      "Across the coil",
      {parameter("--capacitor", "VALUE", Unit::farad, positive, "the added capacitor, 10 nF unless given", "4n7"),
       parameter("--capacitor-dissipation", "RATIO", Unit::one, not_negative, "its dissipation factor", "0.001"),
       parameter("--probe-capacitance", "VALUE", Unit::farad, not_negative, "of probe and input, 13 pF unless given",
                 "13pF"),
       parameter("--probe-resistance", "VALUE", Unit::ohm, positive, "of probe and input, 10 MΩ unless given", "1M"),
       parameter("--across", "VALUE", Unit::ohm, not_negative, "resistance that stays connected, none unless given",
                 "10kohm"),
       parameter("--across-capacitance", "VALUE", Unit::farad, not_negative, "capacitance that stays connected",
                 "5pF")}};
}

OptionGroup second_mode() {
  using enum Range;
  return {"Second mode",
          {parameter("--second-amplitude", "RATIO", Unit::one, any,
                     "amplitude of a second ringing, relative to the first", "0.1"),
           parameter("--second-frequency", "RATIO", Unit::one, positive, "its frequency, 1.3 unless given", "1.05"),
           parameter("--second-decay", "RATIO", Unit::one, not_negative, "its decay rate, 1 unless given", "2")}};
}

OptionGroup release() {
  using enum Range;
  return {"Release",
          {parameter("--initial-current", "VALUE", Unit::ampere, any, "in the coil at the release, 50 mA unless given",
                     "100mA"),
           parameter("--initial-voltage", "VALUE", Unit::volt, any, "on the capacitor at the release", "1V"),
           parameter("--drive-time", "TIME", Unit::second, not_negative,
                     "length of a driven stretch before the release", "50us"),
           parameter("--drive-frequency", "FREQ", Unit::hertz, not_negative, "of the drive; a steady one unless given",
                     "100kHz"),
           parameter("--transient", "RATIO", Unit::one, any,
                     "a fast transient after the release, relative to the amplitude", "0.1"),
           parameter("--transient-time", "TIME", Unit::second, not_negative, "its time constant", "200ns")}};
}

OptionGroup scope() {
  using enum Range;
  return {"Scope",
          {{.name = "--samples",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "length of the record, 20000 unless given",
            .example = "5000",
            .least = 2,
            .most = 100'000'000},
           parameter("--interval", "TIME", Unit::second, positive,
                     "between samples; chosen to suit the decay unless given", "20ns"),
           parameter("--pretrigger", "RATIO", Unit::one, not_negative,
                     "share of the record before the release, 0.1 unless given", "0.2"),
           parameter("--noise", "VALUE", Unit::volt, not_negative, "r.m.s. noise", "2mV"),
           parameter("--offset", "VALUE", Unit::volt, any, "of the voltage channel", "10mV"),
           parameter("--scale", "RATIO", Unit::one, positive, "what the scope shows of a volt, 1 unless given", "1.02"),
           parameter("--timebase", "RATIO", Unit::one, any, "how much too long its seconds are", "25ppm"),
           {.name = "--bits",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the converter; not quantised unless given",
            .example = "8",
            .least = 1,
            .most = 24},
           parameter("--full-scale", "VALUE", Unit::volt, positive,
                     "largest voltage it can show; 1.2 times the largest unless given", "5V"),
           {.name = "--drive-channel", .help = "a second channel that shows the drive"}}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the capture, as CSV; '-' is standard output",
            .example = "ring.csv"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the exact quantities of the circuit, as JSON",
            .example = "ring.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

}  // namespace

Command simulate_ring_down_command() {
  return {.name = "simulate ringdown",
          .summary = "a simulated free decay, written as a capture with its truth",
          .description =
              "Solves the circuit exactly and looks at it through a simulated scope. What a real bench would not "
              "tell, the truth, goes to a file of its own.",
          .groups = {files(), coil(), across(), release(), second_mode(), scope(), everywhere_options()},
          .examples = {{"simulate ringdown -o ring.csv --truth ring.json --noise 2mV --bits 8",
                        "a capture to try ringdown on, and what it ought to find"}},
          .run = run};
}

}  // namespace coilassay
