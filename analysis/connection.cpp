#include "analysis/connection.h"

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>

#include "analysis/interpolation.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
using Matrix2 = std::array<Complex, 4>;   // 11, 12, 21, 22

std::string hertz(double f) { return to_text(f, Unit::hertz); }

Complex missing() { return {std::nan(""), std::nan("")}; }

bool holds_scattering(const Sweep& sweep, std::size_t point) {
  return point < sweep.scattering.size() && sweep.scattering[point].size() == sweep.ports * sweep.ports;
}

/// S of the ports a and b of a sweep at one of its points, the others left open where the file holds Z.
Matrix2 scattering_of(const Sweep& sweep, std::size_t point, std::size_t a, std::size_t b, double r1, double r2) {
  const std::size_t n = sweep.ports;
  if (holds_scattering(sweep, point)) {
    const auto& s = sweep.scattering[point];
    return {s[a * n + a], s[a * n + b], s[b * n + a], s[b * n + b]};
  }
  const auto& z = sweep.z_ohm[point];
  const Complex z11 = z[a * n + a], z12 = z[a * n + b], z21 = z[b * n + a], z22 = z[b * n + b];
  const Complex d = (z11 + r1) * (z22 + r2) - z12 * z21;
  const double root = 2 * std::sqrt(r1 * r2);
  return {((z11 - r1) * (z22 + r2) - z12 * z21) / d, root * z12 / d, root * z21 / d, ((z11 + r1) * (z22 - r2) - z12 * z21) / d};
}

double reference_of(const Sweep& sweep, std::size_t port) {
  return port < sweep.reference_ohm.size() ? sweep.reference_ohm[port] : 50.0;
}

/// Chain (ABCD) matrix from S with references, and back to S21 only.
Matrix2 chain_of(const Matrix2& s, double r1, double r2) {
  const Complex s11 = s[0], s12 = s[1], s21 = s[2], s22 = s[3];
  const Complex scale = 1.0 / (2.0 * s21 * std::sqrt(r1 * r2));
  return {scale * r2 * ((1.0 + s11) * (1.0 - s22) + s12 * s21), scale * r1 * r2 * ((1.0 + s11) * (1.0 + s22) - s12 * s21),
          scale * ((1.0 - s11) * (1.0 - s22) - s12 * s21), scale * r1 * ((1.0 - s11) * (1.0 + s22) + s12 * s21)};
}

Matrix2 product(const Matrix2& a, const Matrix2& b) {
  return {a[0] * b[0] + a[1] * b[2], a[0] * b[1] + a[1] * b[3], a[2] * b[0] + a[3] * b[2], a[2] * b[1] + a[3] * b[3]};
}

Matrix2 inverse(const Matrix2& m) {
  const Complex d = m[0] * m[3] - m[1] * m[2];
  return {m[3] / d, -m[1] / d, -m[2] / d, m[0] / d};
}

Complex transmission_of(const Matrix2& chain, double r1, double r2) {
  return 2.0 * std::sqrt(r1 * r2) / (chain[0] * r2 + chain[1] + chain[2] * r1 * r2 + chain[3] * r1);
}

tl::unexpected<Error> refused(const Sweep& sweep, std::string finding, std::string remedy) {
  return failure(Problem::usage, sweep.source.name, std::move(finding), std::move(remedy));
}

Result<Sweep> reflected(const Sweep& sweep, const ConnectionRequest& request) {
  if (sweep.ports > 1 && !request.port) {
    return refused(sweep, "the file has " + std::to_string(sweep.ports) + " ports, and it is not said how the part hangs on them",
                   "say it with --port 1 for the impedance at a port, or --connection series or shunt");
  }
  const std::size_t port = request.port.value_or(1);
  if (port > sweep.ports) {
    return failure(Problem::usage, "--port", "there is no port " + std::to_string(port) + " in " + sweep.source.name + ", which has " +
                   std::to_string(sweep.ports), "ports count from 1");
  }
  Sweep out = sweep;
  out.ports = 1;
  const std::size_t p = port - 1, n = sweep.ports;
  out.reference_ohm = {reference_of(sweep, p)};
  out.bad.resize(sweep.frequency_hz.size());
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    Complex z = sweep.z_ohm[i][p * n + p];
    if (n > 1 && holds_scattering(sweep, i)) {
      const Complex s = sweep.scattering[i][p * n + p];
      z = out.reference_ohm[0] * (1.0 + s) / (1.0 - s);
      out.bad[i] = false;
    }
    if (!std::isfinite(z.real()) || !std::isfinite(z.imag())) {
      z = missing();
      out.bad[i] = true;
    }
    out.z_ohm[i] = {z};
    if (!out.scattering.empty()) out.scattering[i] = {(z - out.reference_ohm[0]) / (z + out.reference_ohm[0])};
  }
  return out;
}

Result<Sweep> passed_through(const Sweep& sweep, const ConnectionRequest& request) {
  if (sweep.ports < 2) {
    return failure(Problem::usage, "--connection", sweep.source.name + " has one port, and this connection needs two",
                   "give the two-port file, or leave --connection out");
  }
  if (request.port) {
    return failure(Problem::usage, "--port", "between two ports there is no choice of one", "leave --port out");
  }
  const double r1 = reference_of(sweep, 0), r2 = reference_of(sweep, 1);
  Sweep out = sweep;
  out.ports = 1;
  out.as_read = "S21";
  out.scattering.clear();
  // Errors of S21 act on Z as those of S11 do with this reference, but for a factor of two.
  out.reference_ohm = {request.connection == Connection::series ? r1 + r2 : r1 * r2 / (r1 + r2)};
  out.bad.assign(sweep.frequency_hz.size(), false);
  for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) {
    Matrix2 s = scattering_of(sweep, i, 0, 1, r1, r2);
    Complex s21 = s[2];
    if (request.at_port_1 || request.at_port_2) {
      Matrix2 chain = chain_of(s, r1, r2);
      if (request.at_port_1) {
        const Result<TwoPort> t = two_port_at(*request.at_port_1, sweep.frequency_hz[i]);
        if (!t) return failure(t);
        chain = product(inverse(chain_of({t->s11, t->s12, t->s21, t->s22}, t->reference_1_ohm, t->reference_2_ohm)), chain);
      }
      if (request.at_port_2) {
        // Its port 1 faces the analyser, which here is on the right.
        const Result<TwoPort> t = two_port_at(*request.at_port_2, sweep.frequency_hz[i]);
        if (!t) return failure(t);
        chain = product(chain, inverse(chain_of({t->s22, t->s21, t->s12, t->s11}, t->reference_2_ohm, t->reference_1_ohm)));
      }
      s21 = transmission_of(chain, r1, r2);
    }
    const Complex sum = 2.0 * std::sqrt(r1 * r2) / s21 - (r1 + r2);
    Complex z = request.connection == Connection::series ? sum : r1 * r2 / sum;
    if (!std::isfinite(z.real()) || !std::isfinite(z.imag())) {
      z = missing();
      out.bad[i] = true;
    }
    out.z_ohm[i] = {z};
  }
  return out;
}

}  // namespace

Result<void> check_two_port(const Sweep& sweep, const Sweep& file, const char* option) {
  if (file.ports != 2) {
    return failure(Problem::usage, option, file.source.name + " has " + std::to_string(file.ports) + " ports",
                   "give the two-port file of what lies between analyser and part");
  }
  const auto [low, high] = std::minmax_element(sweep.frequency_hz.begin(), sweep.frequency_hz.end());
  if (sweep.frequency_hz.empty() || covers(file.frequency_hz, *low, *high)) return {};
  return failure(Problem::usage, option,
                 file.source.name + " covers " + hertz(file.frequency_hz.front()) + " to " + hertz(file.frequency_hz.back()) +
                     ", and the sweep goes from " + hertz(*low) + " to " + hertz(*high),
                 "measure the fixture over the whole span, or sweep less of it");
}

Result<TwoPort> two_port_at(const Sweep& file, double frequency_hz) {
  if (!covers(file.frequency_hz, frequency_hz, frequency_hz)) {
    return failure(Problem::usage, file.source.name, "the file does not reach " + hertz(frequency_hz), "measure it over the whole span");
  }
  const double r1 = reference_of(file, 0), r2 = reference_of(file, 1);
  const GridPlace place = place_in_grid(file.frequency_hz, frequency_hz);
  Matrix2 sum{};
  for (std::size_t k = 0; k < place.count; ++k) {
    const Matrix2 s = scattering_of(file, place.first + k, 0, 1, r1, r2);
    for (std::size_t e = 0; e < 4; ++e) sum[e] += place.cubic[k] * s[e];
  }
  return TwoPort{sum[0], sum[2], sum[1], sum[3], r1, r2};
}

Result<Sweep> one_port_of(const Sweep& sweep, const ConnectionRequest& request) {
  assert(request.connection != Connection::reflect || (!request.at_port_1 && !request.at_port_2));
  if (request.at_port_1) {
    if (const auto fine = check_two_port(sweep, *request.at_port_1, "--remove-port1"); !fine) return failure(fine);
  }
  if (request.at_port_2) {
    if (const auto fine = check_two_port(sweep, *request.at_port_2, "--remove-port2"); !fine) return failure(fine);
  }
  return request.connection == Connection::reflect ? reflected(sweep, request) : passed_through(sweep, request);
}

}  // namespace coilassay
