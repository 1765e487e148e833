// Several captures of one coil: impedance over frequency, level or bias, and the saturation currents parts are rated by.
#include <algorithm>
#include <array>
#include <cmath>
#include <numeric>
#include <utility>

#include "analysis/sine.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr double kBiasRatio = 0.02;       // of a bias given without tolerance: the meter of a bench supply
constexpr double kRises = 0.02;           // of L at the reference: worth a word
constexpr std::size_t kFewestBiases = 3;

/// Inductance over bias by a cubic that keeps between its neighbours (Fritsch-Carlson slopes), x rising.
class MonotoneCurve {
 public:
  MonotoneCurve(std::vector<double> x, std::vector<double> y) : x_(std::move(x)), y_(std::move(y)), slope_(x_.size()) {
    const auto chord = [this](std::size_t i) { return (y_[i + 1] - y_[i]) / (x_[i + 1] - x_[i]); };
    const std::size_t n = x_.size();
    for (std::size_t i = 0; i < n && n > 1; ++i) {
      if (i == 0 || i + 1 == n) {
        slope_[i] = chord(i == 0 ? 0 : i - 1);
        continue;
      }
      const double before = chord(i - 1), after = chord(i);
      slope_[i] = before * after <= 0 ? 0 : 2 * before * after / (before + after);
    }
  }

  /// First x from `from` on at which the curve has fallen to `level`; NaN when it never does.
  double falls_to(double level, double from) const {
    for (std::size_t i = 0; i + 1 < x_.size(); ++i) {
      if (x_[i + 1] <= from || !(y_[i + 1] <= level) || !(y_[i] > level)) continue;
      double low = x_[i], high = x_[i + 1];
      for (int k = 0; k < 60; ++k) {
        const double middle = (low + high) / 2;
        (at(i, middle) > level ? low : high) = middle;
      }
      return (low + high) / 2;
    }
    return std::nan("");
  }

  /// The same by straight lines between the points.
  double falls_straight_to(double level) const {
    for (std::size_t i = 0; i + 1 < x_.size(); ++i) {
      if (y_[i + 1] <= level && y_[i] > level) {
        return x_[i] + (x_[i + 1] - x_[i]) * (y_[i] - level) / (y_[i] - y_[i + 1]);
      }
    }
    return std::nan("");
  }

 private:
  double at(std::size_t i, double x) const {
    const double h = x_[i + 1] - x_[i], t = (x - x_[i]) / h;
    return y_[i] * (1 + 2 * t) * (1 - t) * (1 - t) + slope_[i] * h * t * (1 - t) * (1 - t) +
           y_[i + 1] * t * t * (3 - 2 * t) + slope_[i + 1] * h * t * t * (t - 1);
  }
  std::vector<double> x_, y_, slope_;
};

/// What of the uncertainty of L_s is this capture's own: gains and skew are the same at every bias and leave the ratio.
double own_uncertainty(const Measurement& m) {
  double sum = 0;
  const auto lines = m.budget.find("L_s");
  if (lines == m.budget.end()) return 0;
  for (const BudgetLine& line : lines->second) {
    if (!line.common) sum += line.u * line.u;
  }
  return std::sqrt(sum);
}

struct BiasPoint {
  std::size_t capture;
  double amps;         // magnitude
  double inductance, u;
};

/// Captures that have an inductance, by rising magnitude of bias.
std::vector<BiasPoint> bias_points(const std::vector<Measurement>& parts, const SineRequest& request) {
  std::vector<BiasPoint> points;
  for (std::size_t i = 0; i < parts.size(); ++i) {
    if (const Estimate* l = parts[i].find("L_s")) {
      points.push_back({i, std::fabs(request.biases[i].value), l->quantity.value, own_uncertainty(parts[i])});
    }
  }
  std::stable_sort(points.begin(), points.end(), [](const BiasPoint& a, const BiasPoint& b) { return a.amps < b.amps; });
  return points;
}

void add_saturation(Measurement& result, const std::vector<Measurement>& parts, const SineRequest& request) {
  const std::vector<BiasPoint> points = bias_points(parts, request);
  const auto repeated = std::adjacent_find(points.begin(), points.end(), [](const BiasPoint& a, const BiasPoint& b) {
    return !(b.amps > a.amps);
  });
  if (points.size() < kFewestBiases || repeated != points.end()) {
    result.advice.push_back(points.size() < kFewestBiases
                                ? "three or more bias currents with a usable capture give the saturation currents"
                                : "each bias current once gives the saturation currents; one was given twice");
    return;
  }
  std::vector<InputError> inputs;
  FittedInputs fitted;
  const auto count = static_cast<Eigen::Index>(points.size());
  fitted.values.resize(count);
  fitted.covariance = Eigen::MatrixXd::Zero(count, count);
  std::vector<double> amps, inductance;
  for (std::size_t k = 0; k < points.size(); ++k) {
    const StatedValue& bias = request.biases[points[k].capture];
    InputError error = input_error("bias current", bias, {kBiasRatio * std::fabs(bias.value), "±2 %"}, request.propagation);
    error.value = points[k].amps;
    inputs.push_back(std::move(error));
    fitted.values[static_cast<Eigen::Index>(k)] = points[k].inductance;
    fitted.covariance(static_cast<Eigen::Index>(k), static_cast<Eigen::Index>(k)) = points[k].u * points[k].u;
    amps.push_back(points[k].amps);
    inductance.push_back(points[k].inductance);
  }
  const std::array<double, 3> drops = {0.1, 0.2, 0.3};
  const std::array<const char*, 3> symbols = {"I_sat_10", "I_sat_20", "I_sat_30"};
  const MonotoneCurve curve(amps, inductance);
  const double reference = inductance.front();

  std::vector<OutputSpec> outputs;
  std::vector<double> levels;
  std::vector<ExtraTerm> extra;
  for (std::size_t d = 0; d < 3; ++d) {
    const double level = (1 - drops[d]) * reference;
    const double crossing = curve.falls_to(level, amps.front());
    if (std::isnan(crossing)) {
      result.bounds.push_back({symbols[d], Unit::ampere, amps.back(), std::nullopt, 0.95});
      result.findings.push_back({"knee_not_reached", Severity::note,
                                 "L_s has fallen by " +
                                     to_percent_text(1 - *std::min_element(inductance.begin(), inductance.end()) / reference) +
                                     " at most; " + symbols[d] + " lies above the highest bias, " +
                                     to_text(amps.back(), Unit::ampere, Script::utf8, 3),
                                 symbols[d], amps.back(), Unit::ampere});
      continue;
    }
    outputs.push_back({symbols[d]});
    levels.push_back(1 - drops[d]);
    // Between the points the curve is not known: a straight line is the other plausible one.
    const double between = std::fabs(crossing - curve.falls_straight_to(level));
    extra.push_back({symbols[d], "interpolation", {ErrorLaw::Kind::rectangular, between / std::sqrt(3.0), 0}, 'B', false,
                     "cubic against straight line"});
  }
  if (outputs.empty()) return;
  const std::size_t n = points.size();
  const auto function = [n, &levels](std::span<const double> x, std::span<double> y) {
    std::vector<double> at(x.begin(), x.begin() + static_cast<std::ptrdiff_t>(n));
    std::vector<double> l(x.begin() + static_cast<std::ptrdiff_t>(n), x.end());
    const bool rising = std::is_sorted(at.begin(), at.end(), [](double a, double b) { return a <= b; });
    for (std::size_t o = 0; o < y.size(); ++o) {
      y[o] = rising ? MonotoneCurve(at, l).falls_to(levels[o] * l.front(), at.front()) : std::nan("");
    }
  };
  const std::size_t before = result.estimates.size();
  add_estimates(result, inputs, fitted, outputs, function, extra, request.propagation);
  for (std::size_t e = before; e < result.estimates.size(); ++e) {
    result.estimates[e].definition = "bias_small_signal";
    if (amps.front() > 0) result.estimates[e].reference_a = amps.front();
  }
  const double highest = *std::max_element(inductance.begin(), inductance.end());
  if (highest > (1 + kRises) * reference) {
    result.findings.push_back({"l_rises_first", Severity::note,
                               "L_s rises by " + to_percent_text(highest / reference - 1) +
                                   " before it falls; the percentages refer to the value at the lowest bias",
                               "L_s", highest / reference - 1, Unit::one});
  }
}

/// Columns for a figure; a value that was withheld is a gap.
Table points_table(const std::vector<Measurement>& parts, const SineRequest& request) {
  Table table{"points", {{"frequency_Hz", Unit::hertz, {}}, {"level_A", Unit::ampere, {}}, {"bias_A", Unit::ampere, {}},
                         {"inductance_H", Unit::henry, {}}, {"inductance_U_H", Unit::henry, {}},
                         {"resistance_ohm", Unit::ohm, {}}, {"resistance_U_ohm", Unit::ohm, {}}}};
  std::vector<std::size_t> order(parts.size());
  std::iota(order.begin(), order.end(), 0U);
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) {
    if (!request.biases.empty()) return std::fabs(request.biases[a].value) < std::fabs(request.biases[b].value);
    return parts[a].conditions.frequency_hz.value_or(0) < parts[b].conditions.frequency_hz.value_or(0);
  });
  for (const std::size_t i : order) {
    const auto add = [&](std::size_t column, const Estimate* estimate) {
      table.columns[column].values.push_back(estimate != nullptr ? estimate->quantity.value : std::nan(""));
      table.columns[column + 1].values.push_back(estimate != nullptr ? estimate->half_width() : std::nan(""));
    };
    table.columns[0].values.push_back(parts[i].conditions.frequency_hz.value_or(std::nan("")));
    table.columns[1].values.push_back(parts[i].conditions.level_a.value_or(std::nan("")));
    table.columns[2].values.push_back(request.biases.empty() ? std::nan("") : request.biases[i].value);
    add(3, parts[i].find("L_s"));
    add(5, parts[i].find("R_s"));
  }
  return table;
}

}  // namespace

Result<Measurement> measure_sine_points(const std::vector<Capture>& captures, const SineRequest& request) {
  if (!request.biases.empty() && request.biases.size() != captures.size()) {
    return failure(Problem::usage, "--bias",
                   std::to_string(request.biases.size()) + " bias currents were given for " +
                       std::to_string(captures.size()) + (captures.size() == 1 ? " capture" : " captures"),
                   "give one for each capture, in the same order");
  }
  std::vector<Measurement> parts;
  for (std::size_t i = 0; i < captures.size(); ++i) {
    SineRequest one = request;
    one.biases.clear();
    one.traces = false;
    if (!request.biases.empty()) one.bench.bias = request.biases[i];
    Result<Measurement> part = measure_sine(captures[i], one);
    if (!part) return failure(part);
    parts.push_back(std::move(*part));
  }

  // The quantities of the first capture that has any; findings of all, each with its file.
  const auto leading = std::find_if(parts.begin(), parts.end(), [](const Measurement& m) { return m.find("Z") != nullptr; });
  Measurement result = leading != parts.end() ? *leading : parts.front();
  result.sources.clear();
  result.findings.clear();
  result.tables.clear();
  for (const Measurement& part : parts) {
    result.sources.insert(result.sources.end(), part.sources.begin(), part.sources.end());
    for (Finding finding : part.findings) {
      finding.message = shown(part.sources.front().source.name, 60) + ": " + finding.message;
      // One capture of several that gives nothing takes nothing from the others.
      if (finding.severity == Severity::refusal && leading != parts.end()) finding.severity = Severity::caution;
      result.findings.push_back(std::move(finding));
    }
    Point point;
    point.at_hz = part.conditions.frequency_hz;
    point.level_a = part.conditions.level_a;
    point.bias_a = part.conditions.bias_a;
    point.from = part.sources.front().source.name;
    for (const Estimate& estimate : part.estimates) {
      if (estimate.symbol != "f") point.estimates.push_back(estimate);
    }
    result.points.push_back(std::move(point));
  }
  if (leading != parts.end()) {
    result.advice.push_back("the values above are those of " + shown(leading->sources.front().source.name, 60) +
                            "; the table has all captures");
  }
  if (!request.biases.empty()) add_saturation(result, parts, request);
  if (request.traces) result.tables.push_back(points_table(parts, request));
  return result;
}

}  // namespace coilassay
