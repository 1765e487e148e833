#include "report/coupling_netlist.h"

#include <fmt/format.h>

#include <cmath>
#include <filesystem>
#include <vector>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

struct Circuit {
  std::vector<double> inductance, resistance, capacitance;
  std::vector<std::vector<double>> coupling;
};

double parameter(const Measurement& m, const std::string& name) {
  const auto found = m.model ? m.model->parameters.find(name) : std::map<std::string, Quantity>::const_iterator{};
  return m.model && found != m.model->parameters.end() ? found->second.value : 0;
}

const std::vector<double>* column(const Measurement& m, std::string_view table, std::string_view name) {
  for (const Table& each : m.tables) {
    if (each.name != table) continue;
    for (const TableColumn& c : each.columns) {
      if (c.name == name) return &c.values;
    }
  }
  return nullptr;
}

std::optional<Circuit> circuit_of(const Measurement& m) {
  Circuit c;
  if (m.matrices) {
    if (!m.matrices->positive_definite) return std::nullopt;
    const auto* r = column(m, "windings", "resistance_ohm");
    const auto* cap = column(m, "windings", "capacitance_F");
    for (std::size_t i = 0; i < m.matrices->ports.size(); ++i) {
      c.inductance.push_back(m.matrices->inductance_h[i][i]);
      c.resistance.push_back(r != nullptr ? (*r)[i] : 0);
      c.capacitance.push_back(cap != nullptr ? (*cap)[i] : 0);
    }
    c.coupling = m.matrices->coupling;
    return c;
  }
  const double l1 = parameter(m, "L_1"), l2 = parameter(m, "L_2"), k = parameter(m, "k");
  if (m.find("k") == nullptr || !(l1 > 0) || !(l2 > 0) || !(std::fabs(k) < 1)) return std::nullopt;
  c.inductance = {l1, l2};
  c.resistance = {parameter(m, "R_1"), parameter(m, "R_2")};
  c.capacitance = {parameter(m, "C_1"), parameter(m, "C_2")};
  c.coupling = {{1, k}, {k, 1}};
  return c;
}

}  // namespace

std::optional<std::string> coupling_netlist(const Measurement& m, std::string_view program) {
  std::optional<Circuit> circuit = circuit_of(m);
  if (!circuit) return std::nullopt;
  Circuit& c = *circuit;
  const std::string file = m.sources.empty() ? "windings" : std::filesystem::path(m.sources.front().source.name).stem().string();
  const std::string name = identifier(file);
  const std::size_t n = c.inductance.size();
  // Windings whose coupling to the first is negative are laid the other way round.
  std::vector<bool> turned(n, false);
  for (std::size_t i = 1; i < n; ++i) turned[i] = c.coupling[0][i] < 0;
  std::string text = fmt::format("* {}: coupled windings, by {}\n", name, identifier(program));
  text += fmt::format(".subckt {}", name);
  for (std::size_t i = 1; i <= n; ++i) text += fmt::format(" a{} b{}", i, i);
  text += "\n";
  for (std::size_t i = 0; i < n; ++i) {
    const std::size_t w = i + 1;
    const std::string from = fmt::format("{}{}", turned[i] ? "b" : "a", w), to = fmt::format("{}{}", turned[i] ? "a" : "b", w);
    const bool resistive = c.resistance[i] > 0;
    text += fmt::format("L{} {} {} {}\n", w, from, resistive ? fmt::format("c{}", w) : to, to_shortest(c.inductance[i]));
    if (resistive) text += fmt::format("R{} c{} {} {}\n", w, w, to, to_shortest(c.resistance[i]));
    if (c.capacitance[i] > 0) text += fmt::format("C{} a{} b{} {}\n", w, w, w, to_shortest(c.capacitance[i]));
  }
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = i + 1; j < n; ++j) {
      const double k = (turned[i] != turned[j] ? -1 : 1) * c.coupling[i][j];
      if (k != 0) text += fmt::format("K{}_{} L{} L{} {}\n", i + 1, j + 1, i + 1, j + 1, to_shortest(k));
    }
  }
  text += fmt::format(".ends {}\n", name);
  return text;
}

}  // namespace coilassay
