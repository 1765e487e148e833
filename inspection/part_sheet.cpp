#include "inspection/part_sheet.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>
#include <span>

#include "analysis/symbols.h"
#include "base/digest.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "inspection/part_sheet_tests.h"
#include "inspection/sampling_tables.h"
#include "inspection/sheet_section.h"

namespace coilassay {

namespace {

constexpr double kAbsoluteZero_degC = -273.15;

void read_part(SheetSection& section, PartSheet& sheet) {
  const auto part_name = section.text("name");
  if (!part_name) section.refuse(Problem::bad_sheet, "name", "the part has no name", "write name = \"drum-47\" below [part]");
  sheet.name = part_name.value_or("");
  sheet.revision = section.text("revision").value_or("");
  sheet.supplier = section.text("supplier").value_or("");
  sheet.description = section.text("description").value_or("");
  sheet.serial_pattern = section.text("serial").value_or("");
  sheet.serial_place = section.place("serial");
}

/// The symbol a key names; std::nullopt, and an error, when there is none such.
const Symbol* read_symbol(SheetSection& section, std::string_view key) {
  const auto text = section.text(key);
  if (!text) {
    section.refuse(Problem::bad_sheet, key, fmt::format("'{}' is missing", section.full(key)),
                   "write quantity = \"L_s\", or another symbol");
    return nullptr;
  }
  const Symbol* symbol = find_symbol(*text);
  if (symbol == nullptr) {
    std::vector<std::string_view> known;
    for (const Symbol& s : symbols()) known.push_back(s.symbol);
    const std::string_view near = nearest(*text, known);
    section.refuse(Problem::bad_sheet, key, fmt::format("'{}' is no quantity that is measured", shown(*text, 60)),
                   near.empty() ? "the symbols are listed in docs/formats.md" : fmt::format("did you mean '{}'?", near));
  }
  return symbol;
}

/// A limit: a value of its own, or a percentage that is the deviation from the nominal value.
std::optional<double> read_limit_value(SheetSection& section, std::string_view key, const Limit& limit) {
  const auto text = section.raw_text(key);
  const bool percentage = text && text->find('%') != std::string::npos;
  if (!percentage || (!limit.nominal && limit.unit == Unit::one)) return section.plain(key, {limit.unit}, SheetRange::any);
  if (!limit.nominal) {
    section.refuse(Problem::bad_sheet, key, fmt::format("'{}' is a percentage, and there is no nominal value", section.full(key)),
                   "write nominal = \"47 uH\" beside it, or the limit itself");
    return std::nullopt;
  }
  const auto deviation = section.plain(key, {Unit::one}, SheetRange::any);
  if (!deviation) return std::nullopt;
  return *limit.nominal + std::fabs(*limit.nominal) * *deviation;
}

void read_nominal(SheetSection& section, Limit& limit) {
  const auto nominal = section.value("nominal", {limit.unit}, SheetRange::not_zero);
  if (!nominal) return;
  limit.nominal = nominal->value;
  if (nominal->law == Law::normal) {
    section.refuse(Problem::bad_sheet, "nominal", "a nominal value has limits, no uncertainty", "write \"47 uH \u00b1 20 %\"");
  }
  if (nominal->law != Law::rectangular) return;
  if (section.has("min") || section.has("max")) {
    section.refuse(Problem::bad_sheet, "nominal", "the limits are stated twice: by the tolerance of nominal, and by min or max",
                   "leave one of them out");
  }
  limit.min = nominal->value - nominal->half_width;
  limit.max = nominal->value + nominal->half_width;
}

void read_at(SheetSection& section, LimitConditions& at) {
  at.frequency_hz = section.plain("frequency", {Unit::hertz}, SheetRange::above_zero);
  if (const auto level = section.value("level", {Unit::volt, Unit::ampere}, SheetRange::above_zero)) {
    (level->unit == Unit::ampere ? at.level_a : at.level_v) = level->value;
  }
  at.bias_a = section.plain("bias", {Unit::ampere}, SheetRange::any);
  at.temperature_degc = section.plain("temperature", {Unit::degree_celsius}, SheetRange::any);
  if (at.temperature_degc && *at.temperature_degc < kAbsoluteZero_degC) {
    section.refuse(Problem::bad_number, "temperature", "the temperature is below absolute zero", "give it in degC");
  }
  at.definition = section.choice("definition", {"ramp_incremental", "ramp_secant", "bias_small_signal"}).value_or("");
}

Limit read_limit(SheetSection& section) {
  Limit limit;
  limit.place = section.place();
  const Symbol* symbol = read_symbol(section, "quantity");
  if (symbol != nullptr) {
    limit.quantity = symbol->symbol;
    limit.unit = symbol->unit;
  }
  read_nominal(section, limit);
  const auto min = read_limit_value(section, "min", limit), max = read_limit_value(section, "max", limit);
  if (min) limit.min = min;
  if (max) limit.max = max;
  limit.test = section.text("test").value_or("");
  if (auto at = section.section("at")) read_at(*at, limit.at);
  if (symbol == nullptr) return limit;
  if (!limit.min && !limit.max) {
    section.refuse(Problem::bad_sheet, "quantity", fmt::format("the limit on {} has neither min nor max", limit.quantity),
                   "give at least one of them, or nominal = \"47 uH \u00b1 20 %\"");
  } else if (limit.min && limit.max && *limit.min >= *limit.max) {
    section.refuse(Problem::bad_sheet, section.has("min") ? "min" : "quantity",
                   fmt::format("min {} of {} is not below max {}", to_text(*limit.min, limit.unit, Script::ascii),
                               limit.quantity, to_text(*limit.max, limit.unit, Script::ascii)),
                   "exchange them, or correct one");
  }
  return limit;
}

/// "1 %" is a ratio, "1 kHz" a distance; a bare number could be either.
void read_tolerance(SheetSection& section, std::string_view key, std::initializer_list<Unit> units, bool ratio_allowed,
                    ConditionTolerance& tolerance) {
  if (!section.has(key)) {
    section.raw_text(key);  // makes the key known
    return;
  }
  const auto text = section.raw_text(key);
  if (!text) {
    section.refuse(Problem::bad_sheet, key, fmt::format("'{}' needs a unit", section.full(key)),
                   ratio_allowed ? "write \"1 %\", or a distance with its unit" : "write \"3 degC\"");
    return;
  }
  const bool ratio = ratio_allowed && (text->find('%') != std::string::npos || text->find("ppm") != std::string::npos);
  const auto value = ratio ? section.plain(key, {Unit::one}, SheetRange::not_negative)
                           : section.plain(key, units, SheetRange::not_negative);
  if (value) tolerance = {*value, ratio, true};
}

void read_tolerances(SheetSection& section, ConditionTolerances& tolerances) {
  read_tolerance(section, "frequency", {Unit::hertz}, true, tolerances.frequency);
  read_tolerance(section, "level", {Unit::volt, Unit::ampere}, true, tolerances.level);
  read_tolerance(section, "bias", {Unit::ampere}, true, tolerances.bias);
  read_tolerance(section, "temperature", {Unit::degree_celsius, Unit::kelvin}, false, tolerances.temperature);
}

void read_decision(SheetSection& section, Decision& decision) {
  const auto rule = section.choice("rule", {"simple", "guarded_acceptance", "guarded", "guarded_rejection"});
  if (rule == "simple") decision.rule = DecisionRule::simple;
  if (rule == "guarded_acceptance") decision.rule = DecisionRule::guarded_acceptance;
  if (rule == "guarded_rejection") decision.rule = DecisionRule::guarded_rejection;
  const auto risk = section.plain("risk", {Unit::one}, SheetRange::fraction);
  if (!risk) return;
  if (*risk >= 0.5) {
    section.refuse(Problem::bad_number, "risk", "a risk of a half or more is no guard", "give one below 50 %, such as \"5 %\"");
  }
  decision.risk = *risk;
}

void check_column(SheetSection& section, const Sampling& sampling) {
  if (sampling.scheme != SamplingScheme::attributes && sampling.scheme != SamplingScheme::variables) return;
  const bool attributes = sampling.scheme == SamplingScheme::attributes;
  const std::span<const double> columns = attributes ? attribute_aqls() : variables_aqls();
  if (std::find(columns.begin(), columns.end(), sampling.aql_percent) != columns.end()) return;
  std::string list;
  for (const double column : columns) list += (list.empty() ? "" : ", ") + to_shortest(column);
  section.refuse(Problem::bad_number, "aql", fmt::format("the tables have no column for an AQL of {}", to_shortest(sampling.aql_percent)),
                 "in percent, one of: " + list);
}

void read_sampling(SheetSection& section, Sampling& sampling) {
  const auto scheme = section.choice("scheme", {"attributes", "variables", "claim", "all"});
  if (scheme == "attributes") sampling.scheme = SamplingScheme::attributes;
  if (scheme == "variables") sampling.scheme = SamplingScheme::variables;
  if (scheme == "claim") sampling.scheme = SamplingScheme::claim;
  sampling.level = section.choice("level", {"S-1", "S-2", "S-3", "S-4", "I", "II", "III"}).value_or("II");
  if (sampling.scheme == SamplingScheme::variables && (sampling.level == "S-1" || sampling.level == "S-2")) {
    section.refuse(Problem::bad_sheet, "level", fmt::format("variables plans have no level {}", sampling.level),
                   "write one of: S-3, S-4, I, II, III");
  }
  if (const auto aql = section.number("aql", SheetRange::above_zero)) sampling.aql_percent = *aql;
  check_column(section, sampling);
  const auto severity = section.choice("severity", {"normal", "tightened", "reduced"});
  if (severity == "tightened") sampling.severity = Severity105::tightened;
  if (severity == "reduced") sampling.severity = Severity105::reduced;
  sampling.reduced_allowed = section.flag("reduced").value_or(severity == "reduced");
  if (severity == "reduced" && !sampling.reduced_allowed) {
    section.refuse(Problem::bad_sheet, "reduced", "the first lot is on reduced inspection, and reduced inspection is not allowed",
                   "write reduced = true, or another severity");
  }
  if (sampling.scheme == SamplingScheme::variables) {
    const Symbol* symbol = read_symbol(section, "quantity");
    if (symbol != nullptr) sampling.quantity = symbol->symbol;
    if (severity == "reduced") {
      section.refuse(Problem::bad_sheet, "severity", "there are no reduced variables plans here", "write normal or tightened");
    }
  } else if (const auto quantity = section.text("quantity")) {
    section.refuse(Problem::bad_sheet, "quantity", "only a variables plan is for one quantity", "leave it out");
  }
  if (const auto confidence = section.plain("confidence", {Unit::one}, SheetRange::fraction)) sampling.confidence = *confidence;
  if (const auto reliability = section.plain("reliability", {Unit::one}, SheetRange::fraction)) {
    sampling.reliability = *reliability;
  }
  if (const auto accept = section.count("accept", 0, 1000000000)) sampling.accept = *accept;
  sampling.undecided_set_aside = section.choice("undecided", {"nonconforming", "set_aside"}) == "set_aside";
  if (const auto seed = section.count("seed", 0, UINT64_MAX)) sampling.seed = *seed;
  if (const auto resumed = section.date("resumed")) sampling.resumed = std::chrono::sys_days(*resumed);
}

void read_retest(SheetSection& section, Retest& retest) {
  if (const auto attempts = section.count("attempts", 1, 1000)) retest.attempts = *attempts;
  if (section.choice("use", {"first", "mean"}) == "mean") retest.use = RetestUse::mean;
  retest.reasons = section.texts("reasons");
}

CheckStandard read_check_standard(SheetSection& section) {
  CheckStandard check;
  const auto serial = section.text("serial");
  if (!serial) section.refuse(Problem::bad_sheet, "serial", "the check standard has no serial", "write serial = \"CS-1\"");
  check.serial = serial.value_or("");
  const Symbol* symbol = read_symbol(section, "quantity");
  if (symbol != nullptr) {
    check.quantity = symbol->symbol;
    check.unit = symbol->unit;
  }
  check.test = section.text("test").value_or("");
  if (const auto every = section.plain("every", {Unit::second}, SheetRange::above_zero)) check.every_s = *every;
  check.centre = section.plain("centre", {check.unit}, SheetRange::any);
  check.sigma = section.plain("sigma", {check.unit}, SheetRange::above_zero);
  if (check.centre.has_value() != check.sigma.has_value()) {
    section.refuse(Problem::bad_sheet, check.centre ? "centre" : "sigma", "centre and sigma of the check standard go together",
                   "give both, or none: the first readings then make the chart");
  }
  if (const auto baseline = section.count("baseline", 3, 10000)) check.baseline = static_cast<std::size_t>(*baseline);
  check.refuse = section.choice("when_out", {"refuse", "mark"}) != "mark";
  return check;
}

void read_gauge(SheetSection& section, PartSheet& sheet) {
  for (const std::string& key : section.keys()) {
    const Symbol* symbol = find_symbol(key);
    if (symbol == nullptr) continue;  // the key stays unknown, and is refused as such
    if (const auto sigma = section.plain(key, {symbol->unit}, SheetRange::not_negative)) sheet.gauge_sigma[key] = *sigma;
  }
}

void read_processes(SheetSection& section, PartSheet& sheet) {
  for (const std::string& key : section.keys()) {
    const Symbol* symbol = find_symbol(key);
    if (symbol == nullptr) continue;  // the key stays unknown, and is refused as such
    auto process = section.section(key);
    if (!process) continue;
    const auto mean = process->plain("mean", {symbol->unit}, SheetRange::any);
    const auto deviation = process->plain("deviation", {symbol->unit}, SheetRange::above_zero);
    const auto uncertainty = process->plain("uncertainty", {symbol->unit}, SheetRange::above_zero);
    if (!mean || !deviation || !uncertainty) {
      process->refuse(Problem::bad_sheet, "mean", fmt::format("[process.{}] needs mean, deviation and uncertainty", key), "give all three");
      continue;
    }
    sheet.processes[key] = {*mean, *deviation, *uncertainty};
  }
}

/// A limit's test must be there: a section, a kind (files need no section), or an instrument's reading.
void check_tests_of_limits(SheetSection& root, const PartSheet& sheet) {
  static constexpr std::string_view kKinds[] = {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance", "reading"};
  for (const Limit& limit : sheet.limits) {
    if (limit.test.empty() || sheet.find_test(limit.test) != nullptr) continue;
    if (std::find(std::begin(kKinds), std::end(kKinds), limit.test) != std::end(kKinds)) continue;
    root.note({Problem::bad_sheet, limit.place,
               fmt::format("the limit on {} is for a test '{}', which is neither a [test.NAME] of this sheet nor a kind of test",
                           limit.quantity, shown(limit.test, 60)),
               "name one of: ringdown, ramp, sine, sweep, coupling, resistance, reading"});
  }
}

}  // namespace

Result<PartSheet> read_part_sheet(const std::string& path) {
  const auto text = read_sheet_text(path);
  if (!text) return failure(text);
  return parse_part_sheet(*text, path);
}

Result<PartSheet> parse_part_sheet(std::string_view text, const std::string& path) {
  const auto table = parse_sheet(text, path);
  if (!table) return failure(table);
  std::optional<Error> error;
  SheetSection root(*table, "", error);
  PartSheet sheet;
  sheet.path = path;
  sheet.sha256 = sha256_of(text);
  if (auto part = root.section("part")) {
    read_part(*part, sheet);
  } else {
    root.note({Problem::bad_sheet, path, "there is no [part]", "write [part] and name = \"...\" below it"});
  }
  for (SheetSection& section : root.sections("limit")) sheet.limits.push_back(read_limit(section));
  if (auto section = root.section("tolerance_of_conditions")) read_tolerances(*section, sheet.tolerances);
  if (auto tests = root.section("test")) {
    for (const std::string& test : tests->keys()) {
      if (auto section = tests->section(test)) sheet.tests.push_back(read_test_plan(*section, test, path));
    }
  }
  if (auto section = root.section("decision")) read_decision(*section, sheet.decision);
  if (auto section = root.section("sampling")) read_sampling(*section, sheet.sampling);
  if (auto section = root.section("retest")) read_retest(*section, sheet.retest);
  if (auto section = root.section("check_standard")) sheet.check_standard = read_check_standard(*section);
  if (auto section = root.section("gauge")) read_gauge(*section, sheet);
  if (auto section = root.section("process")) read_processes(*section, sheet);
  // A misspelt key is often why another is missing: it is named first.
  if (const auto known = table->refuse_unknown_keys(); !known) return failure(known);
  if (error) return tl::make_unexpected(*error);
  if (sheet.limits.empty()) {
    return failure(Problem::bad_sheet, path, "there is no [[limit]]: nothing can be judged",
                   "write [[limit]] and quantity, min, max below it");
  }
  check_tests_of_limits(root, sheet);
  if (error) return tl::make_unexpected(*error);
  return sheet;
}

}  // namespace coilassay
