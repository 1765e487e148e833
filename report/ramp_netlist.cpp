#include "report/ramp_netlist.h"

#include <fmt/format.h>

#include <filesystem>
#include <vector>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

const std::vector<double>* column(const Table& table, std::string_view name) {
  for (const TableColumn& each : table.columns) {
    if (each.name == name) return &each.values;
  }
  return nullptr;
}

double winding_resistance(const Measurement& m) {
  for (const Correction& each : m.corrections) {
    if (each.name == "winding resistance") return each.value;
  }
  return 0;
}

}  // namespace

std::optional<std::string> ramp_netlist(const Measurement& m, std::string_view program) {
  const Table* curve = nullptr;
  for (const Table& each : m.tables) {
    if (each.name == "curve") curve = &each;
  }
  if (curve == nullptr) return std::nullopt;
  const auto* current = column(*curve, "current_A");
  const auto* flux = column(*curve, "flux_Wb");
  if (current == nullptr || flux == nullptr || current->size() < 2 || current->front() != 0) return std::nullopt;
  const double unit = flux->back();
  if (!(unit > 0)) return std::nullopt;

  const std::string file = m.sources.empty() ? "coil" : std::filesystem::path(m.sources.front().source.name).stem().string();
  const std::string name = identifier(file);
  const double resistance = winding_resistance(m);
  std::string text = fmt::format("* {}: coil with L(i) from a ramp, by {}\n", name, identifier(program));
  text += fmt::format("* holds up to {} A; beyond, the inductance stays as it is there\n", to_shortest(current->back()));
  text += fmt::format("* inner node: flux in units of {} Wb\n", to_shortest(unit));
  text += fmt::format(".subckt {} a b\n", name);
  const char* inner = resistance > 0 ? "c" : "a";
  if (resistance > 0) text += fmt::format("Rw a c {}\n", to_shortest(resistance));
  text += fmt::format("Bl {} b I = pwl(v(psi)", inner);
  const auto point = [&](double x, double y) { text += fmt::format(",\n+ {}, {}", to_shortest(x), to_shortest(y)); };
  // One long step beyond both ends, along the last slope.
  const std::size_t last = current->size() - 1;
  const double slope = ((*current)[last] - (*current)[last - 1]) / ((*flux)[last] - (*flux)[last - 1]);
  const double far_flux = 10 * unit, far_current = current->back() + 9 * unit * slope;
  point(-far_flux / unit, -far_current);
  for (std::size_t k = last; k > 0; --k) point(-(*flux)[k] / unit, -(*current)[k]);
  for (std::size_t k = 0; k <= last; ++k) point((*flux)[k] / unit, (*current)[k]);
  point(far_flux / unit, far_current);
  text += ")\n";
  text += fmt::format("Gp 0 psi {} b {}\n", inner, to_shortest(1 / unit));
  text += "Cp psi 0 1 ic=0\nRp psi 0 1e15\n";
  text += fmt::format(".ends {}\n", name);
  return text;
}

}  // namespace coilassay
