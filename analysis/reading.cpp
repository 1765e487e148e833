#include "analysis/reading.h"

#include <cmath>

#include "analysis/budget.h"
#include "analysis/symbols.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

Result<void> check_field(const ProfileField& field, bool judged) {
  if (!field.is_value()) return {};
  const Symbol* symbol = find_symbol(field.symbol);
  Unit unit = symbol != nullptr ? symbol->unit : Unit::one;
  if (symbol == nullptr) {
    if (field.symbol == "V") unit = Unit::volt;
    else if (field.symbol == "I") unit = Unit::ampere;
    else if (!judged) return {};
    else {
      std::vector<std::string_view> known;
      for (const Symbol& each : symbols()) known.push_back(each.symbol);
      const std::string_view near = nearest(field.symbol, known);
      return failure(Problem::bad_sheet, field.place, "'" + shown(field.symbol, 40) + "' is no symbol that can be judged",
                     near.empty() ? "symbols such as L_s, R_s, Q are listed in docs/formulas.md" : "did you mean '" + std::string(near) + "'?");
    }
  }
  if (unit == field.unit) return {};
  return failure(Problem::wrong_unit, field.place,
                 shown(field.symbol, 40) + " is " + std::string(kind_in_words(unit)) + ", and its field says " + std::string(kind_in_words(field.unit)),
                 unit == Unit::one ? "write \"" + field.symbol + "\" without a unit" : "write \"" + field.symbol + " [" + std::string(coilassay::symbol(unit)) + "]\"");
}

std::optional<double> value_of(const std::optional<StatedValue>& stated) {
  if (!stated) return std::nullopt;
  return stated->value;
}

/// What the instrument says of itself joins what the profile states; a finding where they differ.
std::optional<double> agreed(const std::optional<StatedValue>& stated, const InstrumentSettings& settings, std::string_view name, Unit unit, Measurement& result) {
  const std::optional<double> profile = value_of(stated);
  for (const auto& [setting, reply] : settings) {
    if (setting != name) continue;
    const auto said = parse_value(reply, unit, "");
    if (!said || !profile) return said ? std::optional(said->value) : profile;
    if (std::abs(said->value - *profile) <= 0.01 * std::abs(*profile)) return profile;
    result.findings.push_back({"setting_contradicts", Severity::refusal,
                               "the instrument says its " + std::string(name) + " is " + to_text(said->value, unit) + " where the profile states " +
                                   to_text(*profile, unit) + ": its values are not used. Set the instrument, or correct the profile",
                               std::string(name), said->value, unit});
  }
  return profile;
}

/// Half-width of the instrument's own error at this value.
struct OwnError {
  double half_width = 0;
  std::string basis;
};
OwnError own_error(const InstrumentProfile& profile, const ReadingValue& value, bool exact_bench) {
  const auto stated = profile.reading->accuracy.find(value.symbol);
  if (stated != profile.reading->accuracy.end()) return {stated->second.ratio * std::abs(value.value) + stated->second.fixed, "stated"};
  if (exact_bench) return {0, "stated"};
  return {reading_defaults::kAccuracyRatio * std::abs(value.value), "default: the profile does not state the accuracy"};
}

ErrorLaw rectangular(double half_width) { return {ErrorLaw::Kind::rectangular, half_width / std::sqrt(3.0), 0}; }

}  // namespace

Result<void> check_profile_symbols(const InstrumentProfile& profile, bool judged) {
  if (profile.reading) {
    for (const ProfileField& field : profile.reading->fields) {
      if (auto fine = check_field(field, judged); !fine) return fine;
    }
  }
  if (profile.record) {
    for (const ProfileField& field : profile.record->fields) {
      if (auto fine = check_field(field, false); !fine) return fine;
    }
  }
  return {};
}

Measurement measure_reading(const Reading& reading, const InstrumentProfile& profile, const std::string& identity,
                            const InstrumentSettings& settings, bool exact_bench) {
  Measurement result;
  result.test = "reading";
  const StatedConditions& at = profile.reading->at;
  result.conditions.frequency_hz = agreed(at.frequency, settings, "frequency", Unit::hertz, result);
  // A level without a unit is in what the profile states; it states volts unless it says amperes.
  if (at.level_a) result.conditions.level_a = agreed(at.level_a, settings, "level", Unit::ampere, result);
  else result.conditions.level_v = agreed(at.level_v, settings, "level", Unit::volt, result);
  result.conditions.bias_a = agreed(at.bias, settings, "bias", Unit::ampere, result);
  result.conditions.temperature_degc = agreed(at.temperature, settings, "temperature", Unit::degree_celsius, result);
  if (!identity.empty()) result.equipment.push_back({identity, "", "", ""});
  if (!reading.status_ok) {
    result.findings.push_back({"bad_status", Severity::refusal,
                               "the instrument says status '" + shown(reading.status, 40) + "' where '" + shown(profile.reading->status, 40) +
                                   "' means that all is well: its values are not used. Look at its display",
                               "status", parse_plain_number(reading.status).value_or(0), Unit::one});
    return result;
  }
  if (result.has_finding("setting_contradicts")) return result;
  PropagationOptions options;
  options.exact_bench = exact_bench;
  std::vector<InputError> inputs;
  std::vector<OutputSpec> outputs;
  // Which inputs belong to which output: the first of each, and how many.
  struct Share {
    double value;
    std::size_t first, count;
  };
  std::vector<Share> shares;
  for (const ReadingValue& value : reading.values) {
    if (find_symbol(value.symbol) == nullptr) continue;
    if (value.state == ValueState::over_range) {
      result.findings.push_back({"over_range", Severity::refusal,
                                 "the instrument gave no value of " + shown(value.symbol, 20) +
                                     ": out of range, or nothing in the fixture. Choose a wider range, and look at the contacts",
                                 value.symbol, 0, value.unit});
      continue;
    }
    Share share{value.value, inputs.size(), 0};
    const OwnError own = own_error(profile, value, exact_bench);
    if (own.half_width > 0) inputs.push_back({"instrument", 0, rectangular(own.half_width), 'B', true, own.basis});
    if (std::isfinite(value.resolution) && value.resolution > 0) {
      inputs.push_back({"last digit of the reply", 0, rectangular(value.resolution / 2), 'B', false, "data"});
    }
    if (const auto off = profile.reading->subtract.find(value.symbol); off != profile.reading->subtract.end()) {
      const StatedValue& stated = off->second;
      result.corrections.push_back({"fixture " + value.symbol, stated.value, value.unit});
      share.value -= stated.value;
      InputError error = input_error("fixture", stated, {std::abs(stated.value), "as large as itself: no tolerance was stated"}, options);
      error.value = 0;
      inputs.push_back(std::move(error));
    }
    share.count = inputs.size() - share.first;
    shares.push_back(share);
    outputs.push_back({value.symbol, false, result.conditions.frequency_hz});
  }
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    for (std::size_t i = 0; i < y.size(); ++i) {
      y[i] = shares[i].value;
      for (std::size_t n = 0; n < shares[i].count; ++n) y[i] += x[shares[i].first + n];
    }
  };
  if (!outputs.empty()) add_estimates(result, inputs, {}, outputs, f, {}, options);
  return result;
}

}  // namespace coilassay
