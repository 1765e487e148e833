// What a figure of a sweep needs.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/sweep_result.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr std::size_t kPoints = 400;        // of the model's curves
constexpr std::size_t kMostData = 4000;     // of the data shown
constexpr double kNormalQuantile = 1.96;

void add_data(Measurement& result, const SweepModel& model, bool phase) {
  Table table{"trace_sweep",
              {{"frequency_Hz", Unit::hertz, {}}, {"impedance_ohm", Unit::ohm, {}}, {"phase_rad", Unit::radian, {}},
               {"inductance_H", Unit::henry, {}}, {"resistance_ohm", Unit::ohm, {}}, {"quality", Unit::one, {}}, {"left_out_ohm", Unit::ohm, {}}}};
  const CircuitData& points = model.points;
  const std::size_t stride = points.size() / kMostData + 1;
  for (std::size_t i = 0; i < points.size(); i += stride) {
    const Complex z = points.z[i];
    const double f = points.frequency_hz[i], nan = std::nan("");
    const bool used = model.fit.used[i], coil = phase && used && z.imag() > 0;
    const double row[] = {f, used ? std::abs(z) : nan, phase && used ? std::arg(z) : nan, coil ? z.imag() / (kTwoPi * f) : nan,
                          phase && used && z.real() > 0 ? z.real() : nan, coil && z.real() > 0 ? z.imag() / z.real() : nan, used ? nan : std::abs(z)};
    for (std::size_t c = 0; c < std::size(row); ++c) table.columns[c].values.push_back(row[c]);
  }
  result.tables.push_back(std::move(table));
}

/// Real and imaginary part with their covariance: of the fit and of the errors of the bench.
Eigen::Matrix2d uncertainty_at(const SweepModel& model, double f) {
  const ImpedanceSlopes at = impedance_slopes(model.fit.circuit, f);
  const auto count = static_cast<Eigen::Index>(model.parameters());
  Eigen::MatrixXd slopes(2, count);
  for (Eigen::Index k = 0; k < count; ++k) {
    slopes(0, k) = at.by_parameter[static_cast<std::size_t>(k)].real();
    slopes(1, k) = at.by_parameter[static_cast<std::size_t>(k)].imag();
  }
  const Eigen::MatrixXd bench = slopes * model.shifts;
  return model.inflation * slopes * model.fit.fit.covariance * slopes.transpose() + bench * bench.transpose();
}

void add_model(Measurement& result, const SweepModel& model, const SweepData& data) {
  Table table{"trace_model",
              {{"frequency_Hz", Unit::hertz, {}}, {"impedance_ohm", Unit::ohm, {}}, {"phase_rad", Unit::radian, {}},
               {"inductance_H", Unit::henry, {}}, {"inductance_low_H", Unit::henry, {}}, {"inductance_high_H", Unit::henry, {}},
               {"resistance_ohm", Unit::ohm, {}}, {"resistance_low_ohm", Unit::ohm, {}}, {"resistance_high_ohm", Unit::ohm, {}},
               {"quality", Unit::one, {}}}};
  for (std::size_t k = 0; k <= kPoints; ++k) {
    const double f = data.low_hz * std::pow(data.high_hz / data.low_hz, static_cast<double>(k) / kPoints);
    const Complex z = impedance(model.fit.circuit, f);
    const Eigen::Matrix2d u = uncertainty_at(model, f);
    const double w = kTwoPi * f, nan = std::nan("");
    const double half_r = kNormalQuantile * std::sqrt(u(0, 0)), half_l = kNormalQuantile * std::sqrt(u(1, 1)) / w;
    const bool coil = z.imag() > 0;
    const double l = coil ? z.imag() / w : nan;
    const double row[] = {f, std::abs(z), std::arg(z), l, l - half_l, l + half_l, z.real(),
                          std::fmax(z.real() - half_r, z.real() / 100), z.real() + half_r, coil ? z.imag() / z.real() : nan};
    for (std::size_t c = 0; c < std::size(row); ++c) table.columns[c].values.push_back(row[c]);
  }
  result.tables.push_back(std::move(table));
}

void add_causality(Measurement& result, const KramersKronig& test) {
  Table table{"trace_causality",
              {{"frequency_Hz", Unit::hertz, {}}, {"real", Unit::one, {}}, {"imaginary", Unit::one, {}}}};
  for (std::size_t i = 0; i < test.frequency_hz.size(); ++i) {
    table.columns[0].values.push_back(test.frequency_hz[i]);
    table.columns[1].values.push_back(test.residual[i].real());
    table.columns[2].values.push_back(test.residual[i].imag());
  }
  result.tables.push_back(std::move(table));
}

}  // namespace

void add_sweep_traces(Measurement& result, const SweepModel& model, const SweepData& data) {
  add_data(result, model, data.has_phase);
  add_model(result, model, data);
  if (model.causality) add_causality(result, *model.causality);
}

}  // namespace coilassay
