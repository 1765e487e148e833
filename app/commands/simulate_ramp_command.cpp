// coilassay simulate ramp
#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/simulate_ramp_run.h"
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

/// The option of a parameter of the run: "--knee-current" for "knee_current".
std::string option_of(std::string_view parameter_name) {
  std::string name = "--" + std::string(parameter_name);
  for (char& c : name) c = c == '_' ? '-' : c;
  return name;
}

synthetic::CoreKind kind_of(const std::string& word) {
  using enum synthetic::CoreKind;
  for (const synthetic::CoreKind kind : {knee, tanh, powder, ferrite, rising}) {
    if (synthetic::name(kind) == word) return kind;
  }
  return knee;   // the choices of the option hold no other word
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  SimulateRampJob job;
  for (const RampParameter& each : ramp_parameters()) {
    if (const auto given = arguments.plain(option_of(each.name))) each.member(job.bench) = *given;
  }
  if (const auto core = arguments.text("--core")) job.bench.core.kind = kind_of(*core);
  if (const auto samples = arguments.count("--samples")) job.bench.samples = static_cast<std::size_t>(*samples);
  if (const auto bits = arguments.count("--bits")) job.bench.bits = static_cast<int>(*bits);
  if (const auto pulses = arguments.count("--pulses")) job.bench.pulses = static_cast<std::size_t>(*pulses);
  if (const auto seed = arguments.count("--seed")) job.bench.seed = *seed;
  job.bench.freewheel = arguments.has("--freewheel") || job.bench.pulses > 1;
  job.bench.voltage_at_supply = arguments.has("--at-supply");
  const auto capture_file = arguments.text("-o");
  if (!capture_file) {
    return failure(Problem::usage, "-o", "it is not said where the capture goes",
                   "write it like -o ramp.csv; '-' is standard output");
  }
  job.capture_file = *capture_file;
  job.truth_file = arguments.text("--truth");

  const bool quiet = arguments.has("--quiet");
  RunSession session(arguments, console, quiet);
  const auto truth = run_simulate_ramp(job, session.context());
  session.end_progress();
  if (!truth) return failure(truth);
  if (!quiet && job.capture_file != "-") {
    const Script script = console.surroundings().script;
    console.say("wrote " + shown(job.capture_file) + ": L_0 " + to_text(truth->l_0_h, Unit::henry, script) + ", I_sat_30 " +
                to_text(truth->i_sat_a[2], Unit::ampere, script) + ", peak current " +
                to_text(truth->peak_current_a, Unit::ampere, script));
  }
  return ExitCode::done;
}

OptionGroup coil() {
  using enum Range;
  return {"Coil",
          {{.name = "--core",
            .kind = ValueKind::choice,
            .value_name = "KIND",
            .help = "how the inductance falls: knee (a gapped ferrite, the default), tanh, powder (soft), ferrite (sharp), "
                    "rising (first up, then down)",
            .example = "powder",
            .choices = {"knee", "tanh", "powder", "ferrite", "rising"}},
           parameter("--inductance", "VALUE", Unit::henry, positive, "at zero current, 10 µH unless given", "47uH"),
           parameter("--saturated-inductance", "VALUE", Unit::henry, positive, "far beyond the knee, 1 µH unless given",
                     "5uH"),
           parameter("--knee-current", "VALUE", Unit::ampere, positive, "10 A unless given", "3A"),
           parameter("--exponent", "NUMBER", Unit::one, positive, "sharpness of the kind knee, 6 unless given", "8"),
           parameter("--resistance", "VALUE", Unit::ohm, not_negative, "of the winding, 50 mΩ unless given", "0.1ohm"),
           parameter("--core-loss", "VALUE", Unit::ohm, not_negative, "eddy currents as a resistance across the coil", "500ohm"),
           parameter("--first-pulse", "RATIO", Unit::one, positive,
                     "inductance of the first pulse over that of the later ones, 1 unless given", "1.05")}};
}

OptionGroup drive() {
  using enum Range;
  return {"Drive",
          {parameter("--supply", "VALUE", Unit::volt, positive, "10 V unless given", "24V"),
           parameter("--switch-resistance", "VALUE", Unit::ohm, not_negative, "between supply and coil", "20mohm"),
           parameter("--bank-capacitance", "VALUE", Unit::farad, not_negative, "of a bank that sags; a stiff supply unless given",
                     "4.7mF"),
           parameter("--current-limit", "VALUE", Unit::ampere, not_negative, "of the switch, none unless given", "8A"),
           parameter("--peak-current", "VALUE", Unit::ampere, positive, "ends the drive, 15 A unless given", "5A"),
           parameter("--drive-time", "TIME", Unit::second, positive, "ends the drive instead", "20us"),
           {.name = "--freewheel", .help = "the record holds the fall through a diode"},
           parameter("--diode-voltage", "VALUE", Unit::volt, positive, "of that diode, 0.7 V unless given", "0.4V"),
           {.name = "--pulses",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "several pulses, each with its fall",
            .example = "4",
            .least = 1,
            .most = 1000},
           parameter("--rest", "RATIO", Unit::one, not_negative, "rest after each fall, in pulse lengths, 0.3 unless given",
                     "0.5")}};
}

OptionGroup current() {
  using enum Range;
  return {"Current channel",
          {parameter("--shunt", "VALUE", Unit::ohm, not_negative,
                     "sense resistor in the circuit: the channel is then in volts; in ampere unless given", "10mohm"),
           parameter("--shunt-inductance", "VALUE", Unit::henry, not_negative, "of the sense resistor", "2nH"),
           parameter("--skew", "TIME", Unit::second, any, "delay behind the voltage channel", "4ns"),
           parameter("--current-probe-corner", "FREQ", Unit::hertz, not_negative, "low corner of a current probe", "500Hz"),
           parameter("--current-noise", "VALUE", Unit::ampere, not_negative, "r.m.s. noise", "20mA"),
           parameter("--current-offset", "VALUE", Unit::ampere, any, "of the channel", "50mA"),
           parameter("--current-scale", "RATIO", Unit::one, any, "what the scope shows of an ampere, 1 unless given", "1.02"),
           parameter("--current-full-scale", "VALUE", Unit::ampere, not_negative,
                     "largest current it can show; 1.2 times the largest unless given", "20A")}};
}

OptionGroup scope() {
  using enum Range;
  return {"Voltage channel and scope",
          {{.name = "--at-supply", .help = "the voltage is taken at the supply, not over the coil"},
           parameter("--noise", "VALUE", Unit::volt, not_negative, "r.m.s. noise of the voltage", "20mV"),
           parameter("--offset", "VALUE", Unit::volt, any, "of the voltage channel", "50mV"),
           parameter("--scale", "RATIO", Unit::one, any, "what the scope shows of a volt, 1 unless given", "1.02"),
           parameter("--full-scale", "VALUE", Unit::volt, not_negative,
                     "largest voltage it can show; 1.2 times the largest unless given", "12.5V"),
           {.name = "--samples",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "length of the record, 10000 unless given",
            .example = "5000",
            .least = 16,
            .most = 50'000'000},
           parameter("--interval", "TIME", Unit::second, positive, "between samples; the record just holds the pulses unless given",
                     "2ns"),
           parameter("--pretrigger", "RATIO", Unit::one, not_negative, "share of the record before the drive, 0.1 unless given",
                     "0.2"),
           parameter("--timebase", "RATIO", Unit::one, any, "how much too long its seconds are", "25ppm"),
           {.name = "--bits",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the converter; not quantised unless given",
            .example = "8",
            .least = 1,
            .most = 24}}};
}

OptionGroup files() {
  return {"Files and seed",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the capture, as CSV; '-' is standard output",
            .example = "ramp.csv"},
           {.name = "--truth",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "every parameter and the exact quantities of the coil, as JSON",
            .example = "ramp.json"},
           {.name = "--seed",
            .kind = ValueKind::count,
            .value_name = "N",
            .help = "of the noise, 1 unless given; the same seed gives the same file",
            .example = "7"}}};
}

}  // namespace

Command simulate_ramp_command() {
  return {.name = "simulate ramp",
          .summary = "a simulated saturation test, as a capture with its truth",
          .description =
              "Steps the non-linear circuit of coil, switch and supply and looks at it through a simulated two-channel scope. "
              "What a real bench would not tell, the truth, goes to a file of its own.",
          .groups = {files(), coil(), drive(), current(), scope(), everywhere_options()},
          .examples = {{"simulate ramp -o ramp.csv --truth ramp.json --noise 50mV --bits 8",
                        "a capture to try ramp on, and what it ought to find"}},
          .run = run};
}

}  // namespace coilassay
