#include "acquire/instrument/reply_values.h"

#include <utf8.h>

#include <algorithm>
#include <optional>

#include "acquire/instrument/pattern.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

std::string_view trimmed(std::string_view text) {
  const std::size_t first = text.find_first_not_of(" \t\r");
  if (first == std::string_view::npos) return {};
  return text.substr(first, text.find_last_not_of(" \t\r") - first + 1);
}

bool same_letters(std::string_view a, std::string_view b) {
  const auto lower = [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c; };
  return std::equal(a.begin(), a.end(), b.begin(), b.end(), [&](char x, char y) { return lower(x) == lower(y); });
}

std::vector<std::string> split(std::string_view line, const std::string& separator) {
  std::vector<std::string> parts;
  if (separator == " ") {
    for (std::size_t at = line.find_first_not_of(" \t"); at != std::string_view::npos;) {
      const std::size_t end = std::min(line.find_first_of(" \t", at), line.size());
      parts.emplace_back(line.substr(at, end - at));
      at = line.find_first_not_of(" \t", end);
    }
    return parts;
  }
  for (std::size_t at = 0;;) {
    const std::size_t end = std::min(line.find(separator, at), line.size());
    parts.emplace_back(trimmed(line.substr(at, end - at)));
    if (end == line.size()) return parts;
    at = end + separator.size();
  }
}

/// Printable text only: a byte with a flipped bit shows up here.
bool is_clean(std::string_view line) {
  if (utf8::find_invalid(line.begin(), line.end()) != line.end()) return false;
  return std::all_of(line.begin(), line.end(), [](char c) { return c == '\t' || (static_cast<unsigned char>(c) >= 0x20 && c != 0x7f); });
}

tl::unexpected<Error> unreadable(const std::string& place, std::string finding) {
  return failure(Problem::instrument, place, std::move(finding), "coilassay acquire --try PROFILE.toml shows the talk step by step");
}

/// One step of the last digit of a decimal number: "4.70e-5" gives 1e-7.
double last_digit(std::string_view number) {
  int digits = 0;
  double exponent = 0;  // whatever was sent, beyond all numbers too
  bool point = false;
  std::size_t i = 0;
  for (; i < number.size(); ++i) {
    const char c = number[i];
    if (c == '.') point = true;
    else if (c >= '0' && c <= '9') digits += point ? 1 : 0;
    else if (c == 'e' || c == 'E') break;
    else if (c != '+' && c != '-') return std::nan("");
  }
  if (i < number.size()) {
    if (const auto e = parse_plain_number(number.substr(i + 1))) exponent = *e;
  }
  const double step = std::pow(10.0, exponent - digits);
  return std::isfinite(step) ? step : std::nan("");
}

struct Number {
  double value = std::nan("");  // SI
  double resolution = std::nan("");
  bool none = false;
};

std::optional<Number> number_of(std::string text, const std::string& decimal, double factor, Unit unit, const std::vector<std::string>& invalid) {
  if (means_no_value(text, invalid)) return Number{.none = true};
  if (decimal == ",") {
    if (text.find('.') != std::string::npos) return std::nullopt;
    std::replace(text.begin(), text.end(), ',', '.');
  }
  if (const auto plain = parse_plain_number(text)) return Number{*plain * factor, last_digit(text) * std::abs(factor)};
  // With a unit or a prefix of its own: "47.02uH".
  const auto stated = parse_value(text, unit, "");
  if (!stated || stated->law != Law::unstated) return std::nullopt;
  const std::size_t digits = text.find_first_not_of("+-0123456789.");
  double resolution = std::nan("");
  if (digits != std::string::npos && digits > 0) {
    if (const auto bare = parse_plain_number(std::string_view(text).substr(0, digits)); bare && *bare != 0) {
      resolution = last_digit(std::string_view(text).substr(0, digits)) * std::abs(stated->value / *bare);
    }
  }
  return Number{stated->value, resolution};
}

}  // namespace

const ReadingValue* Reading::find(std::string_view symbol) const {
  for (const ReadingValue& each : values) {
    if (each.symbol == symbol) return &each;
  }
  return nullptr;
}

bool Reading::good() const {
  return status_ok && std::all_of(values.begin(), values.end(), [](const ReadingValue& each) { return each.state == ValueState::measured; });
}

bool means_no_value(std::string_view text, const std::vector<std::string>& more) {
  text = trimmed(text);
  for (const char* word : {"OL", "-OL", "+OL", "OVLD", "OVERLOAD", "INF", "-INF", "+INF", "NAN"}) {
    if (same_letters(text, word)) return true;
  }
  const auto number = parse_plain_number(text);
  for (const std::string& each : more) {
    if (same_letters(text, each)) return true;
    if (const auto other = parse_plain_number(each); other && number && *other == *number) return true;
  }
  return number && std::abs(*number) >= 9.9e37;
}

Result<Reading> parse_reading(const ReadingSetup& setup, const std::string& line, const std::string& place) {
  Reading reading;
  reading.reply = line;
  const std::string_view content = trimmed(line);
  const std::string what = "'" + shown(content, 80) + "'";
  if (content.empty()) return unreadable(place, "an empty line came as the reply");
  if (!is_clean(content)) return unreadable(place, "the reply is garbled: " + what);
  std::vector<std::string> parts;
  if (setup.pattern) {
    const auto pattern = Pattern::compile(*setup.pattern, place);
    if (!pattern) return failure(pattern);
    auto groups = pattern->groups_in(content);
    if (!groups) return unreadable(place, "the reply does not fit the pattern: " + what);
    parts = std::move(*groups);
  } else {
    parts = split(content, setup.separator);
  }
  if (parts.size() != setup.fields.size()) {
    return unreadable(place, "the reply has " + std::to_string(parts.size()) + " fields where " + std::to_string(setup.fields.size()) + " are stated: " + what);
  }
  for (std::size_t i = 0; i < parts.size(); ++i) {
    const ProfileField& field = setup.fields[i];
    if (field.symbol == "-") continue;
    if (field.symbol == "status") {
      reading.status = parts[i];
      const auto number = parse_plain_number(parts[i]), wanted = parse_plain_number(setup.status);
      reading.status_ok = parts[i] == setup.status || (number && wanted && *number == *wanted);
      continue;
    }
    const auto number = number_of(parts[i], setup.decimal, field.factor, field.unit, setup.invalid);
    if (!number) {
      return unreadable(place, "'" + shown(parts[i], 40) + "' for " + shown(field.symbol, 20) + " is not " + std::string(kind_in_words(field.unit)) + ": " + what);
    }
    reading.values.push_back({field.symbol, field.unit, number->value, number->resolution,
                              number->none ? ValueState::over_range : ValueState::measured});
  }
  return reading;
}

Result<std::vector<double>> parse_row(const RecordSetup& setup, const std::string& line, const std::string& place) {
  const std::string_view content = trimmed(line);
  if (!is_clean(content)) return unreadable(place, "the row is garbled: '" + shown(content, 80) + "'");
  const std::vector<std::string> parts = split(content, setup.separator);
  if (parts.size() != setup.fields.size()) {
    return unreadable(place, "the row has " + std::to_string(parts.size()) + " fields where " + std::to_string(setup.fields.size()) + " are stated: '" +
                                 shown(content, 80) + "'");
  }
  std::vector<double> values;
  for (std::size_t i = 0; i < parts.size(); ++i) {
    if (!setup.fields[i].is_value()) continue;
    const auto number = number_of(parts[i], setup.decimal, setup.scale[i], setup.fields[i].unit, setup.invalid);
    if (!number) {
      return unreadable(place, "'" + shown(parts[i], 40) + "' for " + shown(setup.fields[i].symbol, 20) + " is not " +
                                   std::string(kind_in_words(setup.fields[i].unit)));
    }
    values.push_back(number->none ? std::nan("") : number->value + setup.offset[i]);
  }
  return values;
}

}  // namespace coilassay
