#include "app/commands/shared_options.h"

namespace coilassay {

namespace {

Option help_option() {
  return {.name = "--help", .help = "this page"};
}
Option quiet_option() {
  return {.name = "--quiet", .help = "no messages on standard error except errors"};
}
Option color_option() {
  return {.name = "--color",
          .kind = ValueKind::choice,
          .value_name = "WHEN",
          .help = "auto colours text on a terminal unless NO_COLOR is set; never leaves it plain",
          .example = "never",
          .choices = {"auto", "never"}};
}

}  // namespace

Option voltage_column() {
  return {.name = "--voltage",
          .kind = ValueKind::text,
          .value_name = "COL",
          .help = "column with the voltage: its name, or its position counted from 1, the time column counted too",
          .example = "CH2"};
}

Option voltage_low_column() {
  return {.name = "--voltage-low",
          .kind = ValueKind::text,
          .value_name = "COL",
          .help = "column that is subtracted from the voltage first, for a coil whose low end is not at earth",
          .example = "CH2"};
}

Option voltage_gain() {
  return {.name = "--voltage-gain",
          .kind = ValueKind::stated,
          .value_name = "VALUE",
          .help = "factor the file has not applied yet, such as that of a divider probe",
          .example = "10±1%",
          .range = Range::not_zero};
}

Option bench_file() {
  return {.name = "--bench",
          .kind = ValueKind::file,
          .value_name = "FILE",
          .help = "bench sheet (TOML) with columns, probes and tolerances; options given here replace what it says",
          .example = "bench.toml"};
}

Option segment() {
  return {.name = "--segment",
          .kind = ValueKind::text,
          .value_name = "LABEL",
          .help = "which record of a file with several: its label, or its position counted from 1; else the first",
          .example = "2"};
}

Option delimiter_sign() {
  return {.name = "--delimiter",
          .kind = ValueKind::text,
          .value_name = "SIGN",
          .help = "what separates columns, when the file itself leaves it open: a comma, a semicolon, tab or space",
          .example = ";"};
}

Option decimal_sign() {
  return {.name = "--decimal",
          .kind = ValueKind::text,
          .value_name = "SIGN",
          .help = "the decimal sign, when the file itself leaves it open: a point or a comma",
          .example = ","};
}

Option timebase() {
  return {.name = "--timebase",
          .kind = ValueKind::plain,
          .value_name = "RATIO",
          .help = "how far the instrument's clock may be off",
          .example = "25ppm",
          .range = Range::not_negative,
          .below = 1};
}

OptionGroup reading_options() {
  return {
      .title = "Reading the file",
      .options = {
          voltage_column(),
          voltage_low_column(),
          voltage_gain(),
          segment(),
          delimiter_sign(),
          decimal_sign()}};
}

OptionGroup ring_down_options() {
  return {.title = "Across the coil",
          .options = {{.name = "--capacitor",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "the capacitor that was added; once per file, in the order of the files",
                       .example = "10nF±1%",
                       .unit = Unit::farad,
                       .range = Range::positive,
                       .repeatable = true},
                      {.name = "--capacitor-dissipation",
                       .kind = ValueKind::stated,
                       .value_name = "RATIO",
                       .help = "its dissipation factor; once for all capacitors, or once for each",
                       .example = "0.0005±50%",
                       .range = Range::not_negative,
                       .below = 1,
                       .repeatable = true},
                      {.name = "--probe-capacitance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of probe and input together",
                       .example = "13pF±2pF",
                       .unit = Unit::farad,
                       .range = Range::not_negative},
                      {.name = "--probe-resistance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of probe and input together",
                       .example = "10M",
                       .unit = Unit::ohm,
                       .range = Range::positive},
                      {.name = "--across",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "resistance of whatever else stays connected, such as a coupling resistor",
                       .example = "10kohm±5%",
                       .unit = Unit::ohm,
                       .range = Range::positive},
                      {.name = "--across-capacitance",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "capacitance of whatever else stays connected",
                       .example = "5pF±2pF",
                       .unit = Unit::farad,
                       .range = Range::not_negative}}};
}

OptionGroup window_options() {
  return {.title = "Window",
          .options = {{.name = "--from",
                       .kind = ValueKind::plain,
                       .value_name = "TIME",
                       .help = "first instant to use, in the time of the file; else found from the record",
                       .example = "20us",
                       .unit = Unit::second},
                      {.name = "--to",
                       .kind = ValueKind::plain,
                       .value_name = "TIME",
                       .help = "last instant to use; else found from the record",
                       .example = "400us",
                       .unit = Unit::second}}};
}

OptionGroup conditions_options() {
  return {.title = "Bench and conditions",
          .options = {bench_file(),
                      timebase(),
                      {.name = "--temperature",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "of the coil, kept with the result",
                       .example = "23±2degC",
                       .unit = Unit::degree_celsius,
                       .range = Range::above_absolute_zero},
                      {.name = "--level",
                       .kind = ValueKind::stated,
                       .value_name = "VALUE",
                       .help = "voltage of the stimulus, kept with the result",
                       .example = "1V",
                       .unit = Unit::volt,
                       .range = Range::not_negative}}};
}

OptionGroup uncertainty_options() {
  return {.title = "Uncertainty",
          .options = {
              {.name = "--propagate",
               .kind = ValueKind::choice,
               .value_name = "HOW",
               .help = "how errors are carried to the result: by their slopes (the default) or by random trials",
               .example = "trials",
               .choices = {"first-order", "trials"}},
              {.name = "--trials",
               .kind = ValueKind::count,
               .value_name = "N",
               .help = "number of trials, 200000 unless given",
               .example = "1000000",
               .least = 1000,
               .most = 100'000'000},
              {.name = "--seed",
               .kind = ValueKind::count,
               .value_name = "N",
               .help = "of the trials, 1 unless given; the same seed gives the same digits",
               .example = "7"},
              {.name = "--exact-bench", .help = "no default tolerances: only what is stated and what the data show"}}};
}

OptionGroup output_options() {
  return {.title = "Output",
          .options = {{.name = "--json", .help = "one JSON document on standard output instead of text"},
                      {.name = "--figure",
                       .kind = ValueKind::file,
                       .value_name = "FILE.svg",
                       .help = "draws capture, fit and residuals",
                       .example = "ring.svg"},
                      {.name = "--report",
                       .kind = ValueKind::file,
                       .value_name = "FILE",
                       .help = "writes one self-contained page, .html or .pdf",
                       .example = "ring.html"}}};
}

OptionGroup measuring_options() {
  return {.title = "Everywhere",
          .options = {quiet_option(),
                      {.name = "--verbose", .help = "the whole budget, every note, digests of the files"},
                      {.name = "--threads",
                       .kind = ValueKind::count,
                       .value_name = "N",
                       .help = "2 unless given; results do not depend on it",
                       .example = "4",
                       .least = 1,
                       .most = 256},
                      color_option(),
                      help_option()}};
}

OptionGroup everywhere_options() {
  return {.title = "Everywhere", .options = {quiet_option(), color_option(), help_option()}};
}

}  // namespace coilassay
