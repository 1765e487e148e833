// coilassay sweep
#include "app/runs/sweep_run.h"

#include "app/commands/command_list.h"
#include "app/commands/driven_options.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

/// A length or a delay: the unit tells which.
Result<std::optional<ReferencePlane>> plane_of(const Arguments& arguments) {
  const auto typed = arguments.text("--reference-plane");
  const auto factor = arguments.plain("--velocity-factor"), line = arguments.plain("--line-impedance");
  if (!typed) {
    if (!factor && !line) return std::nullopt;
    return failure(Problem::usage, factor ? "--velocity-factor" : "--line-impedance", "there is no line it could belong to",
                   "give the line with --reference-plane 12mm, or leave it out");
  }
  Result<StatedValue> shift = parse_value(*typed, Unit::metre, "--reference-plane");
  if (!shift && shift.error().problem == Problem::wrong_unit) shift = parse_value(*typed, Unit::second, "--reference-plane");
  if (!shift) return failure(shift);
  if (factor && shift->unit == Unit::second) {
    return failure(Problem::usage, "--velocity-factor", "a delay needs no velocity", "leave it out, or give the line as a length");
  }
  return ReferencePlane{*shift, factor.value_or(1), line.value_or(50)};
}

Result<void> take_preparation(const Arguments& arguments, SweepJob& job) {
  SweepPreparation& p = job.preparation;
  p.from_waveform = arguments.has("--from-waveform");
  if (const auto connection = arguments.text("--connection")) p.connection = *parse_connection(*connection);
  if (const auto port = arguments.count("--port")) p.port = static_cast<std::size_t>(*port);
  p.remove_port1 = arguments.text("--remove-port1");
  p.remove_port2 = arguments.text("--remove-port2");
  if (const auto set = arguments.text("--fixture")) job.stated.fixture_set = *set;
  const auto plane = plane_of(arguments);
  if (!plane) return failure(plane);
  p.plane = *plane;
  return {};
}

Result<SweepJob> job_of(const Arguments& arguments) {
  SweepJob job;
  job.files = arguments.words();
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  if (auto taken = take_current(arguments, job.stated); !taken) return failure(taken);
  if (const auto ratio = arguments.plain("--accuracy")) job.stated.impedance.ratio = StatedValue::unstated(*ratio, Unit::one);
  job.at_hz = arguments.all_plain("--at");
  job.from_s = arguments.plain("--from");
  job.to_s = arguments.plain("--to");
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  job.netlist_file = arguments.text("--netlist");
  job.touchstone_file = arguments.text("--touchstone");
  job.saturation_file = arguments.text("--saturation");
  if (auto taken = take_preparation(arguments, job); !taken) return failure(taken);
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<SweepJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  const Result<Measurement> measured = run_sweep(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

OptionGroup sweep_options() {
  return {.title = "Sweep",
          .options = {{.name = "--from-waveform",
                       .help = "the files are captures of a pulse, a chirp or noise: voltage and current over time"},
                      {.name = "--at",
                       .kind = ValueKind::plain,
                       .value_name = "FREQ",
                       .help = "frequency at which Z, L_s, R_s, L_p, R_p, Q and D are wanted; repeatable",
                       .example = "100kHz",
                       .unit = Unit::hertz,
                       .range = Range::positive,
                       .repeatable = true},
                      {.name = "--accuracy",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "half-width of the analyser's error, of Z in size and in angle; ±0.5 % unless stated",
                       .example = "0.1%",
                       .unit = Unit::one,
                       .range = Range::not_negative,
                       .below = 1}}};
}

OptionGroup fixture_options() {
  return {.title = "Ports and fixture",
          .options = {{.name = "--fixture",
                       .kind = ValueKind::file,
                       .value_name = "SET",
                       .help = "compensation set of coilassay fixture that is taken out",
                       .example = "tweezers.toml"},
                      {.name = "--connection",
                       .kind = ValueKind::choice,
                       .value_name = "HOW",
                       .help = "on one port (the default), from port to port in series, or across a line between them",
                       .example = "series",
                       .choices = {"reflect", "series", "shunt"}},
                      {.name = "--port",
                       .kind = ValueKind::count,
                       .value_name = "N",
                       .help = "which port of a file of several",
                       .example = "2",
                       .least = 1,
                       .most = 99},
                      {.name = "--remove-port1",
                       .kind = ValueKind::file,
                       .value_name = "FILE.s2p",
                       .help = "two-port between port 1 and the part, its own port 1 on the analyser's side",
                       .example = "adapter.s2p"},
                      {.name = "--remove-port2",
                       .kind = ValueKind::file,
                       .value_name = "FILE.s2p",
                       .help = "the same at port 2",
                       .example = "cable.s2p"},
                      {.name = "--reference-plane",
                       .kind = ValueKind::text,
                       .value_name = "VALUE",
                       .help = "length or one-way delay of a line between analyser and part; positive moves the plane towards the part",
                       .example = "12mm±0.5mm"},
                      {.name = "--velocity-factor",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "of that line, 1 unless given",
                       .example = "0.66",
                       .unit = Unit::one,
                       .range = Range::positive,
                       .below = 1.0000001},
                      {.name = "--line-impedance",
                       .kind = ValueKind::plain,
                       .value_name = "VALUE",
                       .help = "of that line, 50 Ω unless given",
                       .example = "75ohm",
                       .unit = Unit::ohm,
                       .range = Range::positive}}};
}

OptionGroup model_out() {
  return {.title = "Models",
          .options = {{.name = "--netlist",
                       .kind = ValueKind::file,
                       .value_name = "FILE.cir",
                       .help = "writes the circuit as a SPICE subcircuit, the skin effect as a passive ladder",
                       .example = "coil.cir"},
                      {.name = "--saturation",
                       .kind = ValueKind::file,
                       .value_name = "RAMP.json",
                       .help = "result of ramp --json: the netlist's inductance follows its L(i)",
                       .example = "ramp.json"},
                      {.name = "--touchstone",
                       .kind = ValueKind::file,
                       .value_name = "FILE.s1p",
                       .help = "writes the fitted circuit at the frequencies of the sweep",
                       .example = "coil.s1p"}}};
}

/// Those of a driven coil, for captures of a steady sine; the winding's resistance is found here.
OptionGroup sine_options() {
  OptionGroup group = current_options();
  group.title = "Captures of a steady sine or a burst";
  std::erase_if(group.options, [](const Option& each) { return each.name == "--dcr"; });
  return group;
}

}  // namespace

Command sweep_command() {
  return {
      .name = "sweep",
      .summary = "circuit of a coil from its impedance over frequency",
      .description =
          "Reads Z, Y or S against frequency (tables in many pairs of quantities, Touchstone) and fits the coil's circuit: L and R_dc, "
          "the law of its AC resistance, the capacitance and loss across it. Which of these the data show is decided by the data; what they do "
          "not show is given as a limit. Every sweep is tested for points that no passive circuit could have made.\n"
          "Several files are captures of a steady sine, one frequency each: the sweep is made from them. With --from-waveform the files are "
          "captures of one pulse, chirp or noise. What the fixture adds is taken out with --fixture.",
      .positional = {.name = "FILE",
                     .help = "one sweep, five and more captures of sines, or captures of a burst; '-' is standard input",
                     .least = 1,
                     .most = 1000},
      .groups = {sweep_options(), fixture_options(), sine_options(), reading_options(), window_options(), conditions_options(), uncertainty_options(),
                 model_out(), output_options(), measuring_options()},
      .examples = {{"sweep coil.csv --accuracy 0.1% --at 100kHz --at 1MHz",
                    "the circuit, its self-resonance, and apparent values at two frequencies"},
                   {"sweep coil.s1p --figure coil.svg --netlist coil.cir",
                    "of a network analyser's file, with a figure and a model for a simulator"},
                   {"sweep 1k.csv 3k.csv 10k.csv 30k.csv 99k.csv --shunt 0.1ohm",
                    "a sweep made by hand, one capture for each frequency"},
                   {"sweep pulse.csv --from-waveform --shunt 1ohm±1% --skew 4ns±1ns",
                    "a sweep from one captured pulse"}},
      .run = run};
}

}  // namespace coilassay
