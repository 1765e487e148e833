#include "analysis/ramp_curve.h"


#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>

#include "analysis/ramp.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr std::size_t kBlocks = 300, kLongBlocks = 1000;
constexpr std::size_t kLongRise = 100000;     // samples from which more blocks pay
constexpr double kKneeEvidence = 9;           // chi-square that any knee must gain over a straight line
constexpr double kNoBend = 0.05;              // standard uncertainty of a square term that is known to be absent
constexpr double kMisfit = 0.01;              // F less likely than this: no curve of the family fits
constexpr double kSplineDoubt = 2;            // a spline with ten knots errs by about as much as it differs from the curve
constexpr double kSurprise = 4;               // standard deviations of a flux that does not begin where it should
enum : int { kFitOffset = 4, kFitShift = 5 }; // places among the parameters of RollOffFit

/// Block means of what the errors act through.
struct BlockSeries {
  std::vector<double> flux, volt_seconds, charge, amps, amps_per_s, seconds;
};

double mean(const std::vector<double>& v, std::size_t first, std::size_t length) {
  double sum = 0;
  for (std::size_t k = first; k < first + length; ++k) sum += v[k];
  return sum / static_cast<double>(length);
}

/// Current at which the curve holds so much flux.
double current_at(const RollOff& curve, double flux, double start) {
  double i = start;
  for (int k = 0; k < 8; ++k) i += (flux - curve.integral(i)) / curve.slope(i);
  return i;
}

/// Outputs of a curve; currents beyond `top` count as not reached. `flux` is what the coil holds at the peak.
void evaluate(const RollOff& curve, double reference, const std::vector<double>& grid, double top, double flux,
              Eigen::VectorXd& y) {
  using namespace ramp_output;
  y.resize(kCount);
  y[kL0] = curve.slope(reference);
  for (int d = 0; d < 3; ++d) {
    const double drop = 0.1 * (d + 1);
    y[kSat + d] = curve.y_at_drop(drop, reference, top);
    y[kSecant + d] = curve.y_at_secant_drop(drop, reference, top);
  }
  y[kEnergy] = curve.work(current_at(curve, flux, grid.back()));
  for (int g = 0; g < kGridPoints; ++g) y[kGrid + g] = curve.slope(grid[static_cast<std::size_t>(g)]);
}

RollOff curve_from(const Eigen::VectorXd& p, bool straight) {
  RollOff curve{std::exp(p[0]), p[1], std::exp(p[2]), std::exp(p[3]), p[6]};
  if (straight) curve.floor_share = 1;
  return curve;
}

std::string words_for(const RollOff& curve, bool bend, bool straight) {
  if (straight) return "straight line";
  if (bend) return curve.bend > 0 ? "knee with a square term (tanh-like)" : "knee with a square term (rising first)";
  return curve.exponent < 3 ? "soft powder" : curve.exponent > 9 ? "sharp ferrite" : "generalised knee";
}

class PulseFit {
 public:
  PulseFit(const RampLayout& layout, const RampPulse& pulse, const PulseIntegrals& integrals, const RampInputs& inputs,
           const DrivenRecord& record)
      : layout_(layout), pulse_(pulse), integrals_(integrals), inputs_(inputs), record_(record) {}

  Result<RampCurve> run() {
    make_blocks();
    RollOffKnown known = what_is_known();
    out_.flux_origin_sigma = known.shift_sigma;
    Result<Choice> choice = choose(known);
    if (!choice) return failure(choice);
    if (surprising(choice->fit, known)) {
      known.shift_sigma = std::numeric_limits<double>::infinity();
      Result<Choice> free = choose(known);
      if (free && lead_of(free->fit)) choice = std::move(free);
    }
    take(std::move(*choice));
    return std::move(out_);
  }

 private:
  void make_blocks() {
    // Where the drive sets in, skew and ringing of the edge are not what the coil does.
    const double skew_u = std::fabs(inputs_.errors[3].law.standard_uncertainty);
    const auto skip = 2 + static_cast<std::size_t>(std::min(std::ceil(2 * skew_u / layout_.step_s),
                                                            0.05 * static_cast<double>(pulse_.peak - pulse_.start)));
    const std::size_t first = pulse_.start + skip - integrals_.first;
    const std::size_t end = pulse_.peak - integrals_.first - 1;
    flux_ = integrals_.flux(inputs_.errors[2].value);
    const std::span<const double> amps(layout_.amps.data() + integrals_.first, flux_.size());
    const std::size_t most = end - first > kLongRise ? kLongBlocks : kBlocks;
    blocks_ = roll_off_blocks(flux_, amps, first, end, most, record_.amp_resolution);
    const std::size_t n = blocks_.x.size(), length = blocks_.length;
    series_.flux = blocks_.x;
    series_.amps = blocks_.y;
    for (std::size_t b = 0; b < n; ++b) {
      const std::size_t at = blocks_.first[b];
      series_.volt_seconds.push_back(mean(integrals_.volt_seconds, at, length));
      series_.charge.push_back(mean(integrals_.charge, at, length));
      series_.seconds.push_back(layout_.step_s * (static_cast<double>(at) + 0.5 * static_cast<double>(length - 1)));
    }
  }

  RollOffKnown what_is_known() const {
    RollOffKnown known;
    const double edge = pulse_.edge_v * layout_.step_s / std::sqrt(12.0);
    const double late = pulse_.drive_v * inputs_.errors[3].law.standard_uncertainty;
    const double ahead = pulse_.drive_v * inputs_.errors[4].law.standard_uncertainty;
    known.shift_sigma = std::sqrt(edge * edge + late * late + ahead * ahead);
    const double code = record_.amp_resolution > 0 ? record_.amp_resolution : 0;
    const bool from_zero = std::fabs(pulse_.start_a) < 4 * pulse_.start_u_a + 0.3 * code + 0.002 * layout_.peak_a;
    if (layout_.zero_known) {
      known.offset = 0;
      known.offset_sigma = std::fmax(layout_.amp_zero_u, 1e-9 * layout_.peak_a);
      if (!from_zero) known.shift_sigma = std::numeric_limits<double>::infinity();
    } else if (pulse_.start > 0 || std::fabs(layout_.amps[pulse_.start]) < 0.03 * layout_.peak_a) {
      // The record begins with the drive: the current begins at zero, wherever that is.
      known.shift_sigma = std::fmax(known.shift_sigma, pulse_.drive_v * layout_.step_s);
    } else {
      known.offset = 0;
      known.offset_sigma = ramp_defaults::kUnknownOffsetRatio * layout_.peak_a / std::sqrt(3.0);
      known.shift_sigma = std::numeric_limits<double>::infinity();
    }
    const double volt = layout_.volt_noise * layout_.step_s;
    known.walk_variance = volt * volt * static_cast<double>(blocks_.length);
    return known;
  }

  bool surprising(const RollOffFit& fit, const RollOffKnown& known) const {
    return std::isfinite(known.shift_sigma) && known.shift_sigma > 0 && known.offset &&
           std::fabs(fit.shift) > 0.5 * kSurprise * known.shift_sigma;
  }
  /// Takes over how far the current is ahead when that is beyond doubt.
  bool lead_of(const RollOffFit& fit) {
    const double u = std::hypot(std::sqrt(fit.fit.covariance(kFitShift, kFitShift)), out_.flux_origin_sigma);
    if (!(std::fabs(fit.shift) > kSurprise * u)) return false;
    out_.edge_lead_s = fit.shift / pulse_.drive_v;
    out_.edge_lead_u_s = u / pulse_.drive_v;
    return true;
  }

  /// The family taken, and one that fits as well.
  struct Choice {
    RollOffFit fit;
    bool bend = false, straight = false;
    std::optional<RollOffFit> other;
    std::string runner_up;
  };

  /// The straight line unless a knee gains on it; then the knee with the square term, or without it where the samples show
  /// that there is none. Where they leave it open, leaving it out would move the values by more than they seem uncertain.
  Result<Choice> choose(RollOffKnown known) const {
    Result<RollOffFit> knee = fit_roll_off(blocks_, known);
    if (!knee) return failure(knee);
    known.straight = true;
    Result<RollOffFit> straight = fit_roll_off(blocks_, known);
    known.straight = false;
    known.bend = true;
    Result<RollOffFit> bend = fit_roll_off(blocks_, known);
    const bool bend_fits = bend && bend->fit.stop == FitStop::converged;
    double scale = std::fmax(knee->lack_of_fit, 1);
    if (bend_fits) scale = std::fmax(std::fmin(knee->lack_of_fit, bend->lack_of_fit), 1);
    const auto gains = [&](const RollOffFit& simple, const RollOffFit& rich) {
      return simple.chi_square - rich.chi_square > kKneeEvidence * scale;
    };
    Choice choice;
    if (straight && !gains(*straight, *knee) && !(bend_fits && gains(*straight, *bend))) {
      choice.fit = std::move(*straight);
      choice.straight = true;
      choice.runner_up = words_for(knee->curve, false, false);
      choice.other = std::move(*knee);
    } else if (bend_fits && !without_square(*bend)) {
      choice.fit = std::move(*bend);
      choice.bend = true;
      choice.runner_up = words_for(knee->curve, false, false);
    } else if (knee->fit.stop == FitStop::converged) {
      choice.fit = std::move(*knee);
      if (bend_fits) {
        choice.runner_up = words_for(bend->curve, true, false);
        choice.other = std::move(*bend);
      }
    } else {
      return failure(Problem::not_converged, "ramp", "no curve of the family settles on the samples", "");
    }
    return choice;
  }

  static bool without_square(const RollOffFit& bend) {
    const double u = std::sqrt(bend.fit.covariance(6, 6));
    return u < kNoBend && std::fabs(bend.curve.bend) < 2 * u;
  }

  void take(Choice choice) {
    out_.family = words_for(choice.fit.curve, choice.bend, choice.straight);
    out_.runner_up = choice.runner_up;
    out_.fit = std::move(choice.fit);
    straight_ = choice.straight;
    fill(choice.other ? &*choice.other : nullptr, choice.straight);
    slopes();
  }

  /// The outputs with their covariance, sensitivities and spread; `other` is a curve that fits as well.
  void fill(const RollOffFit* other, bool other_is_richer_than_straight) {
    const RollOffFit& fit = out_.fit;
    out_.low_a = fit.predicted.front() - fit.offset;
    out_.high_a = fit.predicted.back() - fit.offset;
    // From the middle of the last block to the last sample of the rise.
    out_.high_a = current_at(fit.curve, peak_flux() + fit.shift, out_.high_a);
    out_.reference_a = out_.low_a > 0.05 * out_.high_a ? out_.low_a : 0;
    for (int g = 0; g < ramp_output::kGridPoints; ++g) {
      out_.grid_a.push_back(out_.reference_a +
                            (out_.high_a - out_.reference_a) * g / static_cast<double>(ramp_output::kGridPoints - 1));
    }
    evaluate(fit.curve, out_.reference_a, out_.grid_a, out_.high_a, peak_flux() + fit.shift, out_.values);
    const Eigen::MatrixXd gradient = gradient_of(fit, straight_, out_.values);
    out_.covariance = gradient * fit.fit.covariance * gradient.transpose();
    out_.sensitivity = gradient * parameter_shifts();
    // The flux at the peak carries the errors itself; a change of it is worth its current in energy.
    out_.sensitivity.row(ramp_output::kEnergy) += out_.high_a * peak_flux_shifts().transpose();
    out_.spread = Eigen::VectorXd::Zero(ramp_output::kCount);
    keep_what_is_reached();
    if (other != nullptr) add_family_spread(*other, other_is_richer_than_straight);
    if (fit.f_probability < kMisfit || smooth_misfit()) add_spline_spread();
  }

  /// A drop counts as reached when the inductance at the peak is below it beyond doubt.
  void keep_what_is_reached() {
    using namespace ramp_output;
    const auto u = [&](int g) { return std::sqrt(std::fmax(out_.covariance(kGrid + g, kGrid + g), 0)); };
    for (int d = 0; d < 3; ++d) {
      const double level = (1 - 0.1 * (d + 1)) * out_.values[kL0];
      double& sure = out_.sure_a[static_cast<std::size_t>(d)];
      for (int g = 0; g < kGridPoints && out_.values[kGrid + g] - 2 * u(g) > level; ++g) {
        sure = out_.grid_a[static_cast<std::size_t>(g)];
      }
      const int last = kGridPoints - 1;
      if (out_.values[kGrid + last] + 2 * u(last) > level) out_.values[kSat + d] = std::nan("");
    }
  }

  /// By central differences over a fraction of each standard uncertainty.
  Eigen::MatrixXd gradient_of(const RollOffFit& fit, bool straight, const Eigen::VectorXd& center) const {
    const Eigen::VectorXd& p = fit.fit.parameters;
    Eigen::MatrixXd gradient = Eigen::MatrixXd::Zero(center.size(), p.size());
    Eigen::VectorXd up, down;
    for (Eigen::Index i = 0; i < p.size(); ++i) {
      if (i == kFitOffset) continue;   // neither curve nor flux knows it
      const double u = std::sqrt(fit.fit.covariance(i, i));
      const bool shift = i == kFitShift;
      const double h = shift ? std::fmax(0.1 * u, 1e-7 * peak_flux()) : std::clamp(0.1 * u, 1e-7, 1e-3);
      if (!shift && !(u > 1e-8)) continue;
      Eigen::VectorXd q = p;
      q[i] = p[i] + h;
      evaluate(curve_from(q, straight), out_.reference_a, out_.grid_a, 1.2 * out_.high_a, peak_flux() + q[kFitShift], up);
      q[i] = p[i] - h;
      evaluate(curve_from(q, straight), out_.reference_a, out_.grid_a, 1.2 * out_.high_a, peak_flux() + q[kFitShift], down);
      gradient.col(i) = (up - down) / (2 * h);
    }
    for (Eigen::Index o = 0; o < center.size(); ++o) {
      if (!std::isfinite(center[o])) gradient.row(o).setZero();
    }
    return gradient.unaryExpr([](double v) { return std::isfinite(v) ? v : 0.0; });
  }

  /// Change of the parameters per unit of every input.
  Eigen::MatrixXd parameter_shifts() const {
    const std::size_t n = blocks_.x.size();
    const RollOffFit& fit = out_.fit;
    const double resistance = inputs_.errors[2].value;
    std::vector<double> slope(n), inner(n);   // di/dt by the fit
    for (std::size_t b = 0; b < n; ++b) {
      const std::size_t a = b > 0 ? b - 1 : b, c = b + 1 < n ? b + 1 : b;
      inner[b] = (series_.flux[c] - series_.flux[a]) / (series_.seconds[c] - series_.seconds[a]);
      slope[b] = inner[b] * fit.inverse_slope[static_cast<Eigen::Index>(b)];
    }
    const std::vector<double> none(n, 0.0);
    const auto times = [&](const std::vector<double>& v, double factor) {
      std::vector<double> out(n);
      for (std::size_t b = 0; b < n; ++b) out[b] = factor * v[b];
      return out;
    };
    Eigen::MatrixXd shifts(fit.fit.parameters.size(), static_cast<Eigen::Index>(inputs_.errors.size()));
    const bool closed = inputs_.resistance_from_closure;   // R then follows both gains
    shifts.col(0) = fit.response(none, closed ? series_.flux : series_.volt_seconds);
    shifts.col(1) = fit.response(series_.amps, closed ? none : times(series_.charge, -resistance));
    shifts.col(2) = fit.response(none, times(series_.charge, -1));
    shifts.col(3) = fit.response(slope, times(series_.amps, -resistance));
    shifts.col(4) = fit.response(times(slope, -1), times(series_.amps, resistance));
    shifts.col(5) = fit.response(times(series_.charge, 2 * std::numbers::pi), none);
    shifts.col(6) = fit.response(none, series_.flux);
    shifts.col(7) = fit.response(none, times(series_.seconds, -1));
    return shifts;
  }

  double peak_flux() const { return flux_[pulse_.peak - 1 - integrals_.first]; }
  /// Change of the flux at the peak per unit of every input.
  Eigen::VectorXd peak_flux_shifts() const {
    const std::size_t at = pulse_.peak - 1 - integrals_.first;
    const bool closed = inputs_.resistance_from_closure;
    Eigen::VectorXd shifts = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(inputs_.errors.size()));
    shifts[0] = closed ? peak_flux() : integrals_.volt_seconds[at];
    shifts[1] = closed ? 0 : -inputs_.errors[2].value * integrals_.charge[at];
    shifts[2] = -integrals_.charge[at];
    shifts[6] = peak_flux();
    shifts[7] = -layout_.step_s * static_cast<double>(at);
    return shifts;
  }

  /// A richer curve that fits as well may differ by what its own freedom explains; what goes beyond widens the interval.
  void add_family_spread(const RollOffFit& other, bool from_straight) {
    Eigen::VectorXd y;
    evaluate(other.curve, out_.reference_a, out_.grid_a, out_.high_a, peak_flux() + other.shift, y);
    const Eigen::MatrixXd gradient = gradient_of(other, false, y);
    const Eigen::VectorXd variance = (gradient * other.fit.covariance * gradient.transpose()).diagonal();
    for (Eigen::Index o = 0; o < y.size(); ++o) {
      if (!std::isfinite(y[o]) || !std::isfinite(out_.values[o])) continue;
      const double difference = y[o] - out_.values[o];
      const double freedom = std::fmax(variance[o] - out_.covariance(o, o), 0);
      const double beyond = difference * difference - (from_straight ? 1 : 2) * freedom;
      if (beyond > 0) out_.spread[o] = std::sqrt(beyond);
    }
  }

  /// Residuals that hang together along the curve: their means over twentieths show a smooth misfit long before the scatter
  /// of single blocks does.
  bool smooth_misfit() const {
    constexpr std::size_t kParts = 20;
    const std::size_t n = blocks_.x.size();
    double chi = 0;
    for (std::size_t part = 0; part < kParts; ++part) {
      const std::size_t a = part * n / kParts, b = (part + 1) * n / kParts;
      double sum = 0;
      for (std::size_t i = a; i < b; ++i) sum += blocks_.y[i] - out_.fit.predicted[i];
      chi += sum * sum * out_.fit.weight / static_cast<double>(b - a);
    }
    // Most of what the parameters take, they take from these means.
    const double free = straight_ ? 2 : 6;
    return chi > chi_square_quantile(1 - kMisfit, static_cast<double>(kParts) - free);
  }

  /// No curve of the family fits: the spline, which has no model, shows how far they may be off.
  void add_spline_spread() {
    using namespace ramp_output;
    const Result<RollOffSpline> spline = RollOffSpline::fit(blocks_);
    if (!spline) return;
    out_.runner_up = "cubic spline";
    const RollOff& curve = out_.fit.curve;
    const double shift = out_.fit.shift;
    const auto widen = [&](Eigen::Index o, double difference) {
      if (std::isfinite(difference)) out_.spread[o] = std::fmax(out_.spread[o], kSplineDoubt * std::fabs(difference));
    };
    const auto slope_at = [&](double current) {
      return spline->slope(std::clamp(curve.integral(current) - shift, spline->low(), spline->high()));
    };
    for (int g = 0; g < kGridPoints; ++g) {
      widen(kGrid + g, slope_at(out_.grid_a[static_cast<std::size_t>(g)]) - out_.values[kGrid + g]);
    }
    // At the ends of its span a spline is loose: L_0 by its mean over the first tenth.
    double start = 0, start_fit = 0;
    for (int g = 1; g <= 10; ++g) {
      start += slope_at(out_.grid_a[static_cast<std::size_t>(g)]) / 10;
      start_fit += out_.values[kGrid + g] / 10;
    }
    widen(kL0, (start / start_fit - 1) * out_.values[kL0]);
    for (int d = 0; d < 3; ++d) {
      // How far the current moves when L at the knee is off by what the spline says.
      const double at = out_.values[kSat + d];
      if (!std::isfinite(at)) continue;
      const double h = 1e-4 * at;
      const double steepness = (curve.slope(at + h) - curve.slope(at - h)) / (2 * h);
      const double gap = slope_at(at) - curve.slope(at) - (start / start_fit - 1) * curve.slope(at);
      widen(kSat + d, gap / steepness);
      widen(kSecant + d, std::isfinite(out_.values[kSecant + d]) ? gap / steepness : 0);
    }
  }

  void slopes() {
    const std::size_t n = blocks_.x.size(), part = std::max<std::size_t>(n / 8, 2);
    const double resistance = inputs_.errors[2].value;
    const auto over = [&](std::size_t a, std::size_t b, double& di_dt, double& inner, double& volts) {
      const double dt = series_.seconds[b] - series_.seconds[a];
      di_dt = (out_.fit.predicted[b] - out_.fit.predicted[a]) / dt;
      inner = (series_.flux[b] - series_.flux[a]) / dt;
      volts = inner + resistance * (series_.charge[b] - series_.charge[a]) / dt;
    };
    over(0, part, out_.early_slope, out_.early_inner_v, out_.early_v);
    over(n - 1 - part, n - 1, out_.late_slope, out_.late_inner_v, out_.late_v);
    out_.late_inductance_ratio = out_.fit.curve.slope(out_.high_a) / out_.values[ramp_output::kL0];
  }

  const RampLayout& layout_;
  const RampPulse& pulse_;
  const PulseIntegrals& integrals_;
  const RampInputs& inputs_;
  const DrivenRecord& record_;
  std::vector<double> flux_;
  RollOffBlocks blocks_;
  BlockSeries series_;
  bool straight_ = false;
  RampCurve out_;
};

}  // namespace

RampInputs ramp_inputs(const DrivenRecord& record, const RampLayout& layout, const RampResistance& resistance) {
  RampInputs inputs;
  inputs.resistance_from_closure = resistance.from == RampResistance::From::closure;
  InputError zero;
  zero.source = "zero of the voltage";
  zero.kind = 'A';
  zero.common = false;
  zero.basis = "data: the quiet stretch before the drive";
  // A steady drive is rounded always the same way when noise does not dither the converter.
  double rounding = 0;
  if (record.volt_resolution > 0) {
    const double ratio = layout.volt_noise / record.volt_resolution;
    const double amplitude = std::exp(-2 * std::numbers::pi * std::numbers::pi * ratio * ratio);
    rounding = std::min(0.5, amplitude) * record.volt_resolution / std::sqrt(3.0);
  }
  zero.law = {ErrorLaw::Kind::normal, std::hypot(layout.volt_zero_u, rounding), 0};
  if (!layout.zero_known) {
    zero.kind = 'B';
    zero.basis = "default: no quiet stretch shows it, ±1 % of the drive";
    zero.law = {ErrorLaw::Kind::rectangular,
                ramp_defaults::kUnknownOffsetRatio * layout.pulses.front().drive_v / std::sqrt(3.0), 0};
  }
  const DrivenRecord::Errors& e = record.errors;
  inputs.errors = {e.voltage_gain, e.current_gain, resistance.error, e.skew, e.shunt_tau, e.probe_corner, e.timebase, zero};
  return inputs;
}

Result<RampCurve> curve_of(const RampLayout& layout, const RampPulse& pulse, const PulseIntegrals& integrals,
                           const RampInputs& inputs, const DrivenRecord& record) {
  return PulseFit(layout, pulse, integrals, inputs, record).run();
}

}  // namespace coilassay
