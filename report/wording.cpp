#include "report/wording.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "analysis/symbols.h"
#include "base/outside_text.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

/// Significant digits of `value` so that its last place is the second digit of `half_width`.
int digits_for(double value, double half_width) {
  if (value == 0 || !(half_width > 0) || !std::isfinite(half_width)) return 5;
  const double places = std::floor(std::log10(std::fabs(value))) - std::floor(std::log10(half_width)) + 2;
  return static_cast<int>(std::clamp(places, 2.0, 12.0));
}

/// Halves that differ by less than a tenth are read as one number; JSON has both ends.
bool symmetric(const Estimate& e) {
  const double up = e.high - e.quantity.value;
  const double down = e.quantity.value - e.low;
  return std::fabs(up - down) <= 0.1 * std::fmax(up, down);
}

std::string where_in_words(const Estimate& e, Script script) {
  std::string text;
  const auto add = [&](std::string_view before, const std::optional<double>& value, Unit unit) {
    if (!value) return;
    if (!text.empty()) text += ", ";
    text += std::string(before) + to_text(*value, unit, script);
  };
  add("at ", e.at_hz, Unit::hertz);
  add("at ", e.at_a, Unit::ampere);
  add("from ", e.reference_a, Unit::ampere);
  if (!e.definition.empty()) text += (text.empty() ? "" : ", ") + in_script(shown(e.definition), script);
  return text;
}

ValueText labelled(std::string_view symbol) {
  const Symbol* known = find_symbol(symbol);
  ValueText text;
  text.words = known != nullptr ? known->words : symbol;
  text.symbol = symbol;
  return text;
}

/// The order in which a reader of the test looks for its quantities; what is not named follows as it was found.
std::vector<std::string_view> reading_order(std::string_view test) {
  if (test == "ringdown") return {"L", "L_s", "R_s", "C_par", "Q_coil", "Q", "f_0", "f_d", "alpha"};
  if (test == "ramp") return {"L_0", "I_sat_10", "I_sat_20", "I_sat_30", "R_dc"};
  if (test == "sine") return {"Z", "phi", "L_s", "R_s", "Q"};
  if (test == "sweep") return {"L", "R_dc", "R_ac", "C_par", "R_par", "f_r"};
  if (test == "coupling") return {"k", "M", "L_1", "L_2", "n"};
  if (test == "resistance") return {"R_dc", "R_dc_20", "T_winding", "T_rise"};
  return {};
}

/// What a table of points shows; the document for programs has the rest.
std::vector<std::string_view> point_symbols(std::string_view test) {
  if (test == "ringdown") return {"f_0", "Q"};
  if (test == "coupling") return {"L_1", "L_2", "M", "k"};
  return {"L_s", "R_s", "Q"};
}

}  // namespace

std::string test_in_words(std::string_view test) {
  if (test == "ringdown") return "Ring-down";
  if (test == "ramp") return "Ramp";
  if (test == "sine") return "Sine";
  if (test == "sweep") return "Sweep";
  if (test == "coupling") return "Coupling";
  if (test == "resistance") return "Winding resistance";
  return std::string(test);
}

ValueText value_text(const Estimate& e, Script script) {
  ValueText text = labelled(e.symbol);
  text.where = where_in_words(e, script);
  // The coefficient of a law over frequency is nothing without its frequency.
  if (e.symbol == "R_ac" && e.at_hz) text.words += " at " + setting_in_words(*e.at_hz, Unit::hertz, script);
  const Quantity& q = e.quantity;
  const bool low = std::isfinite(e.low), high = std::isfinite(e.high);
  if (low && high && symmetric(e)) {
    const std::string both = to_text_expanded(q.value, e.half_width(), q.unit, script);
    const std::string_view sign = script == Script::utf8 ? "±" : "+/-";
    const std::size_t at = both.find(sign);
    text.value = both.substr(0, at);
    text.value.erase(text.value.find_last_not_of(' ') + 1);
    if (at != std::string::npos) text.deviation = both.substr(at);
    return text;
  }
  const double width = low ? q.value - e.low : high ? e.high - q.value : std::nan("");
  const int digits = digits_for(q.value, low && high ? std::fmin(q.value - e.low, e.high - q.value) : width);
  text.value = to_text(q.value, q.unit, script, digits);
  if (low && high) {
    text.deviation = to_text(e.low, q.unit, script, digits) + " to " + to_text(e.high, q.unit, script, digits);
  } else if (low) {
    text.deviation = "at least " + to_text(e.low, q.unit, script, digits);
  } else if (high) {
    text.deviation = "at most " + to_text(e.high, q.unit, script, digits);
  } else {
    text.deviation = "uncertainty not known";
  }
  return text;
}

ValueText value_text(const Bound& bound, Script script) {
  ValueText text = labelled(bound.symbol);
  if (bound.at_least) text.deviation = "at least " + to_text(*bound.at_least, bound.unit, script);
  if (bound.at_least && bound.at_most) text.deviation += ", ";
  if (bound.at_most) text.deviation += "at most " + to_text(*bound.at_most, bound.unit, script);
  return text;
}

std::vector<ValueText> values_of(const Measurement& m, Script script) {
  const auto order = reading_order(m.test);
  std::vector<const Estimate*> sorted;
  for (const Estimate& each : m.estimates) {
    if (std::isfinite(each.quantity.value)) sorted.push_back(&each);
  }
  std::stable_sort(sorted.begin(), sorted.end(), [&order](const Estimate* a, const Estimate* b) {
    return std::find(order.begin(), order.end(), a->symbol) < std::find(order.begin(), order.end(), b->symbol);
  });
  std::vector<ValueText> values;
  for (const Estimate* each : sorted) values.push_back(value_text(*each, script));
  for (const Bound& each : m.bounds) {
    values.push_back(value_text(each, script));
    // As for a value: a law's coefficient holds at one frequency.
    if (each.symbol != "R_ac" || !m.model) continue;
    const auto at = m.model->parameters.find("f_ref");
    if (at != m.model->parameters.end()) values.back().words += " at " + setting_in_words(at->second.value, Unit::hertz, script);
  }
  return values;
}

std::vector<std::vector<std::string>> points_of(const Measurement& m, Script script) {
  if (m.points.empty()) return {};
  std::vector<std::vector<std::string>> table(m.points.size() + 1);
  const auto add_column = [&](std::string_view head, const auto& cell_of) {
    std::vector<std::string> cells;
    bool any = false;
    for (const Point& each : m.points) {
      cells.push_back(cell_of(each));
      any = any || !cells.back().empty();
    }
    if (!any) return;
    table[0].emplace_back(head);
    for (std::size_t i = 0; i < cells.size(); ++i) table[i + 1].push_back(std::move(cells[i]));
  };
  const auto add_condition = [&](std::string_view head, std::optional<double> Point::*value, Unit unit) {
    add_column(head,
               [&](const Point& each) { return each.*value ? setting_in_words(*(each.*value), unit, script) : ""; });
  };
  add_column("from", [&](const Point& each) { return in_script(shown(each.from, 40), script); });
  add_condition("capacitor", &Point::capacitance_f, Unit::farad);
  if (m.test != "ringdown") add_condition("frequency", &Point::at_hz, Unit::hertz);  // there it is a result
  add_condition("level", &Point::level_a, Unit::ampere);
  add_condition("bias", &Point::bias_a, Unit::ampere);
  for (const std::string_view symbol : point_symbols(m.test)) {
    add_column(symbol, [&](const Point& each) -> std::string {
      for (const Estimate& e : each.estimates) {
        if (e.symbol == symbol && std::isfinite(e.quantity.value)) return to_text(e.quantity, script);
      }
      return {};
    });
  }
  return table;
}

std::vector<std::string> conditions_in_words(const Conditions& c, Script script) {
  std::vector<std::string> list;
  const auto add = [&](std::string_view words, const std::optional<double>& value, Unit unit) {
    if (value && std::isfinite(*value)) list.push_back(std::string(words) + ' ' + to_text(*value, unit, script));
  };
  add("frequency", c.frequency_hz, Unit::hertz);
  add("level", c.level_v, Unit::volt);
  add("level", c.level_a, Unit::ampere);
  add("bias", c.bias_a, Unit::ampere);
  add("peak current", c.peak_current_a, Unit::ampere);
  add("temperature", c.temperature_degc, Unit::degree_celsius);
  return list;
}

std::string setting_in_words(double value, Unit unit, Script script, int digits) {
  std::string text = to_text(value, unit, script, digits);
  const std::size_t point = text.find('.');
  const std::size_t end = std::min(text.find(' '), text.size());
  if (point >= end) return text;
  std::size_t last = end;
  while (text[last - 1] == '0') --last;
  if (text[last - 1] == '.') --last;
  return text.erase(last, end - last);
}

std::string source_in_words(const SourceRecord& record, Script script) {
  std::string text = in_script(shown(record.source.name), script) + ": " + std::to_string(record.samples) + " samples";
  if (std::isfinite(record.sample_interval_s))
    text += " every " + setting_in_words(record.sample_interval_s, Unit::second, script);
  return text;
}

std::vector<std::string> main_symbols(const Measurement& m) {
  const auto any_of = [&m](std::initializer_list<const char*> wanted) {
    std::vector<std::string> list;
    for (const char* each : wanted) {
      if (m.budget.contains(each) && m.find(each) != nullptr) list.emplace_back(each);
    }
    return list;
  };
  std::vector<std::string> list;
  if (m.test == "ringdown") list = any_of({"L", "L_s", "R_s", "C_par", "Q_coil"});
  if (m.test == "ringdown" && list.empty()) list = any_of({"f_0", "alpha", "Q"});
  if (m.test == "ramp") list = any_of({"L_0", "I_sat_10", "I_sat_20", "I_sat_30"});
  if (m.test == "sine") list = any_of({"L_s", "R_s", "Q"});
  if (m.test == "sweep") list = any_of({"L", "R_dc", "C_par", "f_r"});
  if (m.test == "coupling") list = any_of({"k", "M", "L_1", "L_2"});
  if (m.test == "resistance") list = any_of({"R_dc", "R_dc_20", "T_rise"});
  if (list.empty()) {
    for (const auto& [of, lines] : m.budget) list.push_back(of);
  }
  return list;
}

std::vector<BudgetLine> by_share(std::vector<BudgetLine> lines) {
  std::stable_sort(lines.begin(), lines.end(),
                   [](const BudgetLine& a, const BudgetLine& b) { return a.share > b.share; });
  return lines;
}

std::string share_in_words(double share) {
  if (!(share >= 0.01)) return "under 1 %";
  if (share < 1 && share > 0.99) return "over 99 %";
  return fmt::format("{:.0f} %", 100 * share);
}

std::string made_of(const std::vector<BudgetLine>& lines) {
  constexpr std::size_t kTerms = 3;
  std::string text;
  double rest = 1;
  std::size_t said = 0;
  for (const BudgetLine& line : by_share(lines)) {
    if (said == kTerms || (said > 0 && line.share < 0.01)) break;
    text += (said > 0 ? ", " : "") + shown(line.source) + ' ' + share_in_words(line.share);
    rest -= line.share;
    ++said;
  }
  if (rest >= 0.01) text += ", the rest " + share_in_words(rest);
  return text;
}

std::vector<std::string> defaults_taken(const Measurement& m, const std::vector<std::string>& of) {
  std::vector<std::string> list;
  for (const std::string& each : of) {
    const auto lines = m.budget.find(each);
    if (lines == m.budget.end()) continue;
    for (const BudgetLine& line : lines->second) {
      if (line.share < 0.01 || !line.basis.starts_with("default")) continue;
      std::string_view reason = line.basis;
      reason.remove_prefix(std::min(reason.size(), reason.find_first_not_of(": ", std::string_view("default").size())));
      std::string sentence = shown(line.source) + (reason.empty() ? "" : ": " + shown(reason));
      if (std::find(list.begin(), list.end(), sentence) == list.end()) list.push_back(std::move(sentence));
    }
  }
  return list;
}

std::vector<Finding> by_weight(std::vector<Finding> findings) {
  std::stable_sort(findings.begin(), findings.end(),
                   [](const Finding& a, const Finding& b) { return a.severity > b.severity; });
  return findings;
}

std::string figure_in_words(const Caution& caution, Script script) {
  // Most messages hold their number already; the same number twice would look like two.
  bool said = false;
  for (int digits = 1; digits <= 5; ++digits) {
    said =
        said || caution.message.find(to_text(caution.figure, caution.unit, Script::utf8, digits)) != std::string::npos;
  }
  std::string text = said ? "" : to_text(caution.figure, caution.unit, script, 3);
  if (!caution.basis.empty()) {
    text += (text.empty() ? "threshold " : "; threshold ") + in_script(shown(caution.basis), script);
  }
  return text;
}

bool was_measured(const Measurement& m) {
  const Estimate* leading = m.find(leading_symbol(m.test));
  return leading != nullptr && std::isfinite(leading->quantity.value);
}

std::string named(std::string_view symbol) {
  const Symbol* known = find_symbol(symbol);
  return known != nullptr ? fmt::format("{} {}", known->words, symbol) : std::string(symbol);
}

}  // namespace coilassay
