// coilassay coupling
#include "app/runs/coupling_run.h"

#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/driven_options.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/version.h"
#include "report/advice_document.h"

namespace coilassay {

namespace {

constexpr CouplingItem kItems[] = {CouplingItem::primary_open,   CouplingItem::primary_short, CouplingItem::secondary_open,
                                   CouplingItem::secondary_short, CouplingItem::aiding,        CouplingItem::opposing,
                                   CouplingItem::ratio_forward,  CouplingItem::ratio_reverse};

/// "0.2ohm±1%,0.3ohm": values with commas between.
std::vector<std::string> parts_of(const std::string& text) {
  std::vector<std::string> parts;
  std::size_t from = 0;
  for (std::size_t comma; (comma = text.find(',', from)) != std::string::npos; from = comma + 1) parts.push_back(text.substr(from, comma - from));
  parts.push_back(text.substr(from));
  return parts;
}

Result<void> take_resistances(const Arguments& arguments, CouplingJob& job) {
  const auto typed = arguments.text("--winding-resistance");
  if (!typed) return {};
  const std::vector<std::string> parts = parts_of(*typed);
  if (parts.size() != 2) {
    return failure(Problem::usage, "--winding-resistance", in_quotes(*typed) + " is not one resistance for each winding",
                   "write it like --winding-resistance 0.2ohm±1%,0.7ohm±1%");
  }
  const Result<StatedValue> first = parse_value(parts[0], Unit::ohm, "--winding-resistance");
  if (!first) return failure(first);
  const Result<StatedValue> second = parse_value(parts[1], Unit::ohm, "--winding-resistance");
  if (!second) return failure(second);
  if (first->value < 0 || second->value < 0) {
    return failure(Problem::bad_number, "--winding-resistance", "a resistance cannot be negative", "write it like --winding-resistance 0.2ohm,0.7ohm");
  }
  job.winding_resistance = std::pair{*first, *second};
  return {};
}

Result<void> take_pair(const Arguments& arguments, CouplingJob& job) {
  const auto typed = arguments.text("--pair");
  if (!typed) return {};
  const std::vector<std::string> parts = parts_of(*typed);
  const auto number = [&](std::size_t i) {
    const auto value = i < parts.size() ? parse_plain_number(parts[i]) : std::nullopt;
    return value && *value >= 1 && *value <= 99 && *value == static_cast<double>(static_cast<std::size_t>(*value)) ? static_cast<std::size_t>(*value) : 0;
  };
  if (parts.size() != 2 || number(0) == 0 || number(1) == 0) {
    return failure(Problem::usage, "--pair", in_quotes(*typed) + " does not name two windings", "write it like --pair 1,3");
  }
  job.pair = {number(0) - 1, number(1) - 1};
  return {};
}

Result<CouplingJob> job_of(const Arguments& arguments) {
  CouplingJob job;
  for (const CouplingItem item : kItems) {
    for (const std::string& given : arguments.all_text(option_of(item))) job.items.push_back({item, given});
  }
  if (!arguments.words().empty()) job.ports_file = arguments.words().front();
  job.matrix_file = arguments.text("--matrix");
  if (const auto taken = take_pair(arguments, job); !taken) return failure(taken);
  if (const auto taken = take_resistances(arguments, job); !taken) return failure(taken);
  job.at_hz = arguments.all_plain("--at");
  if (const auto dots = arguments.text("--dots")) job.dots = *dots == "same" ? Dots::same : Dots::opposite;
  job.link_inductance = arguments.stated("--link-inductance");
  job.link_resistance = arguments.stated("--link-resistance");
  job.accuracy = arguments.plain("--accuracy");
  job.common_accuracy = arguments.plain("--common-accuracy");
  job.segment = arguments.text("--segment");
  job.bench_sheet = arguments.text("--bench");
  Result<BenchSetup> stated = stated_bench(arguments);
  if (!stated) return failure(stated);
  job.stated = std::move(*stated);
  if (auto taken = take_current(arguments, job.stated); !taken) return failure(taken);
  job.from_s = arguments.plain("--from");
  job.to_s = arguments.plain("--to");
  Result<PropagationOptions> propagation = propagation_of(arguments);
  if (!propagation) return failure(propagation);
  job.propagation = *propagation;
  job.traces = arguments.has("--figure") || arguments.has("--report");
  job.netlist_file = arguments.text("--netlist");
  return job;
}

Result<CouplingAdviceJob> advice_job_of(const Arguments& arguments) {
  CouplingAdviceJob ask;
  ask.ratio_accuracy = arguments.plain("--ratio-accuracy");
  ask.wanted = arguments.plain("--wanted");
  const auto rough = arguments.text("--rough");
  if (!rough) return ask;
  const std::vector<std::string> parts = parts_of(*rough);
  if (parts.size() != 3) {
    return failure(Problem::usage, "--rough", in_quotes(*rough) + " is not two inductances and a coupling", "write it like --rough 100uH,400uH,0.9");
  }
  CouplingAdviceRequest request;
  const struct {
    double& value;
    Unit unit;
  } places[] = {{request.l1_h, Unit::henry}, {request.l2_h, Unit::henry}, {request.k, Unit::one}};
  for (std::size_t i = 0; i < 3; ++i) {
    const Result<StatedValue> value = parse_value(parts[i], places[i].unit, "--rough");
    if (!value) return failure(value);
    places[i].value = value->value;
  }
  ask.rough = request;
  return ask;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const Result<CouplingJob> job = job_of(arguments);
  if (!job) return failure(job);
  const Result<CouplingAdviceJob> ask = advice_job_of(arguments);
  if (!ask) return failure(ask);
  const bool advise = arguments.has("--advise");
  for (const auto& [option, given] : {std::pair{"--rough", ask->rough.has_value()}, std::pair{"--ratio-accuracy", ask->ratio_accuracy.has_value()},
                                      std::pair{"--wanted", ask->wanted.has_value()}}) {
    if (given && !advise) return failure(Problem::usage, option, "it belongs to advice, and none was asked for", "add --advise, or leave it out");
  }
  if (const Result<void> fine = check_outputs(outputs_of(arguments)); !fine) return failure(fine);
  RunSession session(arguments, console, arguments.has("--quiet"));
  if (advise) {
    if (arguments.has("--figure") || arguments.has("--report") || arguments.has("--netlist")) {
      return failure(Problem::usage, "--advise", "advice has no figure, page or model", "leave --figure, --report and --netlist out");
    }
    const Result<CouplingAdvice> advice = run_coupling_advice(*job, *ask, session.context());
    session.end_progress();
    if (!advice) return failure(advice);
    console.out() << (arguments.has("--json") ? to_json(*advice, program_name()) : to_text(*advice, console.out_style()));
    return ExitCode::done;
  }
  const Result<Measurement> measured = run_coupling(*job, session.context());
  session.end_progress();
  if (!measured) return failure(measured);
  return finish_measuring(*measured, arguments, console, session.context());
}

Option item(CouplingItem which, std::string_view help, std::string_view example) {
  return {.name = option_of(which), .kind = ValueKind::text, .value_name = "X", .help = help, .example = example, .repeatable = true};
}

OptionGroup items() {
  using enum CouplingItem;
  return {.title = "What was measured (X: 100uH±1%@10kHz, a sweep file, or a sine capture)",
          .options = {item(primary_open, "inductance of the primary, the secondary open", "100uH±1%@10kHz"),
                      item(primary_short, "inductance of the primary, the secondary shorted", "19uH±1%"),
                      item(secondary_open, "inductance of the secondary, the primary open", "400uH±1%"),
                      item(secondary_short, "inductance of the secondary, the primary shorted", "76uH±1%"),
                      item(aiding, "both windings in series so that their fields add", "860uH±1%"),
                      item(opposing, "both windings in series so that their fields oppose", "140uH±1%"),
                      item(ratio_forward, "voltage of the open secondary over that across the primary; a capture of both has the "
                                          "primary as --voltage, the secondary as --current", "1.8±1%"),
                      item(ratio_reverse, "voltage of the open primary over that across the secondary", "0.45±1%"),
                      {.name = "--matrix",
                       .kind = ValueKind::file,
                       .value_name = "FILE",
                       .help = "inductances of several windings from pairwise results, one row a line: 100uH,50uH",
                       .example = "windings.txt"},
                      {.name = "--pair",
                       .kind = ValueKind::text,
                       .value_name = "A,B",
                       .help = "which two of several windings or ports are primary and secondary, 1,2 unless given",
                       .example = "1,3"}}};
}

OptionGroup circumstances() {
  return {.title = "Windings, short and points",
          .options = {{.name = "--dots",
                       .kind = ValueKind::choice,
                       .value_name = "HOW",
                       .help = "whether the dots are at the same ends of both windings, which gives M its sign",
                       .example = "same",
                       .choices = {"same", "opposite"}},
                      {.name = "--at",
                       .kind = ValueKind::plain,
                       .value_name = "FREQ",
                       .help = "the values at this frequency, and that of the stated ones; without it at low frequency",
                       .example = "10kHz",
                       .unit = Unit::hertz,
                       .range = Range::positive,
                       .repeatable = true},
                      {.name = "--winding-resistance",
                       .kind = ValueKind::text,
                       .value_name = "A,B",
                       .help = "of primary and secondary, which keep a short from being one at low frequency",
                       .example = "0.2ohm±1%,0.7ohm±1%"},
                      {.name = "--link-inductance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the short itself; up to 20 nH unless given",
                       .example = "12nH±3nH",
                       .unit = Unit::henry,
                       .range = Range::not_negative},
                      {.name = "--link-resistance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the short itself",
                       .example = "3mohm±1mohm",
                       .unit = Unit::ohm,
                       .range = Range::not_negative},
                      {.name = "--accuracy",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "of the impedances in each file by itself, in size and angle, 0.5 % unless given; with --advise of each inductance, 1 %",
                       .example = "0.1%",
                       .range = Range::positive,
                       .below = 1},
                      {.name = "--common-accuracy",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "an error that all impedances share, on top of their own: it leaves k alone",
                       .example = "0.5%",
                       .range = Range::positive,
                       .below = 1}}};
}

OptionGroup advice_options() {
  return {.title = "Advice",
          .options = {{.name = "--advise", .help = "how well k could be known by each method, instead of measuring"},
                      {.name = "--rough",
                       .kind = ValueKind::text,
                       .value_name = "L1,L2,K",
                       .help = "the windings, roughly; else what the items give",
                       .example = "100uH,400uH,0.9"},
                      {.name = "--ratio-accuracy",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "of each voltage ratio; that of --accuracy unless given",
                       .example = "0.5%",
                       .range = Range::positive,
                       .below = 1},
                      {.name = "--wanted",
                       .kind = ValueKind::plain,
                       .value_name = "RATIO",
                       .help = "half-width of the interval that would do, of k or of 1 - k, whichever is smaller",
                       .example = "5%",
                       .range = Range::positive,
                       .below = 1}}};
}

OptionGroup model_out() {
  return {.title = "Model",
          .options = {{.name = "--netlist",
                       .kind = ValueKind::file,
                       .value_name = "FILE.cir",
                       .help = "writes the coupled windings as a SPICE subcircuit",
                       .example = "pair.cir"}}};
}

}  // namespace

Command coupling_command() {
  return {
      .name = "coupling",
      .summary = "k, M, n and leakage of coupled windings",
      .description =
          "Give whatever was measured on a pair of windings: each opened and shorted, in series, voltage ratios, or a two-port "
          "file. All of it is solved together, with the resistance of the windings, the link that served as a short and the "
          "windings' capacitance in the model, so that more measurements than needed check each other.\n"
          "Close coupling is known best by opening and shorting, loose coupling by voltage ratios or by windings in series: "
          "--advise says how well, before anything is measured.\n"
          "A file with more than two ports, or --matrix, also gives the matrix of all windings and whether it is possible.",
      .positional = {.name = "FILE", .help = "a Touchstone file of two ports or more, S, Y or Z", .least = 0, .most = 1},
      .groups = {items(), circumstances(), advice_options(), current_options(), reading_options(), window_options(), conditions_options(),
                 uncertainty_options(), model_out(), output_options(), measuring_options()},
      .examples = {{"coupling --primary-open 100uH±1% --primary-short 19uH±1%",
                    "k and the leakage; with --secondary-open also M, n and the other side's"},
                   {"coupling pair.s2p --at 100kHz --figure pair.svg",
                    "everything from a two-port file, at one frequency, with a figure"},
                   {"coupling --primary-open po.csv --primary-short ps.csv --dots same",
                    "from two sweeps, which also show resistance and capacitance"},
                   {"coupling --advise --rough 100uH,400uH,0.1 --accuracy 1% --wanted 5%",
                    "what to measure so that k is known to 5 %"}},
      .run = run};
}

}  // namespace coilassay
