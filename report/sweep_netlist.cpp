#include "report/sweep_netlist.h"

#include <fmt/format.h>

#include <cmath>
#include <filesystem>
#include <numbers>

#include "analysis/sweep_circuit.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using P = CircuitParameter;
constexpr double kPi = std::numbers::pi;
constexpr double kPerDecade = 2;
constexpr double kBeyond = 100;   // the chain goes on that far past either end of the span

/// A chain of two-terminal elements between the nodes a and b.
class Chain {
 public:
  /// One element, or two in parallel, as the next link.
  void link(const std::string& first, double value, const std::string& second = "", double second_value = 0) {
    ++links_;
    lines_.push_back({first, to_shortest(value), links_});
    if (!second.empty()) lines_.push_back({second, to_shortest(second_value), links_});
  }
  /// A link of several lines: what stands before and behind its two nodes.
  void link(const std::vector<std::pair<std::string, std::string>>& lines) {
    ++links_;
    for (const auto& [before, behind] : lines) lines_.push_back({before, behind, links_});
  }

  std::string text() const {
    std::string all;
    for (const Line& line : lines_) {
      all += fmt::format("{} {} {} {}\n", line.before, node(line.link - 1), node(line.link), line.behind);
    }
    return all;
  }

 private:
  std::string node(int after) const { return after == 0 ? "a" : after == links_ ? "b" : fmt::format("n{}", after); }
  struct Line {
    std::string before, behind;
    int link;
  };
  std::vector<Line> lines_;
  int links_ = 0;
};

/// sqrt(s) = (1/pi) times the integral over ln u of sqrt(u) s/(s + u): each term a resistance with an inductance across it.
void add_skin(Chain& chain, double ohm, double reference_hz, double low_hz, double high_hz) {
  const double scale = ohm * std::sqrt(2 / (2 * kPi * reference_hz));   // (1+j) sqrt(f/f_ref) = sqrt(2 s/w_ref)
  const double step = std::log(10.0) / kPerDecade;
  const double first = std::log(2 * kPi * low_hz / kBeyond), last = std::log(2 * kPi * high_hz * kBeyond);
  const int count = static_cast<int>(std::ceil((last - first) / step));
  for (int k = 0; k <= count; ++k) {
    const double u = std::exp(first + k * step);
    const double resistance = scale * step * std::sqrt(u) / kPi;
    chain.link(fmt::format("Rs{}", k), resistance, fmt::format("Ls{}", k), resistance / u);
  }
  // What lies below is a resistance within the span, but nothing at direct current; what lies above an inductance.
  const double below = std::exp(first - step / 2), above = std::exp(first + (count + 0.5) * step);
  const double rest = scale * 2 * std::sqrt(below) / kPi;
  chain.link("Rsl", rest, "Lsl", 3 * rest / below);
  chain.link("Lsh", scale * 2 / (kPi * std::sqrt(above)));
}

/// The inductance that follows the flux, its slope at zero made equal to `inductance`.
void add_saturating(Chain& chain, double inductance, const SaturationLaw& law) {
  const double at_start = law.flux_wb[1] / law.current_a[1];
  const double scale = inductance / at_start, unit = scale * law.flux_wb.back();
  const std::size_t last = law.flux_wb.size() - 1;
  const double slope = (law.current_a[last] - law.current_a[last - 1]) / (scale * (law.flux_wb[last] - law.flux_wb[last - 1]));
  std::string text = "I = pwl(v(psi)";
  const auto point = [&](double x, double y) { text += fmt::format(",\n+ {}, {}", to_shortest(x), to_shortest(y)); };
  const double far_current = law.current_a.back() + 9 * unit * slope;
  point(-10, -far_current);
  for (std::size_t k = last; k > 0; --k) point(-scale * law.flux_wb[k] / unit, -law.current_a[k]);
  for (std::size_t k = 0; k <= last; ++k) point(scale * law.flux_wb[k] / unit, law.current_a[k]);
  point(10, far_current);
  // The flux, in units of the largest, is the voltage of an inner node.
  chain.link({{"Bl", text + ")"}, {"Gp 0 psi", to_shortest(1 / unit) + "\nCp psi 0 1 ic=0\nRp psi 0 1e15"}});
}

}  // namespace

std::optional<std::string> sweep_netlist(const Measurement& m, double low_hz, double high_hz, std::string_view program,
                                         const SaturationLaw* law) {
  const std::optional<Circuit> found = circuit_of(m);
  if (!found) return std::nullopt;
  const Circuit& c = *found;
  const std::string file = m.sources.empty() ? "coil" : std::filesystem::path(m.sources.front().source.name).stem().string();
  const std::string name = identifier(file);
  std::string text = fmt::format("* {}: coil from a sweep, by {}\n", name, identifier(program));
  text += fmt::format("* circuit: {}\n", coilassay::name(c.family));
  text += fmt::format("* holds from {} Hz to {} Hz\n", to_shortest(low_hz), to_shortest(high_hz));
  if (law != nullptr) {
    text += fmt::format("* inductance follows L(i) of {} up to {} A, scaled to L of the sweep at small current\n", identifier(law->source),
                        to_shortest(law->current_a.back()));
  }
  text += fmt::format(".subckt {} a b\n", name);
  Chain chain;
  const double l = c[P::inductance], share = c.family.relaxation ? c[P::relaxation_share] : 0;
  if (c[P::series_resistance] > 0) chain.link("Rw", c[P::series_resistance]);
  if (c.family.relaxation && c[P::relaxation_resistance] > 0) {
    const double reactance = 2 * kPi * c.reference_hz * share * l;
    chain.link("Lr", share * l, "Rr", reactance * reactance / c[P::relaxation_resistance]);
  }
  if (c.family.skin && c[P::skin_resistance] > 0) add_skin(chain, c[P::skin_resistance], c.reference_hz, low_hz, high_hz);
  const double rest = l * (1 - share);
  if (law != nullptr && rest > 0) {
    add_saturating(chain, rest, *law);
  } else {
    chain.link("Lw", std::fmax(rest, 0));
  }
  text += chain.text();
  if (c[P::capacitance] > 0) text += fmt::format("Cw a b {}\n", to_shortest(c[P::capacitance]));
  if (c[P::parallel_conductance] > 0) text += fmt::format("Rg a b {}\n", to_shortest(1 / c[P::parallel_conductance]));
  if (c.family.second_resonance && c[P::second_capacitance] > 0) {
    const double w = 2 * kPi * c[P::second_frequency], c2 = c[P::second_capacitance];
    text += fmt::format("C2 a m1 {}\nL2 m1 m2 {}\nR2 m2 b {}\n", to_shortest(c2), to_shortest(1 / (w * w * c2)),
                        to_shortest(c[P::second_damping] / (w * c2)));
  }
  text += fmt::format(".ends {}\n", name);
  return text;
}

}  // namespace coilassay
