// coilassay fixture
#include <ostream>

#include "app/commands/command_list.h"
#include "app/commands/measuring.h"
#include "app/commands/shared_options.h"
#include "app/runs/fixture_run.h"
#include "app/runs/version.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/utc_time.h"
#include "report/fixture_text.h"

namespace coilassay {

namespace {

Result<std::string> required(const Arguments& arguments, std::string_view option, const char* what) {
  if (const auto given = arguments.text(option)) return *given;
  const Option* declared = arguments.command().find(option);
  return failure(Problem::usage, std::string(option), what, how_to_write(*declared));
}

/// In ohm or in farad: the unit tells which.
Result<std::optional<StatedValue>> load_standard(const Arguments& arguments) {
  const auto typed = arguments.text("--load-standard");
  if (!typed) return std::nullopt;
  Result<StatedValue> value = parse_value(*typed, Unit::ohm, "--load-standard");
  if (!value && value.error().problem == Problem::wrong_unit) value = parse_value(*typed, Unit::farad, "--load-standard");
  if (!value) return failure(value);
  if (!(value->value > 0)) {
    return failure(Problem::bad_number, "--load-standard", "a load of zero is a short", "state it like --load-standard 100ohm±0.1%");
  }
  return *value;
}

Result<FixtureJob> job_of(const Arguments& arguments) {
  FixtureJob job;
  job.name = arguments.words().front();
  if (job.name.find_first_not_of(" \t") == std::string::npos) {
    return failure(Problem::usage, "NAME", "the set has no name, and results could not name it", "give it one, like coilassay fixture tweezers");
  }
  const auto open = required(arguments, "--open", "the sweep of the empty fixture is missing");
  const auto closed = required(arguments, "--short", "the sweep of the short is missing");
  const auto inductance = arguments.stated("--short-inductance");
  job.load_file = arguments.text("--load");
  const auto load = load_standard(arguments);
  job.short_resistance = arguments.stated("--short-resistance");
  job.open_capacitance = arguments.stated("--open-capacitance");
  job.load_inductance = arguments.stated("--load-inductance");
  job.valid_for_s = arguments.plain("--valid-for");
  job.part_h = arguments.plain("--part");
  const auto expires = arguments.text("--expires");
  if (const auto connection = arguments.text("--connection")) job.connection = *parse_connection(*connection);
  if (const auto port = arguments.count("--port")) job.port = static_cast<std::size_t>(*port);
  job.file = arguments.text("-o").value_or(job.name + ".toml");
  Result<ReadOptions> reading = stated_reading(arguments);
  if (!reading) return failure(reading);
  job.reading = std::move(*reading);

  if (!open) return failure(open);
  job.open_file = *open;
  if (!closed) return failure(closed);
  job.short_file = *closed;
  if (!inductance) {
    return failure(Problem::usage, "--short-inductance",
                   "the short's own inductance is not stated; it has no default, for one convention calls a short 0 nH and another gives it a value",
                   "state it like --short-inductance 0.4nH±0.1nH, or --short-inductance 0nH where that is the convention");
  }
  job.short_inductance = *inductance;
  if (!load) return failure(load);
  job.load_value = *load;
  if (expires) {
    job.expires = parse_date(*expires);
    if (!job.expires) {
      return failure(Problem::bad_number, "--expires", in_quotes(*expires) + " is no date", "write it like --expires 2027-03-01");
    }
  }
  return job;
}

Result<ExitCode> run(const Arguments& arguments, Console& console) {
  const bool json = arguments.has("--json"), quiet = arguments.has("--quiet");
  const Result<FixtureJob> job = job_of(arguments);
  if (!job) return failure(job);
  if (json && job->file == "-") {
    return failure(Problem::usage, "-o", "standard output can hold the set or the document, not both", "give the set a file with -o");
  }
  RunSession session(arguments, console, quiet);
  const Result<FixtureMade> made = run_fixture(*job, session.context());
  session.end_progress();
  if (!made) return failure(made);
  if (json) {
    console.out() << to_json(made->set, made->effects, made->part_h, made->findings, made->file, program_name());
  } else if (made->file != "-") {
    console.out() << to_text(made->set, made->effects, made->part_h, made->findings, console.out_style());
  }
  if (!quiet && made->file != "-") console.say("wrote " + shown(made->file) + ": apply it with sweep --fixture " + shown(made->file));
  return ExitCode::done;
}

OptionGroup standards() {
  using enum Range;
  return {"Standards",
          {{.name = "--open",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "sweep of the empty fixture, its gap as long as the part",
            .example = "open.s1p"},
           {.name = "--short",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "sweep with a short in the place of the part",
            .example = "short.s1p"},
           {.name = "--load",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "sweep of a load standard: needed behind a scanner, a cable or an amplifier",
            .example = "load.s1p"},
           {.name = "--short-inductance",
            .kind = ValueKind::stated,
            .value_name = "VALUE",
            .help = "of the short itself; required, for conventions differ: 0nH is one of them",
            .example = "0.4nH±0.1nH",
            .unit = Unit::henry,
            .range = not_negative},
           {.name = "--short-resistance",
            .kind = ValueKind::stated,
            .value_name = "VALUE",
            .help = "of the short itself; 0 within 2 mΩ unless given",
            .example = "0.5mohm±0.5mohm",
            .unit = Unit::ohm,
            .range = not_negative},
           {.name = "--open-capacitance",
            .kind = ValueKind::stated,
            .value_name = "VALUE",
            .help = "of the open itself; 0 within 20 fF unless given",
            .example = "10fF±10fF",
            .unit = Unit::farad,
            .range = not_negative},
           {.name = "--load-standard",
            .kind = ValueKind::text,
            .value_name = "VALUE",
            .help = "what the load is, in Ω or F: a stable resistor or capacitor near the parts' own impedance",
            .example = "100ohm±0.1%"},
           {.name = "--load-inductance",
            .kind = ValueKind::stated,
            .value_name = "VALUE",
            .help = "in series with a load in Ω; 0 within 1 nH unless given",
            .example = "0.8nH±0.4nH",
            .unit = Unit::henry,
            .range = not_negative}}};
}

OptionGroup set_options() {
  return {"Set",
          {{.name = "-o",
            .kind = ValueKind::file,
            .value_name = "FILE",
            .help = "the set, NAME.toml unless given; '-' is standard output",
            .example = "fixtures/tweezers.toml"},
           {.name = "--valid-for",
            .kind = ValueKind::plain,
            .value_name = "TIME",
            .help = "from today until the set is no longer to be trusted",
            .example = "90d",
            .unit = Unit::second,
            .range = Range::positive,
            .below = 3.2e9},
           {.name = "--expires",
            .kind = ValueKind::text,
            .value_name = "DATE",
            .help = "the same as a date: the last day",
            .example = "2027-03-01"},
           {.name = "--part",
            .kind = ValueKind::plain,
            .value_name = "VALUE",
            .help = "shows at each decade what the set changes of a part of this inductance",
            .example = "10uH",
            .unit = Unit::henry,
            .range = Range::positive}}};
}

OptionGroup connection() {
  return {"Connection",
          {{.name = "--connection",
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
           delimiter_sign(),
           decimal_sign()}};
}

}  // namespace

Command fixture_command() {
  return {.name = "fixture",
          .summary = "a compensation set from open, short and load",
          .description =
              "Leads and contacts add to every part: about a nanohenry a millimetre in series, and a few picofarad across. Measured once "
              "with the fixture empty and once shorted, they can be taken out of each sweep. The set keeps what was measured, what the "
              "standards are, the day, and until when it is good; sweep applies it with --fixture, or as the bench sheet says.\n"
              "An open that is closed, a short that does not touch, standards that are exchanged are refused.",
          .positional = {.name = "NAME", .help = "of the set, as it will stand in results", .least = 1, .most = 1, .files = false},
          .groups = {standards(), set_options(), connection(),
                     {.title = "Output", .options = {{.name = "--json", .help = "one JSON document on standard output instead of text"}}},
                     everywhere_options()},
          .examples = {{"fixture clips --open o.csv --short s.csv --short-inductance 0nH",
                        "open and short, the short called 0 nH by convention"},
                       {"fixture t --open o.s1p --short s.s1p --short-inductance 0 --part 9uH",
                        "and what it changes of 9 µH at each decade"}},
          .run = run};
}

}  // namespace coilassay
