#include "report/advice_document.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>
#include <vector>

#include "base/number_text.h"
#include "report/json_writer.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

/// "0.0988 to 0.1012", to the digits that the width leaves.
std::string interval_in_words(const CouplingMethod& m) {
  const double width = m.high - m.low;
  const int places = width > 0 ? static_cast<int>(std::clamp(1 - std::floor(std::log10(width)), 2.0, 9.0)) : 6;
  if (m.at_low && m.at_high) return "nothing";
  if (m.at_low) return fmt::format("at most {:.{}f}", m.high, places);
  if (m.at_high) return fmt::format("at least {:.{}f}", m.low, places);
  return fmt::format("{:.{}f} to {:.{}f}", m.low, places, m.high, places);
}

const CouplingMethod* find_method(const CouplingAdvice& advice, const std::string& name) {
  for (const CouplingMethod& m : advice.methods) {
    if (m.name == name) return &m;
  }
  return nullptr;
}

}  // namespace

std::string to_json(const CouplingAdvice& advice, std::string_view program) {
  const CouplingAdviceRequest& r = advice.request;
  Json methods = Json::array();
  for (const CouplingMethod& m : advice.methods) {
    Json items = Json::array();
    for (const CouplingItem item : m.items) items.push_back(name(item));
    Json each = {{"method", m.name}, {"items", std::move(items)}, {"k_interval", {m.low, m.high}}};
    each["u_k"] = std::isfinite(m.u) ? Json(m.u) : Json(nullptr);
    each["limit_only"] = m.at_low || m.at_high;
    if (m.reaches) each["reaches"] = *m.reaches;
    methods.push_back(std::move(each));
  }
  return json_text({{"schema", "coilassay.advice/1"},
                    {"program", program},
                    {"test", "coupling"},
                    {"L_1_H", r.l1_h},
                    {"L_2_H", r.l2_h},
                    {"k", r.k},
                    {"accuracy", r.accuracy},
                    {"ratio_accuracy", r.ratio_accuracy},
                    {"wanted", r.wanted ? Json(*r.wanted) : Json(nullptr)},
                    {"confidence", 0.95},
                    {"methods", std::move(methods)},
                    {"best", advice.best},
                    {"sufficient", advice.sufficient}});
}

std::string to_text(const CouplingAdvice& advice, const TextStyle& style) {
  const CouplingAdviceRequest& r = advice.request;
  std::string text = in_script(fmt::format("How well k could be known: windings of {} and {}, k about {}\n", to_text(r.l1_h, Unit::henry, style.script),
                                           to_text(r.l2_h, Unit::henry, style.script), to_text(r.k, Unit::one, style.script)),
                               style.script);
  text += in_script(fmt::format("  each inductance to ±{}, each voltage ratio to ±{}, errors independent\n\n", to_percent_text(r.accuracy),
                                to_percent_text(r.ratio_accuracy)),
                    style.script);
  std::vector<std::vector<std::string>> rows = {{"measured", "95 % interval of k"}};
  if (r.wanted) rows.front().emplace_back("enough");
  for (const CouplingMethod& m : advice.methods) {
    rows.push_back({m.words, interval_in_words(m)});
    if (r.wanted) rows.back().emplace_back(m.reaches == true ? "yes" : "no");
  }
  text += aligned(rows, "  ") + "\n";
  if (const CouplingMethod* best = find_method(advice, advice.best)) {
    text += wrapped("The narrowest by itself: " + best->words + ".", "  ", style.width);
  }
  if (r.wanted) {
    const std::string aim = fmt::format("±{} of {}", to_percent_text(*r.wanted), r.k <= 0.5 ? "k" : "1 - k");
    if (advice.sufficient.empty()) {
      text += wrapped(in_script("Nothing reaches " + aim + " with this instrument, not even all together.", style.script), "  ", style.width);
    } else if (const CouplingMethod* fewest = find_method(advice, advice.sufficient.front())) {
      text += wrapped(in_script("For " + aim + " the least to measure: " + fewest->words + ".", style.script), "  ", style.width);
    }
  }
  return text;
}

}  // namespace coilassay
