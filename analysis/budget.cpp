#include "analysis/budget.h"

#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cassert>
#include <cmath>
#include <utility>

#include "analysis/symbols.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

/// One independent direction of error and what it does to every output over one standard uncertainty.
struct Direction {
  std::size_t input;                // index of the independent input; inputs.size() for the fitted group
  std::vector<double> shift;        // half the difference between +u and -u
  std::vector<double> bend;         // how far the mean of both lies off the best value
};

/// Columns S with S S' = covariance; found on the correlation matrix, because parameters differ by many orders.
Eigen::MatrixXd square_root(const Eigen::MatrixXd& covariance) {
  const Eigen::VectorXd scale = covariance.diagonal().cwiseMax(0).cwiseSqrt();
  Eigen::MatrixXd correlation = covariance;
  for (Eigen::Index i = 0; i < scale.size(); ++i) {
    for (Eigen::Index j = 0; j < scale.size(); ++j) {
      const double s = scale[i] * scale[j];
      correlation(i, j) = s > 0 ? covariance(i, j) / s : (i == j ? 1.0 : 0.0);
    }
  }
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(correlation);
  const Eigen::VectorXd roots = solver.eigenvalues().cwiseMax(0).cwiseSqrt();
  return scale.asDiagonal() * (solver.eigenvectors() * roots.asDiagonal());
}

class Carrier {
 public:
  Carrier(const std::vector<InputError>& inputs, const FittedInputs& fitted, const std::vector<OutputSpec>& outputs,
          const MeasurementFunction& f)
      : inputs_(inputs), fitted_(fitted), outputs_(outputs), f_(f) {
    for (const InputError& input : inputs) best_.push_back(input.value);
    for (Eigen::Index i = 0; i < fitted.values.size(); ++i) best_.push_back(fitted.values[i]);
    center_ = evaluate(best_);
    for (std::size_t i = 0; i < inputs.size(); ++i) {
      const double u = inputs[i].law.standard_uncertainty;
      if (!(u > 0)) continue;
      add_direction(i, [&](std::vector<double>& x, double sign) { x[i] += sign * u; });
    }
    for (const Eigen::VectorXd& point : fitted.contour) {
      std::vector<double> x = best_;
      for (Eigen::Index i = 0; i < point.size(); ++i) x[inputs.size() + static_cast<std::size_t>(i)] = point[i];
      contour_.push_back(evaluate(x));
    }
    if (fitted.covariance.size() > 0) {
      const Eigen::MatrixXd columns = square_root(fitted.covariance);
      for (Eigen::Index c = 0; c < columns.cols(); ++c) {
        if (columns.col(c).cwiseAbs().maxCoeff() == 0) continue;
        add_direction(inputs.size(), [&](std::vector<double>& x, double sign) {
          for (Eigen::Index r = 0; r < columns.rows(); ++r) {
            x[inputs_.size() + static_cast<std::size_t>(r)] += sign * columns(r, c);
          }
        });
      }
    }
  }

  const std::vector<double>& center() const { return center_; }
  const std::vector<Direction>& directions() const { return directions_; }

  /// Contribution of one source (input index, or inputs.size() for the fit) to output o.
  double contribution(std::size_t source, std::size_t o) const {
    double sum = 0;
    for (const Direction& d : directions_) {
      if (d.input == source) sum += d.shift[o] * d.shift[o];
    }
    return std::sqrt(sum);
  }

  double covariance(std::size_t a, std::size_t b) const {
    double sum = 0;
    for (const Direction& d : directions_) sum += d.shift[a] * d.shift[b];
    return sum;
  }

  /// How far the output reaches below and above its best value over the fit's 95 % region; zero without a contour.
  std::pair<double, double> reach(std::size_t o) const {
    double below = 0, above = 0;
    for (const std::vector<double>& y : contour_) {
      if (!std::isfinite(y[o])) continue;
      below = std::fmax(below, center_[o] - y[o]);
      above = std::fmax(above, y[o] - center_[o]);
    }
    return {below, above};
  }

  double bend(std::size_t o) const {
    double sum = 0;
    for (const Direction& d : directions_) sum += std::fabs(d.bend[o]);
    return sum;
  }

 private:
  std::vector<double> evaluate(const std::vector<double>& x) const {
    std::vector<double> y(outputs_.size(), std::nan(""));
    f_(x, y);
    return y;
  }

  template <class Move>
  void add_direction(std::size_t source, const Move& move) {
    std::vector<double> x = best_;
    move(x, +1);
    const std::vector<double> up = evaluate(x);
    x = best_;
    move(x, -1);
    const std::vector<double> down = evaluate(x);
    Direction d{source, std::vector<double>(outputs_.size()), std::vector<double>(outputs_.size())};
    for (std::size_t o = 0; o < outputs_.size(); ++o) {
      // Where one side leaves the domain, the other side alone tells the slope.
      const bool has_up = std::isfinite(up[o]);
      const bool has_down = std::isfinite(down[o]);
      const double from_up = up[o] - center_[o];
      const double from_down = center_[o] - down[o];
      d.shift[o] = has_up && has_down ? (from_up + from_down) / 2 : has_up ? from_up : has_down ? from_down : 0;
      d.bend[o] = has_up && has_down ? (from_up - from_down) / 2 : 0;
      if (!std::isfinite(center_[o])) d.shift[o] = d.bend[o] = 0;
    }
    directions_.push_back(std::move(d));
  }

  const std::vector<InputError>& inputs_;
  const FittedInputs& fitted_;
  const std::vector<OutputSpec>& outputs_;
  const MeasurementFunction& f_;
  std::vector<double> best_, center_;
  std::vector<Direction> directions_;
  std::vector<std::vector<double>> contour_;
};

struct Interval {
  double u = 0, low = 0, high = 0, dof = 0;
};

/// JCGM 101, 8.1: two results agree when both ends differ by less than half a unit in the second digit of u.
bool agree_to_two_digits(const Interval& first, const Interval& second) {
  const double u = first.u > 0 ? first.u : second.u;  // first order finds none where the slopes vanish
  if (!(u > 0)) return true;
  const double digit = std::pow(10.0, std::floor(std::log10(u)) - 1);
  return std::fabs(first.low - second.low) <= 0.5 * digit && std::fabs(first.high - second.high) <= 0.5 * digit;
}

std::vector<Interval> by_trials(const std::vector<InputError>& inputs, const FittedInputs& fitted,
                                const std::vector<OutputSpec>& outputs, const MeasurementFunction& f,
                                const std::vector<ExtraTerm>& extra, const std::vector<double>& extra_scale,
                                const PropagationOptions& options) {
  std::vector<TrialInput> trial_inputs;
  for (const InputError& input : inputs) trial_inputs.push_back({input.value, input.law});
  std::vector<std::size_t> extra_output;
  for (std::size_t e = 0; e < extra.size(); ++e) {
    ErrorLaw law = extra[e].law;
    law.standard_uncertainty *= extra_scale[e];
    trial_inputs.push_back({0.0, law});
    const auto at = std::find_if(outputs.begin(), outputs.end(),
                                 [&](const OutputSpec& spec) { return spec.symbol == extra[e].symbol; });
    extra_output.push_back(static_cast<std::size_t>(at - outputs.begin()));
  }
  const CorrelatedGroup group{fitted.values, fitted.covariance};
  const std::size_t n = inputs.size();
  const std::size_t m = static_cast<std::size_t>(fitted.values.size());
  const auto g = [&](std::span<const double> x, std::span<double> y) {
    thread_local std::vector<double> own;
    own.assign(x.begin(), x.begin() + static_cast<std::ptrdiff_t>(n));
    own.insert(own.end(), x.end() - static_cast<std::ptrdiff_t>(m), x.end());
    f(own, y);
    for (std::size_t e = 0; e < extra_output.size(); ++e) {
      if (extra_output[e] < y.size()) y[extra_output[e]] += x[n + e];
    }
  };
  const TrialReport report =
      propagate_by_trials(trial_inputs, group, outputs.size(), g, options.trials, options.seed, options.threads);
  std::vector<Interval> intervals;
  for (const TrialResult& output : report.outputs) {
    intervals.push_back({output.standard_uncertainty, output.low, output.high, 0});
  }
  return intervals;
}

void add_reciprocal(Measurement& result, const Symbol& symbol, const OutputSpec& spec, double inverse,
                    const Interval& interval) {
  // Errors are nearly linear in 1/y; the interval of y is the image of that of 1/y.
  if (interval.high <= 0) return;
  if (interval.low <= 0 || inverse <= 0) {
    result.bounds.push_back({spec.symbol, symbol.unit, 1 / interval.high, std::nullopt, 0.95});
    return;
  }
  Estimate estimate;
  estimate.symbol = spec.symbol;
  estimate.quantity = {1 / inverse, interval.u / (inverse * inverse), symbol.unit};
  estimate.low = 1 / interval.high;
  estimate.high = 1 / interval.low;
  estimate.k = estimate.half_width() / estimate.quantity.standard_uncertainty;
  if (interval.dof > 0) estimate.dof = interval.dof;
  estimate.at_hz = spec.at_hz;
  result.estimates.push_back(std::move(estimate));
}

}  // namespace

void add_estimates(Measurement& result, const std::vector<InputError>& inputs, const FittedInputs& fitted,
                   const std::vector<OutputSpec>& outputs, const MeasurementFunction& f,
                   const std::vector<ExtraTerm>& extra, const PropagationOptions& options) {
  const Carrier carrier(inputs, fitted, outputs, f);

  std::vector<double> extra_scale(extra.size(), 1.0);  // into the space where errors are carried
  for (std::size_t e = 0; e < extra.size(); ++e) {
    for (std::size_t o = 0; o < outputs.size(); ++o) {
      if (outputs[o].symbol == extra[e].symbol && outputs[o].reciprocal) {
        extra_scale[e] = carrier.center()[o] * carrier.center()[o];
      }
    }
  }
  std::vector<Interval> trials;
  if (options.by_trials) trials = by_trials(inputs, fitted, outputs, f, extra, extra_scale, options);

  std::vector<std::size_t> reported;
  std::vector<double> total_u(outputs.size(), 0.0);
  for (std::size_t o = 0; o < outputs.size(); ++o) {
    const OutputSpec& spec = outputs[o];
    const Symbol* symbol = find_symbol(spec.symbol);
    assert(symbol != nullptr);
    const double value = carrier.center()[o];
    if (!std::isfinite(value)) continue;

    std::vector<BudgetLine> lines;
    std::vector<ErrorLaw> laws;
    const auto add_term = [&](const std::string& source, ErrorLaw law, char kind, bool common, const std::string& basis) {
      if (!(law.standard_uncertainty > 0)) return;
      laws.push_back(law);
      // Errors of one name are one line of the budget; their laws stay apart.
      for (BudgetLine& line : lines) {
        if (line.source != source) continue;
        line.u = std::hypot(line.u, law.standard_uncertainty);
        return;
      }
      lines.push_back({source, kind, law.standard_uncertainty, 0, common, basis});
    };
    for (std::size_t i = 0; i < inputs.size(); ++i) {
      ErrorLaw law = inputs[i].law;
      law.standard_uncertainty = carrier.contribution(i, o);
      add_term(inputs[i].source, law, inputs[i].kind, inputs[i].common, inputs[i].basis);
    }
    ErrorLaw fit_law;
    fit_law.kind = fitted.dof > 0 ? ErrorLaw::Kind::student_t : ErrorLaw::Kind::normal;
    fit_law.dof = fitted.dof;
    fit_law.standard_uncertainty = carrier.contribution(inputs.size(), o);
    add_term(fitted.source, fit_law, 'A', false, "data");
    for (std::size_t e = 0; e < extra.size(); ++e) {
      if (extra[e].symbol != spec.symbol) continue;
      ErrorLaw law = extra[e].law;
      law.standard_uncertainty *= extra_scale[e];
      add_term(extra[e].source, law, extra[e].kind, extra[e].common, extra[e].basis);
    }

    double variance = 0;
    for (const ErrorLaw& law : laws) variance += law.standard_uncertainty * law.standard_uncertainty;
    Interval interval;
    interval.u = std::sqrt(variance);
    total_u[o] = interval.u;
    const double k = coverage_factor(laws);
    interval.low = value - k * interval.u;
    interval.high = value + k * interval.u;
    const auto [below, above] = carrier.reach(o);
    if (below > 0 && above > 0 && !options.by_trials) {
      // The ellipse's share of the interval gives way to what the region really spans.
      const double fit_u = carrier.contribution(inputs.size(), o);
      const double others = k * std::sqrt(std::fmax(variance - fit_u * fit_u, 0));
      interval.low = value - std::hypot(below, others);
      interval.high = value + std::hypot(above, others);
      interval.u = std::fmax(std::fmax(value - interval.low, interval.high - value) / 1.96, interval.u);
    }
    const double dof = effective_dof(laws);
    if (std::isfinite(dof) && dof < 200) interval.dof = dof;

    const bool bent = carrier.bend(o) > 0.1 * interval.u && fitted.contour.empty();
    bool disagrees = bent && !options.by_trials;
    if (options.by_trials) {
      disagrees = !agree_to_two_digits(interval, trials[o]);
      trials[o].dof = interval.dof;
      interval = trials[o];
    }
    if (disagrees && !result.has_finding("propagation_disagrees")) {
      const double figure = interval.u > 0 ? carrier.bend(o) / interval.u : 0;
      result.findings.push_back(
          {"propagation_disagrees", Severity::note,
           options.by_trials
               ? "first-order propagation and the trials differ in the second digit for " + spec.symbol +
                     "; the interval is that of the trials"
               : "the errors are large enough for " + spec.symbol +
                     " to bend within them; --propagate trials gives the interval without that approximation",
           spec.symbol, figure, Unit::one});
    }

    for (BudgetLine& line : lines) {
      line.share = variance > 0 ? line.u * line.u / variance : 0;
      if (spec.reciprocal) line.u /= value * value;
    }
    // Differences of nearly equal numbers leave traces of rounding; they are no source of uncertainty.
    std::erase_if(lines, [](const BudgetLine& line) { return line.share < 1e-12; });
    std::stable_sort(lines.begin(), lines.end(), [](const BudgetLine& a, const BudgetLine& b) { return a.u > b.u; });

    const std::size_t before = result.estimates.size();
    if (spec.reciprocal) {
      add_reciprocal(result, *symbol, spec, value, interval);
    } else {
      Estimate estimate;
      estimate.symbol = spec.symbol;
      estimate.quantity = {value, interval.u, symbol->unit};
      estimate.low = interval.low;
      estimate.high = interval.high;
      estimate.k = interval.u > 0 ? estimate.half_width() / interval.u : 0;
      if (interval.dof > 0) estimate.dof = interval.dof;
      estimate.at_hz = spec.at_hz;
      result.estimates.push_back(std::move(estimate));
    }
    if (result.estimates.size() > before) {
      result.budget[spec.symbol] = std::move(lines);
      reported.push_back(o);
    }
  }

  for (std::size_t a = 0; a < reported.size(); ++a) {
    for (std::size_t b = a + 1; b < reported.size(); ++b) {
      const std::size_t i = reported[a], j = reported[b];
      if (!(total_u[i] > 0 && total_u[j] > 0)) continue;
      double sign = 1;
      if (outputs[i].reciprocal) sign = -sign;
      if (outputs[j].reciprocal) sign = -sign;
      const double r = sign * carrier.covariance(i, j) / (total_u[i] * total_u[j]);
      result.correlations.push_back({outputs[i].symbol, outputs[j].symbol, std::clamp(r, -1.0, 1.0)});
    }
  }
}

InputError input_error(std::string source, const StatedValue& stated, const DefaultTolerance& otherwise,
                       const PropagationOptions& options) {
  InputError input;
  input.source = std::move(source);
  input.value = stated.value;
  input.basis = "stated";
  switch (stated.law) {
    case Law::exact:
      break;
    case Law::rectangular:
      input.law = {ErrorLaw::Kind::rectangular, stated.standard_uncertainty, 0};
      break;
    case Law::normal:
      input.law = {ErrorLaw::Kind::normal, stated.standard_uncertainty, 0};
      break;
    case Law::unstated:
      if (!options.exact_bench) {
        input.law = {ErrorLaw::Kind::rectangular, otherwise.half_width / std::sqrt(3.0), 0};
        input.basis = "default: " + otherwise.reason;
      }
      break;
  }
  return input;
}

}  // namespace coilassay
