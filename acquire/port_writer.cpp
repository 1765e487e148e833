#include "acquire/port_writer.h"

#include <ostream>
#include <sstream>
#include <vector>

#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr std::size_t kPairsOnALine = 4;

void write_pair(std::ostream& out, std::complex<double> z) { out << ' ' << to_shortest(z.real()) << ' ' << to_shortest(z.imag()); }

}  // namespace

void write_touchstone_impedance(std::ostream& out, const Sweep& sweep, const std::string& comment) {
  std::istringstream lines(comment);
  for (std::string line; std::getline(lines, line);) out << "! " << line << '\n';
  out << "# Hz Z RI R 1\n";
  const std::size_t n = sweep.ports;
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    out << to_shortest(sweep.frequency_hz[i]);
    const std::vector<std::complex<double>>& z = sweep.z_ohm[i];
    if (n <= 2) {
      const std::vector<std::size_t> order = n == 1 ? std::vector<std::size_t>{0} : std::vector<std::size_t>{0, 2, 1, 3};
      for (const std::size_t at : order) write_pair(out, z[at]);
      out << '\n';
      continue;
    }
    for (std::size_t row = 0; row < n; ++row) {
      for (std::size_t column = 0; column < n; ++column) {
        if (column > 0 && column % kPairsOnALine == 0) out << '\n';
        write_pair(out, z[row * n + column]);
      }
      out << '\n';
    }
  }
}

}  // namespace coilassay
