// Recognising a sweep by the headings of a table.
#include <algorithm>
#include <initializer_list>

#include "acquire/number_scan.h"
#include "acquire/table_sweep.h"

namespace coilassay {
namespace {

/// Lower case without blanks, underscores and dots; brackets and quotes are kept, they carry meaning.
std::string reduced(std::string_view name) {
  std::string out;
  for (const char c : lower_case(name)) {
    if (c != ' ' && c != '_' && c != '.' && c != '-' && c != '*') out += c;
  }
  return out;
}

bool one_of(std::string_view text, std::initializer_list<std::string_view> words) {
  return std::find(words.begin(), words.end(), text) != words.end();
}

enum class Role {
  none, frequency, real, imaginary, magnitude, phase, r_s, x_s, l_s, l_p, r_p, c_s, c_p, q, d, g, b, status
};

struct Meaning {
  Role role = Role::none;
  char parameter = 0;  // Z, Y, S when the name says it
};

/// "S11", "Z", "|Y|", "Re(Z)", "zmag": the letter of the parameter in front of, or within, the rest.
char parameter_of(const std::string& name) {
  for (const std::string_view word : {"s11", "s21", "gamma", "reflection"}) {
    if (name.find(word) != std::string::npos) return 'S';
  }
  if (name.find("admittance") != std::string::npos) return 'Y';
  if (name.find("impedance") != std::string::npos) return 'Z';
  if (name.find("v(") != std::string::npos && name.find(")/i(") != std::string::npos) return 'Z';
  std::string bare;
  for (const char c : name) {
    if ((c >= 'a' && c <= 'z') || c == '\'') bare += c;
  }
  for (const std::string_view part : {"real", "re", "imaginary", "imag", "im", "magnitude", "mag", "abs", "phase", "ang", "theta", "deg",
                                      "db", "arg", "mod", "\"", "\'", "in"}) {
    if (bare.size() > part.size() && bare.ends_with(part)) bare.resize(bare.size() - part.size());
    if (bare.size() > part.size() && bare.starts_with(part)) bare.erase(0, part.size());
  }
  if (bare == "s") return 'S';
  if (bare == "z") return 'Z';
  if (bare == "y") return 'Y';
  return 0;
}

bool says(const std::string& name, std::initializer_list<std::string_view> parts) {
  return std::any_of(parts.begin(), parts.end(), [&](std::string_view part) { return name.find(part) != std::string::npos; });
}

Role element_role(const std::string& name) {
  if (one_of(name, {"r", "rs", "esr", "resistance", "seriesresistance", "rser", "rac"})) return Role::r_s;
  if (one_of(name, {"x", "xs", "reactance"})) return Role::x_s;
  if (one_of(name, {"ls", "l", "inductance", "lser", "seriesinductance"})) return Role::l_s;
  if (one_of(name, {"lp", "lpar", "parallelinductance"})) return Role::l_p;
  if (one_of(name, {"rp", "rpar", "parallelresistance"})) return Role::r_p;
  if (one_of(name, {"cs", "cser", "seriescapacitance"})) return Role::c_s;
  if (one_of(name, {"cp", "c", "cpar", "capacitance", "parallelcapacitance"})) return Role::c_p;
  if (one_of(name, {"q", "qfactor", "qualityfactor"})) return Role::q;
  if (one_of(name, {"d", "df", "tand", "dissipation", "dissipationfactor", "tandelta"})) return Role::d;
  if (one_of(name, {"g", "gp", "conductance"})) return Role::g;
  if (one_of(name, {"b", "susceptance"})) return Role::b;
  if (one_of(name, {"status", "stat", "flag", "error", "err", "bad", "state"})) return Role::status;
  return Role::none;
}

Meaning meaning_of(const ColumnHeading& heading) {
  const std::string name = reduced(heading.name);
  const Unit unit = heading.unit ? heading.unit->unit : Unit::one;
  if (unit == Unit::hertz || one_of(name, {"f", "freq", "frequency", "frequenz", "frequence", "fhz", "freqhz", "frequencyhz"})) {
    return {Role::frequency, 0};
  }
  const char parameter = parameter_of(name);
  if (says(name, {"phase", "theta", "phi", "arg", "angle"}) || (heading.unit && (heading.unit->degrees || unit == Unit::radian)) ||
      (parameter != 0 && name.ends_with("deg"))) {
    return {Role::phase, parameter};
  }
  if (const Role role = element_role(name); role != Role::none) return {role, 0};
  if (one_of(name, {"z'", "re", "real", "z're"}) || name.starts_with("re(") || (parameter != 0 && says(name, {"re(", "re:", "real", "re{", "rez", "zre", "res", "s11re", "yre", "rey"}))) {
    return {Role::real, parameter};
  }
  if (one_of(name, {"z''", "z\"", "im", "imag", "imaginary"}) || name.starts_with("im(") || (parameter != 0 && says(name, {"im(", "im:", "imag", "im{", "imz", "zim", "ims", "s11im", "yim", "imy"}))) {
    return {Role::imaginary, parameter};
  }
  if (parameter != 0 || one_of(name, {"mag", "magnitude", "abs", "modulus"}) || (heading.unit && heading.unit->decibels)) {
    return {Role::magnitude, parameter};
  }
  return {};
}

std::optional<double> stated_reference(const TableHeader& header) {
  for (const auto& [key, value] : header.settings) {
    const std::string name = reduced(key);
    if (!one_of(name, {"reference", "referenceimpedance", "referenceresistance", "z0", "zref", "r0", "portimpedance", "systemimpedance"})) continue;
    for (std::size_t n = value.size(); n > 0; --n) {  // "50 ohm": the longest beginning that is a number
      const CellValue number = read_cell(std::string_view(value).substr(0, n), '.');
      if (number.kind == CellKind::number && number.value > 0) return number.value;
    }
  }
  return std::nullopt;
}

/// Real and imaginary part, or size and angle, of whatever it is.
bool is_of_anything(Role role) { return role == Role::real || role == Role::magnitude; }

struct PairRoles {
  Role first, second;
  SweepPair pair;
};

/// In the order of trust: what needs no other quantity comes first.
constexpr PairRoles kPairs[] = {
    {Role::real, Role::imaginary, SweepPair::re_im},      {Role::r_s, Role::x_s, SweepPair::re_im},
    {Role::g, Role::b, SweepPair::re_im},                 {Role::magnitude, Role::phase, SweepPair::magnitude_phase},
    {Role::l_s, Role::r_s, SweepPair::l_s_r_s},           {Role::l_p, Role::r_p, SweepPair::l_p_r_p},
    {Role::c_p, Role::g, SweepPair::c_p_g},               {Role::c_p, Role::r_p, SweepPair::c_p_r_p},
    {Role::c_s, Role::r_s, SweepPair::c_s_r_s},           {Role::l_s, Role::q, SweepPair::l_s_q},
    {Role::l_p, Role::q, SweepPair::l_p_q},               {Role::l_s, Role::d, SweepPair::l_s_d},
    {Role::l_p, Role::d, SweepPair::l_p_d},               {Role::c_s, Role::d, SweepPair::c_s_d},
    {Role::c_p, Role::d, SweepPair::c_p_d},
};

}  // namespace

std::optional<SweepPlan> plan_sweep(const TableHeader& header) {
  std::vector<Meaning> meanings;
  for (const ColumnHeading& heading : header.columns) meanings.push_back(heading.left_out ? Meaning{} : meaning_of(heading));
  const auto find = [&](Role role) -> std::optional<std::size_t> {
    for (std::size_t c = 0; c < meanings.size(); ++c) {
      if (meanings[c].role == role) return c;
    }
    return std::nullopt;
  };
  const auto frequency = find(Role::frequency);
  if (!frequency) return std::nullopt;
  for (const PairRoles& roles : kPairs) {
    const auto first = find(roles.first);
    const auto second = find(roles.second);
    if (!first || !second) continue;
    SweepPlan plan;
    plan.frequency = *frequency;
    plan.pair = roles.pair;
    plan.first = *first;
    plan.second = *second;
    plan.status = find(Role::status);
    plan.reference_ohm = stated_reference(header);
    if (roles.first == Role::g) plan.parameter = 'Y';
    for (const std::size_t c : {*first, *second}) {
      if (meanings[c].parameter != 0) plan.parameter = meanings[c].parameter;
    }
    const auto& first_unit = header.columns[*first].unit;
    const auto& second_unit = header.columns[*second].unit;
    plan.decibels = (first_unit && first_unit->decibels) || reduced(header.columns[*first].name).ends_with("db");
    if (roles.first == Role::magnitude && second_unit) plan.degrees = second_unit->degrees;
    if (roles.first == Role::magnitude && !second_unit && reduced(header.columns[*second].name).ends_with("deg")) plan.degrees = true;
    const bool ohms = first_unit && first_unit->unit == Unit::ohm;
    const bool siemens = first_unit && first_unit->unit == Unit::siemens;
    if (ohms) plan.parameter = 'Z';
    if (siemens) plan.parameter = 'Y';
    const bool bare_pair = is_of_anything(roles.first);
    plan.parameter_stated = !bare_pair || ohms || siemens || meanings[*first].parameter != 0 || meanings[*second].parameter != 0;
    return plan;
  }
  // A size on its own says less, but not nothing; the heading must say that it is one of an impedance.
  const auto size = find(Role::magnitude);
  if (!size) return std::nullopt;
  const auto& unit = header.columns[*size].unit;
  const bool ohms = unit && unit->unit == Unit::ohm, siemens = unit && unit->unit == Unit::siemens;
  const char parameter = ohms ? 'Z' : siemens ? 'Y' : meanings[*size].parameter;
  if (parameter != 'Z' && parameter != 'Y') return std::nullopt;
  SweepPlan plan;
  plan.frequency = *frequency;
  plan.pair = SweepPair::magnitude;
  plan.parameter = parameter;
  plan.first = plan.second = *size;
  plan.decibels = (unit && unit->decibels) || reduced(header.columns[*size].name).ends_with("db");
  plan.status = find(Role::status);
  return plan;
}

}  // namespace coilassay
