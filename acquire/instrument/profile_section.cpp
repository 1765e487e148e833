#include "acquire/instrument/profile_section.h"

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

/// Units a field can have; the symbol of a unit is not enough, "uH" names its size too.
constexpr Unit kUnits[] = {Unit::henry,  Unit::ohm,    Unit::volt,   Unit::ampere,         Unit::hertz, Unit::radian,
                           Unit::farad,  Unit::second, Unit::siemens, Unit::degree_celsius, Unit::watt,  Unit::one};

std::string trimmed(const std::string& text) {
  const std::size_t first = text.find_first_not_of(" \t");
  if (first == std::string::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t") - first + 1);
}

/// One part of an accuracy; a share in percent or ppm, else a fixed part.
bool add_part(Accuracy& accuracy, const std::string& part, Unit unit) {
  if (const auto share = parse_value(part, Unit::one, ""); share && part.find_first_of("%m") != std::string::npos && share->value >= 0 &&
                                                           (part.ends_with('%') || part.ends_with("ppm"))) {
    accuracy.ratio += share->value;
    return true;
  }
  const auto fixed = parse_value(part, unit, "");
  if (!fixed || fixed->value < 0 || fixed->law != Law::unstated) return false;
  accuracy.fixed += fixed->value;
  return true;
}

std::optional<Accuracy> parse_accuracy(const std::string& text, Unit unit) {
  Accuracy accuracy;
  std::size_t start = 0;
  while (start <= text.size()) {
    // A sign inside a number ("1e+3") has no blank before it.
    std::size_t plus = text.find(" +", start);
    if (plus == std::string::npos) plus = text.size();
    const std::string part = trimmed(text.substr(start, plus - start));
    if (part.empty() || !add_part(accuracy, part, unit)) return std::nullopt;
    start = plus + 2;
  }
  return accuracy;
}

}  // namespace

void ProfileSection::refuse(Problem problem, std::string_view key, std::string finding, std::string remedy) {
  if (!*error_) *error_ = Error{problem, place(key), std::move(finding), std::move(remedy)};
}

std::vector<std::string> ProfileSection::texts(std::string_view key) {
  return kept(table_.texts(key)).value_or(std::vector<std::string>{});
}

std::vector<std::string> ProfileSection::one_or_more(std::string_view key) {
  if (!table_.has(key)) {
    static_cast<void>(table_.text(key));
    return {};
  }
  if (const auto one = table_.text(key)) return {**one};
  return texts(key);
}

std::optional<long long> ProfileSection::integer(std::string_view key, long long least, long long most) {
  const auto number = kept(table_.integer(key));
  if (number && (*number < least || *number > most)) {
    refuse(Problem::bad_number, key, name_ + "." + std::string(key) + " is " + std::to_string(*number),
           "give a whole number from " + std::to_string(least) + " to " + std::to_string(most));
    return std::nullopt;
  }
  return number;
}

std::optional<StatedValue> ProfileSection::value(std::string_view key, Unit unit) { return kept(table_.value(key, unit)); }

std::optional<double> ProfileSection::positive(std::string_view key, Unit unit) {
  const auto stated = value(key, unit);
  if (!stated) return std::nullopt;
  if (stated->value > 0 && stated->law == Law::unstated) return stated->value;
  refuse(Problem::bad_number, key, name_ + "." + std::string(key) + " must be above zero and has no tolerance",
         "write a value such as " + std::string(key) + " = \"1 " + std::string(symbol(unit)) + "\"");
  return std::nullopt;
}

std::optional<double> ProfileSection::not_negative(std::string_view key, Unit unit) {
  const auto stated = value(key, unit);
  if (!stated) return std::nullopt;
  if (stated->value >= 0 && stated->law == Law::unstated) return stated->value;
  refuse(Problem::bad_number, key, name_ + "." + std::string(key) + " must not be negative and has no tolerance",
         "write a value such as " + std::string(key) + " = \"1 " + std::string(symbol(unit)) + "\"");
  return std::nullopt;
}

std::string ProfileSection::word(std::string_view key, const std::vector<std::string>& words) {
  const auto typed = text(key);
  if (!typed) return words.front();
  if (std::find(words.begin(), words.end(), *typed) != words.end()) return *typed;
  std::string list;
  for (const std::string& each : words) list += (list.empty() ? "" : ", ") + each;
  refuse(Problem::bad_sheet, key, name_ + "." + std::string(key) + " is '" + shown(*typed, 40) + "'", "write one of: " + list);
  return words.front();
}

void ProfileSection::check_command(std::string_view key, const std::string& text) {
  const bool control = std::any_of(text.begin(), text.end(), [](char c) { return static_cast<unsigned char>(c) < 0x20 || c == 0x7f; });
  if (!text.empty() && !control) return;
  refuse(Problem::bad_sheet, key, name_ + "." + std::string(key) + (text.empty() ? " is empty" : " holds a control character"),
         "write what is sent without its terminator, which [link] states");
}

std::optional<std::string> ProfileSection::command(std::string_view key) {
  const auto typed = text(key);
  if (typed) check_command(key, *typed);
  return typed;
}

std::optional<ProfileSection> ProfileSection::section(std::string_view key) {
  const auto below = kept(table_.table(key));
  if (!below) return std::nullopt;
  return ProfileSection(*below, name_.empty() ? std::string(key) : name_ + "." + std::string(key), *error_);
}

std::vector<ProfileSection> ProfileSection::sections(std::string_view key) {
  const auto below = table_.tables(key);
  if (!below) {
    if (!*error_) *error_ = below.error();
    return {};
  }
  std::vector<ProfileSection> all;
  for (const SheetTable& each : *below) all.emplace_back(each, std::string(key), *error_);
  return all;
}

std::vector<ProfileField> ProfileSection::fields(std::string_view key) {
  std::vector<ProfileField> fields;
  for (const std::string& text : texts(key)) {
    ProfileField field;
    field.place = place(key);
    const std::size_t open = text.find('[');
    field.symbol = trimmed(text.substr(0, open));
    if (open != std::string::npos) {
      const std::size_t close = text.find(']', open);
      const std::string unit = close == std::string::npos ? "" : trimmed(text.substr(open + 1, close - open - 1));
      bool known = unit == "1";
      if (known) field.unit_text = unit;
      for (const Unit each : kUnits) {
        if (known) break;
        const auto one = parse_value("1 " + unit, each, "");
        if (unit.empty() || !one) continue;
        field.unit = each;
        field.factor = one->value;
        field.unit_text = unit;
        known = true;
      }
      // "m" alone is taken as a prefix of whatever comes first.
      if (!known || (unit.size() == 1 && std::string("fpnumkKMGT").find(unit) != std::string::npos)) {
        refuse(Problem::wrong_unit, key, "'" + shown(text, 40) + "' names no unit this program knows", "write it like \"L_s [H]\" or \"R_s [ohm]\"");
      }
    }
    if (field.symbol.empty()) refuse(Problem::bad_sheet, key, "a field has no name", "write \"-\" for one that is not looked at");
    const bool twice = field.symbol != "-" && std::any_of(fields.begin(), fields.end(), [&](const ProfileField& other) { return other.symbol == field.symbol; });
    if (twice) refuse(Problem::bad_sheet, key, "the field '" + shown(field.symbol, 40) + "' stands there twice", "write \"-\" for one that is not looked at");
    fields.push_back(std::move(field));
  }
  const bool any = std::any_of(fields.begin(), fields.end(), [](const ProfileField& field) { return field.is_value(); });
  if (!any) refuse(Problem::bad_sheet, key, name_ + "." + std::string(key) + " names no value", "write fields = [\"L_s [H]\", \"R_s [ohm]\"]");
  return fields;
}

StatedConditions ProfileSection::conditions(std::string_view key) {
  StatedConditions at;
  auto below = section(key);
  if (!below) return at;
  at.frequency = below->value("frequency", Unit::hertz);
  // A level is in volts or in amperes; only the unit can tell.
  if (const auto volts = below->table_.value("level", Unit::volt)) at.level_v = *volts;
  else at.level_a = below->value("level", Unit::ampere);
  at.bias = below->value("bias", Unit::ampere);
  at.temperature = below->value("temperature", Unit::degree_celsius);
  if (at.frequency && at.frequency->value < 0) below->refuse(Problem::bad_number, "frequency", "a frequency is not negative", "write it like \"100 kHz\"");
  return at;
}

std::map<std::string, double> ProfileSection::limits(std::string_view key, const std::vector<ProfileField>& fields, bool as_share) {
  std::map<std::string, double> limits;
  auto below = section(key);
  if (!below) return limits;
  for (const ProfileField& field : fields) {
    if (!field.is_value()) continue;
    if (const auto limit = below->value(field.symbol, as_share ? Unit::one : field.unit)) limits[field.symbol] = limit->value;
  }
  return limits;
}

std::map<std::string, Accuracy> ProfileSection::accuracies(std::string_view key, const std::vector<ProfileField>& fields) {
  std::map<std::string, Accuracy> all;
  auto below = section(key);
  if (!below) return all;
  for (const ProfileField& field : fields) {
    if (!field.is_value()) continue;
    const auto typed = below->text(field.symbol);
    if (!typed) continue;
    if (const auto accuracy = parse_accuracy(*typed, field.unit)) {
      all[field.symbol] = *accuracy;
    } else {
      below->refuse(Problem::bad_number, field.symbol, "'" + shown(*typed, 60) + "' is no accuracy of " + std::string(kind_in_words(field.unit)),
                    "write it like \"0.2 %\" or \"1 % + 2 m" + std::string(symbol(field.unit)) + "\"");
    }
  }
  return all;
}

std::map<std::string, StatedValue> ProfileSection::values(std::string_view key, const std::vector<ProfileField>& fields) {
  std::map<std::string, StatedValue> all;
  auto below = section(key);
  if (!below) return all;
  for (const ProfileField& field : fields) {
    if (!field.is_value()) continue;
    if (const auto value = below->value(field.symbol, field.unit)) all[field.symbol] = *value;
  }
  return all;
}

std::string ProfileSection::decimal_sign() { return word("decimal", {".", ","}); }

std::string ProfileSection::separator_sign() {
  const std::string sign = text("separator").value_or(",");
  if (sign == "tab" || sign == "\t") return "\t";
  if (sign == "space" || sign == " ") return " ";
  if (sign.size() == 1 && !std::isalnum(static_cast<unsigned char>(sign[0])) && sign[0] > ' ' && std::string("+-.").find(sign[0]) == std::string::npos) return sign;
  refuse(Problem::bad_sheet, "separator", "'" + shown(sign, 20) + "' cannot stand between values", "write one sign such as \",\" or \";\", \"tab\" or \"space\"");
  return ",";
}

}  // namespace coilassay
