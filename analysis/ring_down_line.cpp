// Several capacitors: 1/(2 pi f_0)^2 = L (C + C_par), a straight line in the added capacitance (NBS Circular 74, section 19,
// method; both rules read in public notes).
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/cautions.h"
#include "analysis/ring_down.h"
#include "analysis/ring_down_circuit.h"
#include "analysis/ring_down_decay.h"
#include "analysis/ring_down_result.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kOffTheLine = 1e-3;   // probability by chance below which the points are said not to lie on a line

struct Line {
  double slope = 0, intercept = 0;     // y = slope x + intercept
};

Line weighted_line(const std::vector<double>& x, const std::vector<double>& y, const std::vector<double>& w) {
  double s = 0, sx = 0, sy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    s += w[i];
    sx += w[i] * x[i];
    sy += w[i] * y[i];
  }
  const double mx = sx / s, my = sy / s;
  double sxx = 0, sxy = 0;
  for (std::size_t i = 0; i < x.size(); ++i) {
    sxx += w[i] * (x[i] - mx) * (x[i] - mx);
    sxy += w[i] * (x[i] - mx) * (y[i] - my);
  }
  const double slope = sxy / sxx;
  return {slope, my - slope * mx};
}

/// The captures' decays against one circuit.
class Bank {
 public:
  Bank(const RingDownRequest& request, std::vector<CaptureDecay> decays)
      : request_(request), decays_(std::move(decays)), circuit_(request.bench, request.propagation, true) {
    for (std::size_t i = 0; i < decays_.size(); ++i) {
      circuit_.add_capacitor(request.bench.capacitors[i], "capacitor " + std::to_string(i + 1));
    }
    for (std::size_t i = 0; i < decays_.size(); ++i) {
      errors_.emplace_back(circuit_, decays_[i], " " + std::to_string(i + 1), 2 * i);
    }
    const auto n = static_cast<Eigen::Index>(decays_.size());
    fitted_.values.resize(2 * n);
    fitted_.covariance = Eigen::MatrixXd::Zero(2 * n, 2 * n);
    for (Eigen::Index i = 0; i < n; ++i) {
      const CaptureDecay& d = decays_[static_cast<std::size_t>(i)];
      fitted_.values[2 * i] = d.a();
      fitted_.values[2 * i + 1] = d.q();
      fitted_.covariance.block(2 * i, 2 * i, 2, 2) = d.covariance();
    }
    best_ = best();
    weigh();
  }

  std::size_t size() const { return decays_.size(); }
  const RingDownCircuit& circuit() const { return circuit_; }
  const FittedInputs& fitted() const { return fitted_; }
  const std::vector<double>& best_inputs() const { return best_; }
  const DecayErrors& errors(std::size_t i) const { return errors_[i]; }

  double added(std::span<const double> x, std::size_t i) const { return circuit_.total_capacitance(x, i); }

  /// L (slope) and L C_par (intercept). The first pass gives L for the small correction by the resistance across.
  Line line(std::span<const double> x) const {
    std::vector<double> c, y;
    for (std::size_t i = 0; i < size(); ++i) {
      const DecayRates rates = errors_[i].rates(x, circuit_);
      c.push_back(added(x, i));
      y.push_back(1 / (rates.omega0 * rates.omega0));
    }
    const Line first = weighted_line(c, y, weights_);
    const double g = circuit_.conductance(x);
    for (std::size_t i = 0; i < size(); ++i) {
      const DecayRates rates = errors_[i].rates(x, circuit_);
      const double total = c[i] + first.intercept / first.slope;
      const double resistance =
          (2 * rates.alpha - g / total - rates.omega0 * circuit_.dissipation(x, i)) * first.slope;
      y[i] *= 1 + resistance * g;
    }
    return weighted_line(c, y, weights_);
  }

  /// Chi-square of the points about the line, over n - 2, with its probability by chance.
  struct Straightness {
    double reduced = 0, chance = 1;
    std::size_t worst = 0;
    double worst_distance = 0;         // in standard deviations
  };
  Straightness straightness() const {
    Straightness s;
    if (size() < 3) return s;
    const Line fit = line(best_);
    double chi = 0;
    for (std::size_t i = 0; i < size(); ++i) {
      const DecayRates rates = errors_[i].rates(best_, circuit_);
      const double r = (1 / (rates.omega0 * rates.omega0) - fit.slope * added(best_, i) - fit.intercept) *
                       std::sqrt(weights_[i]);
      chi += r * r;
      if (std::fabs(r) > s.worst_distance) {
        s.worst_distance = std::fabs(r);
        s.worst = i;
      }
    }
    const auto dof = static_cast<double>(size() - 2);
    s.reduced = chi / dof;
    s.chance = f_upper_tail(s.reduced, dof, 1e6);
    return s;
  }

  /// Of all captures the largest voltage, current and energy.
  ReleaseLevel strongest_release() const {
    const Line fit = line(best_);
    ReleaseLevel most;
    for (std::size_t i = 0; i < size(); ++i) {
      const ReleaseLevel one = release_level(decays_[i], fit.slope, added(best_, i) + fit.intercept / fit.slope);
      most.peak_v = std::fmax(most.peak_v, one.peak_v);
      most.peak_a = std::fmax(most.peak_a, one.peak_a);
      most.energy_j = std::fmax(most.energy_j, one.energy_j);
      most.at_release = most.at_release || one.at_release;
    }
    return most;
  }

  Table table() const {
    Table table{"line",
                {{"capacitance_F", Unit::farad, {}},
                 {"inverse_omega_squared_s2", Unit::one, {}},
                 {"u_inverse_s2", Unit::one, {}},
                 {"fit_s2", Unit::one, {}}}};
    const Line fit = line(best_);
    for (std::size_t i = 0; i < size(); ++i) {
      const DecayRates rates = errors_[i].rates(best_, circuit_);
      table.columns[0].values.push_back(added(best_, i));
      table.columns[1].values.push_back(1 / (rates.omega0 * rates.omega0));
      table.columns[2].values.push_back(1 / std::sqrt(weights_[i]));
      table.columns[3].values.push_back(fit.slope * added(best_, i) + fit.intercept);
    }
    return table;
  }

 private:
  std::vector<double> best() const {
    std::vector<double> x;
    for (const InputError& input : circuit_.inputs()) x.push_back(input.value);
    for (const double v : fitted_.values) x.push_back(v);
    return x;
  }

  /// Errors in both directions: a capacitor's own error acts like L times as large an error of y. What all points share
  /// (probe, time base) moves them together and does not weigh.
  void weigh() {
    weights_.assign(size(), 1.0);
    for (int pass = 0; pass < 3; ++pass) {
      const double slope = line(best_).slope;
      std::vector<double> next;
      for (std::size_t i = 0; i < size(); ++i) {
        const DecayRates rates = errors_[i].rates(best_, circuit_);
        const double y = 1 / (rates.omega0 * rates.omega0);
        const double step = decays_[i].step_s;
        const auto k = static_cast<Eigen::Index>(2 * i);
        const double scale = y * y / (step * step);   // d y / d(a^2 + q) in magnitude
        const Eigen::Vector2d slope_of_square(2 * decays_[i].a(), 1);
        const double u_square =
            std::sqrt(slope_of_square.dot(fitted_.covariance.block(k, k, 2, 2) * slope_of_square));
        const double spread = decays_[i].structure.spread_q / std::sqrt(3.0);
        const double u_y = scale * std::hypot(u_square, spread);
        const double u_c = circuit_.inputs()[circuit_.capacitor_input(i)].law.standard_uncertainty;
        const double u = std::sqrt(u_y * u_y + slope * slope * u_c * u_c + 1e-18 * y * y);
        next.push_back(1 / (u * u));
      }
      weights_ = next;
    }
  }

  const RingDownRequest& request_;
  std::vector<CaptureDecay> decays_;
  RingDownCircuit circuit_;
  std::vector<DecayErrors> errors_;
  FittedInputs fitted_;
  std::vector<double> best_, weights_;
};

Result<void> check_request(const std::vector<Capture>& captures, const RingDownRequest& request) {
  const auto& capacitors = request.bench.capacitors;
  if (captures.size() != capacitors.size()) {
    return failure(Problem::usage, "--capacitor",
                   std::to_string(captures.size()) + " captures and " + std::to_string(capacitors.size()) +
                       (capacitors.size() == 1 ? " capacitor" : " capacitors"),
                   "give one --capacitor for each capture, in the same order");
  }
  const auto [least, most] = std::minmax_element(
      capacitors.begin(), capacitors.end(),
      [](const CapacitorSetup& a, const CapacitorSetup& b) { return a.value.value < b.value.value; });
  if (!(most->value.value > 1.0001 * least->value.value)) {
    return failure(Problem::usage, "--capacitor", "all capacitors have the same value, so the line has no slope",
                   "use capacitors that differ, two to one or more");
  }
  return {};
}

/// Each capture's own frequency, Q and series resistance, with the fitted L and C_par.
void add_points(Measurement& result, const Bank& bank, const std::vector<Capture>& captures,
                const RingDownRequest& request) {
  for (std::size_t i = 0; i < bank.size(); ++i) {
    Measurement one;
    const auto f = [&](std::span<const double> x, std::span<double> y) {
      const DecayRates rates = bank.errors(i).rates(x, bank.circuit());
      const Line line = bank.line(x);
      const double total = bank.added(x, i) + line.intercept / line.slope;
      y[0] = rates.omega0 / kTwoPi;
      y[1] = 2 * rates.alpha / rates.omega0;
      y[2] = (2 * rates.alpha - bank.circuit().conductance(x) / total -
              rates.omega0 * bank.circuit().dissipation(x, i)) *
             line.slope;
    };
    add_estimates(one, bank.circuit().inputs(), bank.fitted(), {{"f_0"}, {"Q", true}, {"R_s"}}, f, {},
                  request.propagation);
    std::erase_if(one.estimates, [](const Estimate& e) {
      return e.symbol == "R_s" && e.quantity.value <= e.quantity.standard_uncertainty;
    });
    Point point;
    point.from = captures[i].source.name;
    point.capacitance_f = request.bench.capacitors[i].value.value;
    if (const Estimate* f_0 = one.find("f_0")) point.at_hz = f_0->quantity.value;
    point.estimates = std::move(one.estimates);
    result.points.push_back(std::move(point));
  }
}

}  // namespace

Result<Measurement> measure_ring_down_line(const std::vector<Capture>& captures, const RingDownRequest& request) {
  if (const Result<void> fine = check_request(captures, request); !fine) return failure(fine);

  Measurement result;
  std::vector<CaptureDecay> decays;
  bool complete = true;
  for (const Capture& capture : captures) {
    Result<CaptureDecay> decay = decay_of_capture(capture, request);
    if (!decay) return failure(decay);
    describe_source(result, capture, request);
    for (Finding finding : decay->findings) {
      finding.message = shown(capture.source.name) + ": " + finding.message;
      finding.about = capture.source.name;
      result.findings.push_back(std::move(finding));
    }
    complete = complete && decay->decay.has_value();
    decays.push_back(std::move(*decay));
  }
  if (!complete) return result;
  result.model = model_of(decays.front());

  const Bank bank(request, std::move(decays));
  result.corrections = bank.circuit().corrections();
  const Bank::Straightness straight = bank.straightness();
  std::vector<ExtraTerm> extra;
  const auto f = [&](std::span<const double> x, std::span<double> y) {
    const Line line = bank.line(x);
    y[0] = line.slope;
    y[1] = line.intercept / line.slope;
    y[2] = bank.errors(0).rates(x, bank.circuit()).omega0 / kTwoPi;
  };
  const std::vector<OutputSpec> outputs{{"L"}, {"C_par"}, {"f_0"}};
  if (straight.chance < kOffTheLine) {
    // The stated errors do not explain the scatter: widen by what the points themselves show (Birge ratio).
    Measurement plain;
    add_estimates(plain, bank.circuit().inputs(), bank.fitted(), outputs, f, {}, request.propagation);
    for (const char* symbol : {"L", "C_par"}) {
      if (const Estimate* e = plain.find(symbol)) {
        extra.push_back({symbol, "points off the line",
                         {ErrorLaw::Kind::student_t,
                          e->quantity.standard_uncertainty * std::sqrt(std::fmax(straight.reduced - 1, 0)),
                          static_cast<double>(bank.size() - 2)},
                         'A', false, "data"});
      }
    }
    result.findings.push_back(
        {"model_misfit", Severity::caution,
         "the captures do not lie on one line in the added capacitance; " + shown(captures[straight.worst].source.name) +
             " is off by " + to_text(straight.worst_distance, Unit::one, Script::utf8, 2) +
             " standard deviations: check that its capacitor is the one stated. The intervals cover the scatter",
         "L", straight.reduced, Unit::one});
  }
  add_estimates(result, bank.circuit().inputs(), bank.fitted(), outputs, f, extra, request.propagation);
  if (const Estimate* f_0 = result.find("f_0")) result.conditions.frequency_hz = f_0->quantity.value;
  const Estimate* inductance = result.find("L");
  if (inductance != nullptr && !(inductance->low > 0)) {
    result.findings.push_back({"model_misfit", Severity::refusal,
                               "the frequency does not fall as capacitance is added: most likely the captures and capacitors "
                               "are not in the same order; L and C_par are withheld",
                               "L", inductance->quantity.value, Unit::henry});
    withhold(result, "L");
    withhold(result, "C_par");
    return result;
  }
  add_points(result, bank, captures, request);
  const ReleaseLevel most = bank.strongest_release();
  result.cautions = ring_down_cautions(most.peak_v, most.peak_a, most.energy_j, most.at_release);
  if (request.traces) result.tables.push_back(bank.table());
  return result;
}

}  // namespace coilassay
