#include "acquire/sweep_writer.h"

#include <algorithm>
#include <array>
#include <cassert>
#include <charconv>
#include <cmath>
#include <complex>
#include <numbers>
#include <ostream>
#include <sstream>
#include <vector>

#include "acquire/touchstone_matrix.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kUsualReference_ohm = 50;
constexpr std::size_t kAllOfIt = 4096;  // longest setting that is kept whole

std::string number(double value) {
  if (!std::isfinite(value)) return "nan";
  std::array<char, 32> digits{};
  const auto end = std::to_chars(digits.data(), digits.data() + digits.size(), value);
  return {digits.data(), end.ptr};
}

double reference_of(const Sweep& sweep) {
  return sweep.reference_ohm.empty() ? kUsualReference_ohm : sweep.reference_ohm.front();
}

struct Headings {
  const char* first;
  const char* second;  // nullptr: one column only
};

Headings headings_of(SweepColumns columns) {
  switch (columns) {
    case SweepColumns::impedance: return {"Re(Z) [ohm]", "Im(Z) [ohm]"};
    case SweepColumns::scattering: return {"Re(S11)", "Im(S11)"};
    case SweepColumns::inductance: return {"Ls [H]", "Rs [ohm]"};
    case SweepColumns::magnitude_phase: return {"|Z| [ohm]", "phase [deg]"};
    case SweepColumns::magnitude: return {"|Z| [ohm]", nullptr};
  }
  return {"", nullptr};
}

std::pair<double, double> values_of(SweepColumns columns, double f, Complex z, double reference) {
  switch (columns) {
    case SweepColumns::impedance: return {z.real(), z.imag()};
    case SweepColumns::scattering: {
      const Complex s = (z - reference) / (z + reference);
      return {s.real(), s.imag()};
    }
    case SweepColumns::inductance: return {z.imag() / (kTwoPi * f), z.real()};
    case SweepColumns::magnitude_phase: return {std::abs(z), std::arg(z) * 180 / std::numbers::pi};
    case SweepColumns::magnitude: return {std::abs(z), 0};
  }
  return {};
}

/// S = (z + 1)^-1 (z - 1) with z = Z/r; nothing where there is none.
std::optional<std::vector<Complex>> scattering(const std::vector<Complex>& z_ohm, std::size_t n, double reference) {
  std::vector<Complex> plus(n * n), s(n * n);
  for (std::size_t i = 0; i < n * n; ++i) {
    const double one = i % (n + 1) == 0 ? 1 : 0;
    if (!std::isfinite(z_ohm[i].real()) || !std::isfinite(z_ohm[i].imag())) return std::nullopt;
    plus[i] = z_ohm[i] / reference + one;
  }
  const auto inverted = inverse(std::move(plus), n);
  if (!inverted) return std::nullopt;
  // (z - 1) = (z + 1) - 2, hence S = 1 - 2 (z + 1)^-1.
  for (std::size_t i = 0; i < n * n; ++i) s[i] = (i % (n + 1) == 0 ? 1.0 : 0.0) - 2.0 * (*inverted)[i];
  return s;
}

}  // namespace

void write_sweep_csv(std::ostream& out, const Sweep& sweep, SweepColumns columns) {
  assert(sweep.ports == 1);
  const double reference = reference_of(sweep);
  for (const auto& [key, value] : sweep.dialect.settings) {
    if (key.empty() || parse_plain_number(key)) out << "# ";
    out << csv_cell(shown(key, kAllOfIt)) << ',' << csv_cell(shown(value, kAllOfIt)) << '\n';
  }
  if (columns == SweepColumns::scattering) out << "reference," << number(reference) << " ohm\n";
  const bool status = std::any_of(sweep.bad.begin(), sweep.bad.end(), [](bool bad) { return bad; });
  const Headings headings = headings_of(columns);
  out << "frequency [Hz]," << headings.first;
  if (headings.second != nullptr) out << ',' << headings.second;
  out << (status ? ",status\n" : "\n");
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const auto [first, second] = values_of(columns, sweep.frequency_hz[i], sweep.z_ohm[i][0], reference);
    out << number(sweep.frequency_hz[i]) << ',' << number(first);
    if (headings.second != nullptr) out << ',' << number(second);
    if (status) out << (sweep.bad[i] ? ",1" : ",0");
    out << '\n';
  }
}

void write_touchstone(std::ostream& out, const Sweep& sweep, const std::string& comment) {
  assert(sweep.ports == 1 || sweep.ports == 2);
  const double reference = reference_of(sweep);
  std::istringstream lines(comment);
  for (std::string line; std::getline(lines, line);) out << "! " << shown(line, kAllOfIt) << '\n';
  out << "# Hz S RI R " << number(reference) << '\n';
  // Version 1 writes a two-port as 11 21 12 22.
  const std::vector<std::size_t> order = sweep.ports == 1 ? std::vector<std::size_t>{0} : std::vector<std::size_t>{0, 2, 1, 3};
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    const auto s = scattering(sweep.z_ohm[i], sweep.ports, reference);
    if (!s) continue;
    out << number(sweep.frequency_hz[i]);
    for (const std::size_t k : order) out << ' ' << number((*s)[k].real()) << ' ' << number((*s)[k].imag());
    out << '\n';
  }
}

}  // namespace coilassay
