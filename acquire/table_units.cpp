#include "acquire/table_units.h"

#include <algorithm>
#include <array>

#include "acquire/table_cells.h"

namespace coilassay {
namespace {

struct Word {
  std::string_view text;
  Unit unit;
};

/// Symbols: case matters, a prefix may stand in front.
constexpr std::array kSymbols = {
    Word{"V", Unit::volt},    Word{"A", Unit::ampere}, Word{"s", Unit::second},  Word{"S", Unit::siemens},
    Word{"Hz", Unit::hertz},  Word{"HZ", Unit::hertz}, Word{"hz", Unit::hertz},  Word{"H", Unit::henry},
    Word{"F", Unit::farad},   Word{"W", Unit::watt},   Word{"J", Unit::joule},   Word{"T", Unit::tesla},
    Word{"Wb", Unit::weber},  Word{"K", Unit::kelvin}, Word{"ohm", Unit::ohm},   Word{"Ohm", Unit::ohm},
    Word{"ohms", Unit::ohm},  Word{"Ohms", Unit::ohm}, Word{"OHM", Unit::ohm},   Word{"m", Unit::metre},
    Word{"R", Unit::ohm},     Word{"VA", Unit::watt}};

/// Words: any case; "milli", "micro" and so on may stand in front.
constexpr std::array kWords = {
    Word{"volt", Unit::volt},       Word{"volts", Unit::volt},     Word{"ampere", Unit::ampere},  Word{"amperes", Unit::ampere},
    Word{"amp", Unit::ampere},      Word{"amps", Unit::ampere},    Word{"sec", Unit::second},     Word{"second", Unit::second},
    Word{"seconds", Unit::second},  Word{"hertz", Unit::hertz},    Word{"henry", Unit::henry},    Word{"henries", Unit::henry},
    Word{"farad", Unit::farad},     Word{"farads", Unit::farad},   Word{"ohm", Unit::ohm},        Word{"ohms", Unit::ohm},
    Word{"siemens", Unit::siemens}, Word{"rad", Unit::radian},     Word{"radian", Unit::radian},  Word{"radians", Unit::radian},
    Word{"watt", Unit::watt},       Word{"watts", Unit::watt},     Word{"degc", Unit::degree_celsius},
    Word{"celsius", Unit::degree_celsius},                         Word{"kelvin", Unit::kelvin},  Word{"tesla", Unit::tesla}};

struct Prefix {
  std::string_view text;
  int exponent;
};
constexpr std::array kPrefixes = {Prefix{"p", -12}, Prefix{"n", -9}, Prefix{"u", -6}, Prefix{"m", -3},
                                  Prefix{"k", 3},   Prefix{"K", 3},  Prefix{"M", 6},  Prefix{"G", 9}};
constexpr std::array kPrefixWords = {Prefix{"pico", -12}, Prefix{"nano", -9}, Prefix{"micro", -6},
                                     Prefix{"milli", -3}, Prefix{"kilo", 3},  Prefix{"mega", 6}, Prefix{"giga", 9}};

void replace_all(std::string& text, std::string_view from, std::string_view to) {
  for (std::size_t at = text.find(from); at != std::string::npos; at = text.find(from, at + to.size())) {
    text.replace(at, from.size(), to);
  }
}

/// µ (both code points), Ω (both) and ° in ASCII.
std::string in_ascii(std::string_view text) {
  std::string out(text);
  replace_all(out, "\xC2\xB5", "u");
  replace_all(out, "\xCE\xBC", "u");
  replace_all(out, "\xCE\xA9", "ohm");
  replace_all(out, "\xE2\x84\xA6", "ohm");
  replace_all(out, "\xC2\xB0", "deg");
  std::erase(out, ' ');
  return out;
}

template <class Words>
std::optional<Unit> among(const Words& words, std::string_view text) {
  for (const Word& word : words) {
    if (word.text == text) return word.unit;
  }
  return std::nullopt;
}

bool one_of(std::string_view text, std::initializer_list<std::string_view> words) {
  return std::find(words.begin(), words.end(), text) != words.end();
}

/// The last part of "v_ch1_mV": a unit there counts only when no name of a quantity or a label looks like it.
std::optional<ColumnUnit> unit_of_ending(const std::string& name) {
  const std::size_t at = name.rfind('_');
  if (at == std::string::npos || at == 0 || at + 1 == name.size()) return std::nullopt;
  const std::string ending = in_ascii(name.substr(at + 1));
  if (one_of(ending, {"V", "mV", "uV", "kV", "A", "mA", "uA", "nA", "ohm", "Ohm", "kohm", "Mohm", "Hz", "kHz", "MHz", "GHz",
                      "ms", "us", "ns", "ps", "deg", "rad", "dB", "uH", "mH", "nH", "pF", "nF", "uF"})) {
    return understand_column_unit(ending);
  }
  // A lone "s" is seconds behind a name of time only: "v_s" is a source voltage.
  if (ending == "s" && names_time(name.substr(0, at))) return ColumnUnit{Unit::second, 0, false, false};
  return std::nullopt;
}

}  // namespace

std::optional<ColumnUnit> understand_column_unit(std::string_view text) {
  const std::string unit = in_ascii(bare_cell(text));
  if (unit.empty() || unit.size() > 20) return std::nullopt;
  if (const auto found = among(kSymbols, unit)) return ColumnUnit{*found, 0, false, false};
  const std::string lower = lower_case(unit);
  if (one_of(lower, {"deg", "degree", "degrees"})) return ColumnUnit{Unit::radian, 0, true, false};
  if (one_of(lower, {"db", "decibel", "decibels"})) return ColumnUnit{Unit::one, 0, false, true};
  if (const auto found = among(kWords, lower)) return ColumnUnit{*found, 0, false, false};
  for (const Prefix& prefix : kPrefixes) {
    if (!unit.starts_with(prefix.text)) continue;
    const std::string_view rest = std::string_view(unit).substr(prefix.text.size());
    if (one_of(rest, {"R", "m", "K"})) continue;  // with a prefix these mean something else, or nothing
    if (const auto found = among(kSymbols, rest)) return ColumnUnit{*found, prefix.exponent, false, false};
    if (const auto found = among(kWords, lower_case(rest))) return ColumnUnit{*found, prefix.exponent, false, false};
  }
  for (const Prefix& prefix : kPrefixWords) {
    if (!lower.starts_with(prefix.text)) continue;
    const auto found = among(kWords, std::string_view(lower).substr(prefix.text.size()));
    if (found) return ColumnUnit{*found, prefix.exponent, false, false};
  }
  return std::nullopt;
}

std::string column_unit_text(const ColumnUnit& unit) {
  std::string text = unit.degrees ? "deg" : unit.decibels ? "dB" : std::string(symbol(unit.unit));
  if (unit.exponent != 0) {
    const auto prefix = std::find_if(kPrefixes.begin(), kPrefixes.end(),
                                     [&](const Prefix& each) { return each.exponent == unit.exponent; });
    text = prefix == kPrefixes.end() ? std::string() : std::string(prefix->text) + text;
  }
  return understand_column_unit(text) == unit ? text : std::string();
}

Heading understand_heading(const std::string& heading) {
  for (const auto& [open, close] : {std::pair{'(', ')'}, std::pair{'[', ']'}, std::pair{'{', '}'}}) {
    if (heading.empty() || heading.back() != close) continue;
    const std::size_t at = heading.rfind(open);
    if (at == std::string::npos) continue;
    const auto unit = understand_column_unit(std::string_view(heading).substr(at + 1, heading.size() - at - 2));
    if (!unit) continue;
    std::string name(bare_cell(std::string_view(heading).substr(0, at)));
    if (name.empty()) name = heading;
    return {name, unit};
  }
  for (const std::string_view sign : {" in ", " / ", "/", ","}) {  // "Spannung in V", "U / V", "CH1, V"
    const std::size_t at = heading.rfind(sign);
    if (at == std::string::npos || at == 0) continue;
    const auto unit = understand_column_unit(std::string_view(heading).substr(at + sign.size()));
    if (unit) return {std::string(bare_cell(std::string_view(heading).substr(0, at))), unit};
  }
  // Simulators name voltages and currents by letter and place: "V(coil)", "I(L1)".
  if (heading.size() > 3 && heading[1] == '(' && heading.find(')') == heading.size() - 1) {
    if (heading[0] == 'V' || heading[0] == 'v') return {heading, ColumnUnit{Unit::volt, 0, false, false}};
    if (heading[0] == 'I' || heading[0] == 'i') return {heading, ColumnUnit{Unit::ampere, 0, false, false}};
  }
  return {heading, unit_of_ending(heading)};
}

bool names_time(std::string_view name) {
  const std::string lower = lower_case(bare_cell(name));
  return one_of(lower, {"t", "time", "times", "x", "x-axis", "xaxis", "x axis", "second", "seconds", "sec", "zeit", "temps", "tempo",
                        "tiempo", "timestamp", "time stamp", "t_s", "time_s", "timebase"}) ||
         lower.starts_with("time ") || lower.starts_with("time_") || lower.starts_with("t_");
}

bool names_index(std::string_view name) {
  return one_of(lower_case(bare_cell(name)), {"index", "idx", "i", "n", "no", "no.", "nr", "nr.", "#", "sample", "samples", "point",
                                              "points", "row", "sequence", "seq", "number", "sample number", "sample no", "record"});
}

bool names_angle(std::string_view name) {
  const std::string lower = lower_case(bare_cell(name));
  return one_of(lower, {"phi", "theta", "arg", "angle"}) || lower.find("phase") != std::string::npos;
}

}  // namespace coilassay
