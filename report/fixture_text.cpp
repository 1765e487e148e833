#include "report/fixture_text.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/utc_time.h"
#include "report/json_writer.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

Json number(double value) { return std::isfinite(value) ? Json(value) : Json(nullptr); }

Json stated(const std::optional<StatedValue>& value) {
  if (!value) return nullptr;
  Json object = {{"value", number(value->value)}, {"unit", symbol(value->unit)}};
  object["u"] = value->law == Law::unstated ? Json(nullptr) : number(value->standard_uncertainty);
  return object;
}

std::string value(double x, Unit unit, Script script) { return to_text(x, unit, script, 3); }

/// "34.1 mΩ + 18.0 nH": an inductance in series may come out negative, when more was taken off than is there.
std::string pair(double a, Unit unit_a, double b, Unit unit_b, Script script) {
  return value(a, unit_a, script) + (b < 0 ? " - " : " + ") + value(std::fabs(b), unit_b, script);
}

/// "400 pH ± 100 pH"
std::string stated_text(const StatedValue& v, Script script) {
  const std::string text = value(v.value, v.unit, script);
  if (v.law == Law::rectangular) return text + " ± " + value(v.half_width, v.unit, script);
  if (v.law == Law::normal) return text + " ± " + value(2 * v.standard_uncertainty, v.unit, script) + " (k=2)";
  return v.law == Law::exact ? text + ", exact" : text + ", its tolerance not stated";
}

}  // namespace

std::string to_text(const FixtureSet& set, std::span<const FixtureEffect> effects, std::optional<double> part_h,
                    std::span<const Finding> findings, const TextStyle& style) {
  const Script script = style.script;
  std::string page = wrapped(in_script("Fixture set " + shown(set.name, 60) + ": open, short" + (set.load ? " and load" : "") + ", " +
                                           std::to_string(set.frequency_hz.size()) + " frequencies from " +
                                           to_text(set.frequency_hz.front(), Unit::hertz, script) + " to " +
                                           to_text(set.frequency_hz.back(), Unit::hertz, script),
                                       script), "", style.width);
  std::vector<std::vector<std::string>> facts;
  facts.push_back({"made", to_text(set.made) + (set.expires ? ", good until " + to_text(*set.expires) : ", no last day stated")});
  facts.push_back({"connection", set.connection == Connection::reflect ? "reflect, port " + std::to_string(set.port)
                                                                        : std::string(name(set.connection))});
  facts.push_back({"the short", stated_text(set.short_inductance, script)});
  if (set.load_value) facts.push_back({"the load", stated_text(*set.load_value, script)});
  for (auto& row : facts) row[1] = in_script(row[1], script);
  page += aligned(facts, "  ") + "\nWhat it takes out\n";
  std::vector<std::vector<std::string>> rows{{"frequency", "in series", "across the part"}};
  if (part_h) rows[0].push_back("of " + to_text(*part_h, Unit::henry, script));
  for (const FixtureEffect& e : effects) {
    rows.push_back({to_text(e.frequency_hz, Unit::hertz, script), pair(e.series_ohm, Unit::ohm, e.series_h, Unit::henry, script),
                    pair(e.parallel_s, Unit::siemens, e.parallel_f, Unit::farad, script)});
    if (part_h) rows.back().push_back(to_percent_text(e.part_share, script));
  }
  for (auto& row : rows) {
    for (std::string& cell : row) cell = in_script(cell, script);
  }
  page += aligned(rows, "  ");
  for (const Finding& f : findings) {
    page += "\n" + wrapped(in_script(shown(f.message, 400), script), "  " + std::string(name(f.severity)) + "  ", style.width);
  }
  return page;
}

std::string to_json(const FixtureSet& set, std::span<const FixtureEffect> effects, std::optional<double> part_h,
                    std::span<const Finding> findings, std::string_view file, std::string_view program) {
  const auto standard = [](const MeasuredStandard& m) { return Json{{"file", json_safe(m.file)}, {"sha256", json_safe(m.sha256)}}; };
  Json standards = {{"open", standard(set.open)}, {"short", standard(set.short_circuit)}};
  standards["open"]["capacitance"] = stated(set.open_capacitance);
  standards["short"]["inductance"] = stated(set.short_inductance);
  standards["short"]["resistance"] = stated(set.short_resistance);
  if (set.load) {
    standards["load"] = standard(*set.load);
    standards["load"]["value"] = stated(set.load_value);
    standards["load"]["inductance"] = stated(set.load_inductance);
  }
  Json list = Json::array(), raised = Json::array();
  for (const FixtureEffect& e : effects) {
    Json row = {{"at_Hz", e.frequency_hz}, {"series_ohm", number(e.series_ohm)}, {"series_H", number(e.series_h)},
                {"parallel_S", number(e.parallel_s)}, {"parallel_F", number(e.parallel_f)}};
    if (part_h) row["share"] = number(e.part_share);
    list.push_back(std::move(row));
  }
  for (const Finding& f : findings) {
    raised.push_back({{"code", f.code}, {"severity", name(f.severity)}, {"message", json_safe(f.message)}, {"figure", number(f.figure)}});
  }
  Json document = {{"schema", "coilassay.fixture/1"},
                   {"program", program},
                   {"name", json_safe(set.name)},
                   {"file", json_safe(file)},
                   {"made", to_text(set.made)},
                   {"expires", set.expires ? Json(to_text(*set.expires)) : Json(nullptr)},
                   {"connection", name(set.connection)},
                   {"port", set.port},
                   {"points", set.frequency_hz.size()},
                   {"frequency_first_Hz", set.frequency_hz.front()},
                   {"frequency_last_Hz", set.frequency_hz.back()},
                   {"standards", std::move(standards)},
                   {"part_H", part_h ? Json(*part_h) : Json(nullptr)},
                   {"effects", std::move(list)},
                   {"findings", std::move(raised)}};
  return json_text(document);
}

}  // namespace coilassay
