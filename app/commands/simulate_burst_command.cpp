// coilassay simulate burst
#include <cmath>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_burst_run.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

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

/// The option of a parameter of the run: "--shunt-inductance" for "shunt_inductance".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  using synthetic::BurstKind;
  SimulateBurstJob job;
  for (const BurstParameter& each : burst_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) job.bench.*each.member = *given;
  }
  const std::string kind = arguments.text("--burst").value_or("pulse");
  job.bench.kind = kind == "chirp" ? BurstKind::chirp : kind == "noise" ? BurstKind::noise : BurstKind::pulse;
  if (const auto samples = arguments.count("--samples")) job.bench.samples = static_cast<std::size_t>(*samples);
  if (const auto pulses = arguments.count("--pulses")) job.bench.pulses = static_cast<std::size_t>(*pulses);
  if (const auto bits = arguments.count("--bits")) job.bench.bits = static_cast<int>(*bits);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  const auto capture_file = arguments.text("-o");
  if (!capture_file) {
    return failure(Problem::usage, "-o", "it is not said where the capture goes",
                   "write it like -o burst.csv; '-' is standard output");
  }
  job.capture_file = *capture_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_burst(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.capture_file != "-") {
    const Script script = console.surroundings().script;
    const std::string resonance =
        std::isnan(truth->f_r_hz) ? std::string("no self-resonance") : "f_r " + to_text(truth->f_r_hz, Unit::hertz, script);
    console.say("wrote " + shown(job.capture_file) + ": a " + std::string(name(job.bench.kind)) + " into L " +
                to_text(truth->l_h, Unit::henry, script) + ", R_dc " + to_text(truth->r_dc_ohm, Unit::ohm, script) + ", C_par " +
                to_text(truth->c_par_f, Unit::farad, script) + ", " + resonance);
  }
  return ExitCode::done;
}

OptionGroup coil() {
  using enum Range;
  return {"Coil",
          {parameter("--inductance", "VALUE", Unit::henry, positive, "inductance, 100 µH unless given", "22uH"),
           parameter("--resistance", "VALUE", Unit::ohm, not_negative, "series resistance, 0.5 Ω unless given", "0.2ohm"),
           parameter("--parallel-capacitance", "VALUE", Unit::farad, positive, "the winding's own capacitance, 10 pF unless given", "8pF"),
           parameter("--parallel-resistance", "VALUE", Unit::ohm, not_negative, "loss across the coil; none unless given", "20k")}};
}

OptionGroup source() {
  using enum Range;
  return {"Source",
          {{.name = "--burst",
            .kind = ValueKind::choice,
            .value_name = "KIND",
            .help = "what the source gives; pulse unless given",
            .example = "chirp",
            .choices = {"pulse", "chirp", "noise"}},
           parameter("--amplitude", "VALUE", Unit::volt, not_negative, "peak without load, of noise r.m.s.; 5 V unless given", "2V"),
           parameter("--source-resistance", "VALUE", Unit::ohm, positive, "50 Ω unless given", "10ohm"),
           parameter("--width", "TIME", Unit::second, positive, "of a pulse, 400 ns unless given", "1us"),
           parameter("--rise", "TIME", Unit::second, positive, "of its edges, 100 ns unless given", "50ns"),
           {.name = "--pulses",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "how many, spread evenly over the record; 1 unless given",
            .example = "10",
            .least = 1,
            .most = 1'000'000},
           parameter("--lowest", "FREQ", Unit::hertz, not_negative, "where a chirp begins, and noise; 20 kHz unless given", "1kHz"),
           parameter("--highest", "FREQ", Unit::hertz, positive, "where it ends; 5 MHz unless given", "2MHz"),
           parameter("--filled", "RATIO", Unit::one, positive,
                     "share of the record a chirp takes, 0.6 unless given; at 1 it neither begins nor ends", "0.8")}};
}

OptionGroup current() {
  using enum Range;
  return {"Current channel",
          {parameter("--shunt", "VALUE", Unit::ohm, not_negative,
                     "sense resistor: the channel is then in volts; in ampere unless given", "0.1ohm"),
           parameter("--shunt-inductance", "VALUE", Unit::henry, not_negative, "of the sense resistor", "2nH"),
           parameter("--skew", "TIME", Unit::second, any, "delay behind the voltage channel", "4ns"),
           parameter("--current-noise", "VALUE", Unit::ampere, not_negative, "r.m.s. noise", "10uA"),
           parameter("--current-offset", "VALUE", Unit::ampere, any, "of the channel", "1mA"),
           parameter("--current-scale", "RATIO", Unit::one, any, "what the scope shows of an ampere, 1 unless given", "1.02"),
           parameter("--current-full-scale", "VALUE", Unit::ampere, not_negative,
                     "largest current it can show; 1.2 times the largest unless given", "1A")}};
}

OptionGroup scope() {
  using enum Range;
  return {"Voltage channel and scope",
          {parameter("--noise", "VALUE", Unit::volt, not_negative, "r.m.s. noise of the voltage", "2mV"),
           parameter("--offset", "VALUE", Unit::volt, any, "of the voltage channel", "10mV"),
           parameter("--scale", "RATIO", Unit::one, any, "what the scope shows of a volt, 1 unless given", "1.02"),
           parameter("--full-scale", "VALUE", Unit::volt, not_negative,
                     "largest voltage it can show; 1.2 times the largest unless given", "5V"),
           {.name = "--samples",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "length of the record, 20000 unless given",
            .example = "50000",
            .least = 64,
            .most = 20'000'000},
           parameter("--interval", "TIME", Unit::second, positive, "between samples, 10 ns unless given", "20ns"),
           parameter("--pretrigger", "RATIO", Unit::one, not_negative, "share of the record before the burst, 0.05 unless given", "0.1"),
           parameter("--timebase", "RATIO", Unit::one, any, "how much too long its seconds are", "25ppm"),
           {.name = "--bits",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the converter; not quantised unless given",
            .example = "12",
            .least = 1,
            .most = 24}}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the capture, as CSV; '-' is standard output",
            .example = "burst.csv"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the coil's elements, as JSON",
            .example = "burst.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of noise in source and channels, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

}  // namespace

Command simulate_burst_command() {
  return {.name = "simulate burst",
          .summary = "a simulated pulse, chirp or noise, with its truth",
          .description =
              "Steps a coil behind a source exactly and looks at voltage and current through a simulated two-channel scope: a "
              "capture for sweep --from-waveform. What a real bench would not tell, the truth, goes to a file of its own.",
          .groups = {files(), coil(), source(), current(), scope(), everywhere_options()},
          .examples = {{"simulate burst -o pulse.csv --noise 2mV --bits 12",
                        "one pulse between quiet ends"},
                       {"simulate burst -o noise.csv --burst noise --samples 200000",
                        "steady noise, for averaged segments"}},
          .run = run};
}

}  // namespace coilassay
