#include "report/coupling_tables.h"

#include <fmt/format.h>

#include <cmath>
#include <utility>

#include "report/text_layout.h"
#include "report/wording.h"

namespace coilassay {

namespace {

std::string in_plain_words(std::string item) {
  for (char& c : item) c = c == '_' ? ' ' : c;
  return item;
}

TitledTable inputs_table(const Measurement& m, Script script) {
  TitledTable table{"What each input says and what it should have been", {}};
  bool with_frequency = false;
  for (const InputCheck& each : m.inputs) with_frequency = with_frequency || each.at_hz;
  std::vector<std::string> head = {"input"};
  if (with_frequency) head.emplace_back("at");
  head.insert(head.end(), {"measured", "computed", "difference in u"});
  table.rows.push_back(std::move(head));
  for (const InputCheck& each : m.inputs) {
    std::vector<std::string> row = {in_plain_words(each.item)};
    if (with_frequency) row.push_back(each.at_hz ? to_text(*each.at_hz, Unit::hertz, script) : "");
    row.push_back(to_text(each.value, script));
    row.push_back(to_text(each.predicted, each.value.unit, script, 5));
    row.push_back(std::isfinite(each.residual_u) ? fmt::format("{:+.1f}", each.residual_u + 0.0 * each.residual_u) : "");
    // "-0.0" would look like a finding.
    if (row.back() == "-0.0") row.back() = "+0.0";
    table.rows.push_back(std::move(row));
  }
  return table;
}

TitledTable equivalents_table(const Measurement& m, Script script) {
  TitledTable table{"Equivalent circuits", {{"circuit", "element", "value", "95 % interval"}}};
  for (const Equivalent& each : m.equivalents) {
    std::string circuit = each.name;
    for (const Estimate& e : each.elements) {
      const ValueText text = value_text(e, script);
      table.rows.push_back({std::exchange(circuit, ""), e.symbol, text.value, text.deviation});
    }
  }
  return table;
}

TitledTable matrix_table(const std::string& title, const InductanceMatrices& m, const auto& cell) {
  TitledTable table{title, {{"winding"}}};
  for (const std::string& port : m.ports) table.rows.front().push_back(port);
  for (std::size_t i = 0; i < m.ports.size(); ++i) {
    std::vector<std::string> row = {m.ports[i]};
    for (std::size_t j = 0; j < m.ports.size(); ++j) row.push_back(cell(i, j));
    table.rows.push_back(std::move(row));
  }
  return table;
}

}  // namespace

std::vector<TitledTable> coupling_tables(const Measurement& m, Script script) {
  std::vector<TitledTable> tables;
  if (!m.inputs.empty()) tables.push_back(inputs_table(m, script));
  if (!m.equivalents.empty()) tables.push_back(equivalents_table(m, script));
  if (m.matrices) {
    const InductanceMatrices& all = *m.matrices;
    tables.push_back(matrix_table("Inductance matrix", all, [&](std::size_t i, std::size_t j) {
      return to_text_expanded(all.inductance_h[i][j], all.U_h[i][j], Unit::henry, script);
    }));
    tables.push_back(matrix_table(all.positive_definite ? "Coupling matrix (possible: positive definite)"
                                                        : "Coupling matrix (impossible: not positive definite)",
                                  all, [&](std::size_t i, std::size_t j) { return fmt::format("{:.4f}", all.coupling[i][j]); }));
  }
  return tables;
}

}  // namespace coilassay
