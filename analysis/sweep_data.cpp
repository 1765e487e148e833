#include "analysis/sweep_data.h"

#include <algorithm>
#include <cmath>
#include <numeric>
#include <utility>

#include "base/number_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr std::size_t kFewestPoints = 5;
constexpr std::size_t kMostNamed = 8;   // of points left out; the rest is counted

std::string hertz(double f) { return to_text(f, Unit::hertz, Script::utf8, 4); }

/// One rectangular error of the analyser: dz by one standard uncertainty.
ImpedanceErrorTerm rectangular_error(std::string source, const std::string& basis) {
  ImpedanceErrorTerm term;
  term.source = std::move(source);
  term.law = {ErrorLaw::Kind::rectangular, 1, 0};
  term.basis = basis;
  return term;
}

/// Half-width and where it comes from; zero when there is none.
struct Accuracy {
  double half_width = 0;
  std::string basis;
};
Accuracy accuracy_of(const std::optional<StatedValue>& stated, double otherwise, const std::string& reason,
                     const SweepRequest& request) {
  if (stated) return {stated->value, "stated"};
  if (otherwise == 0 || request.propagation.exact_bench) return {};
  return {otherwise, "default: " + reason};
}

/// Weight of node k of n at place t of 0..1: hat functions that add up to one.
double hat(std::size_t k, std::size_t n, double t) {
  return std::fmax(0, 1 - std::fabs(t * static_cast<double>(n - 1) - static_cast<double>(k)));
}

/// Errors of the real and of the imaginary part of whatever `slope` is the derivative to: the same all over the span within
/// the stated half-width, and besides a part that wanders from decade to decade within half of it, by straight lines over
/// the logarithm of frequency. An analyser's data sheet bounds its error and does not say how much of it is constant.
template <class Slope>
void add_pair(std::vector<ImpedanceErrorTerm>& errors, const std::string& source, const std::string& second_source,
              const Accuracy& accuracy, const CircuitData& points, const Slope& slope) {
  const bool sizes_only = !points.u_phase.empty() && std::isinf(points.u_phase.front());
  if (!(accuracy.half_width > 0)) return;
  const double u = accuracy.half_width / std::sqrt(3.0);
  const double low = std::log(points.frequency_hz.front()), span = std::log(points.frequency_hz.back()) - low;
  const auto nodes = static_cast<std::size_t>(std::fmax(1, std::round(span / std::log(10.0)))) + 1;
  for (const Complex direction : {Complex(1, 0), Complex(0, 1)}) {
    if (sizes_only && direction.imag() > 0) break;   // nobody looked at the angle
    const auto add = [&](double size, const auto& weight) {
      ImpedanceErrorTerm term = rectangular_error(direction.real() > 0 ? source : second_source, accuracy.basis);
      for (std::size_t i = 0; i < points.size(); ++i) {
        term.dz_ohm.push_back(size * direction * slope(points.z[i]) * weight((std::log(points.frequency_hz[i]) - low) / span));
      }
      errors.push_back(std::move(term));
    };
    add(u, [](double) { return 1.0; });
    for (std::size_t k = 0; k < nodes; ++k) add(u * sweep_defaults::kWandering, [&](double t) { return hat(k, nodes, t); });
  }
}

void add_accuracy(SweepData& data, const Sweep& sweep, const SweepRequest& request) {
  const ImpedanceAccuracy& stated = request.bench.impedance;
  const CircuitData& points = data.points;
  const bool nothing_stated = !stated.ratio && !stated.scattering;
  if (request.knowledge.complete && nothing_stated) {
    // Whoever made the sweep has told its errors.
  } else if (data.scattering && (stated.scattering || !stated.ratio)) {
    const Accuracy s = accuracy_of(stated.scattering, sweep_defaults::kScattering, "±0.01 of S after an ordinary calibration", request);
    const double r = points.reference_ohm;
    // A transmission is worth twice a reflection of the reference that stands for it (one_port_of).
    const double worth = sweep.as_read == "S21" ? r : 2 * r;
    data.scatter_s = sweep_defaults::kPointToPoint * s.half_width * (2 * r / worth) / std::sqrt(3.0);
    add_pair(data.errors, "accuracy of S", "accuracy of S", s, points, [r, worth](Complex z) { return (z + r) * (z + r) / worth; });
  } else {
    const Accuracy a = accuracy_of(stated.ratio, sweep_defaults::kAccuracyRatio, "±0.5 % of an analyser without its data sheet", request);
    data.scatter_ratio = sweep_defaults::kPointToPoint * a.half_width / std::sqrt(3.0);
    add_pair(data.errors, "accuracy", "accuracy of the angle", a, points, [](Complex z) { return z; });
  }
  add_pair(data.errors, "series floor", "series floor", accuracy_of(stated.series_floor, 0, "", request), points,
           [](Complex) { return Complex(1, 0); });
  add_pair(data.errors, "parallel floor", "parallel floor", accuracy_of(stated.parallel_floor, 0, "", request), points,
           [](Complex z) { return -z * z; });
}

/// Of a file of sizes the size, its angle being nobody's business.
Complex impedance_of(const Sweep& sweep, std::size_t i) {
  if (sweep.z_ohm[i].empty()) return {std::nan(""), 0};
  const Complex z = sweep.z_ohm[i][0];
  return is_magnitude_only(sweep) ? Complex(z.real(), 0) : z;
}

constexpr double kBeyond_ohm = 1e15;   // no coil, no fixture and no empty port: a slip of the export

class Choosing {
 public:
  Choosing(const Sweep& sweep, SweepData& data) : sweep_(sweep), data_(data) {}

  /// Indices of the usable points by rising frequency.
  std::vector<std::size_t> usable() {
    std::vector<std::size_t> order;
    for (std::size_t i = 0; i < sweep_.frequency_hz.size(); ++i) {
      const double f = sweep_.frequency_hz[i];
      const Complex z = impedance_of(sweep_, i);
      if (!std::isfinite(f) || f <= 0) {
        leave_out(i, std::isfinite(f) ? hertz(f) + ": a frequency must be above zero" : "a point without a frequency");
      } else if (i < sweep_.bad.size() && sweep_.bad[i]) {
        leave_out(i, hertz(f) + ": marked as bad, or its impedance is missing or out of range");
      } else if (!std::isfinite(z.real()) || !std::isfinite(z.imag()) || z == 0.0) {
        leave_out(i, hertz(f) + ": no impedance");
      } else if (std::abs(z) > kBeyond_ohm) {
        leave_out(i, hertz(f) + ": an impedance out of range");
      } else {
        order.push_back(i);
      }
    }
    std::stable_sort(order.begin(), order.end(), [this](std::size_t a, std::size_t b) {
      return sweep_.frequency_hz[a] < sweep_.frequency_hz[b];
    });
    if (left_out_ > kMostNamed) data_.left_out.push_back("and " + std::to_string(left_out_ - kMostNamed) + " more");
    return order;
  }
  std::size_t left_out() const { return left_out_; }
  const std::string& first_reason() const { return first_reason_; }

 private:
  void leave_out(std::size_t, std::string why) {
    if (left_out_ == 0) first_reason_ = why;
    if (++left_out_ <= kMostNamed) data_.left_out.push_back(std::move(why));
  }
  const Sweep& sweep_;
  SweepData& data_;
  std::size_t left_out_ = 0;
  std::string first_reason_;
};

}  // namespace

bool is_magnitude_only(const Sweep& sweep) { return sweep.as_read == "|Z|"; }

Result<SweepData> sweep_data(const Sweep& sweep, const SweepRequest& request) {
  const std::string& name = sweep.source.name;
  if (sweep.ports != 1) {
    return failure(Problem::usage, name, "the sweep has " + std::to_string(sweep.ports) + " ports, and a coil's circuit is that of one",
                   "say which with --port 1, or how the coil was connected with --connection");
  }
  SweepData data;
  data.has_phase = !is_magnitude_only(sweep);
  data.scattering = sweep.as_read.starts_with("S");
  if (!sweep.reference_ohm.empty()) data.points.reference_ohm = sweep.reference_ohm.front();
  Choosing choosing(sweep, data);
  data.index = choosing.usable();
  if (data.index.empty() && data.scattering) {
    // An impedance of exactly zero at every point that was not left out as bad is the other end of the same mistake.
    bool shorted = false, open = false;
    for (std::size_t i = 0; i < sweep.frequency_hz.size(); ++i) (impedance_of(sweep, i) == 0.0 ? shorted : open) = true;
    const bool only_short = shorted && !open, both = shorted && open;
    return failure(Problem::no_signal, name,
                   only_short ? "S is that of an ideal short at every point: an impedance of nothing"
                   : both     ? "S is that of an ideal short or an ideal open at every point: no impedance of a coil"
                              : "S is that of an ideal open at every point, which is no impedance at all",
                   only_short ? "take the short away, connect the coil and sweep again"
                              : "check that the coil was connected and that the calibration belongs to this set-up");
  }
  if (data.index.size() < kFewestPoints) {
    const std::string also = choosing.left_out() == 0 ? ""
                                                      : "; " + std::to_string(choosing.left_out()) + " could not be used, the first because: " +
                                                            choosing.first_reason();
    return failure(Problem::too_few_samples, name,
                   "the sweep has " + std::to_string(data.index.size()) + " usable points, and a circuit needs at least " +
                       std::to_string(kFewestPoints) + also,
                   "sweep more frequencies, a hundred over two decades or more");
  }
  const SweepKnowledge& known = request.knowledge;
  const auto u_of = [](const std::vector<double>& u, std::size_t i) { return u.size() == 1 ? u[0] : u[i]; };
  for (const std::size_t i : data.index) {
    data.points.frequency_hz.push_back(sweep.frequency_hz[i]);
    data.points.z.push_back(impedance_of(sweep, i));
  }
  data.low_hz = data.points.frequency_hz.front();
  data.high_hz = data.points.frequency_hz.back();
  if (!(data.high_hz > 1.001 * data.low_hz)) {
    return failure(Problem::too_few_samples, name,
                   "all points are at one frequency, " + hertz(data.low_hz) + ": what is coil and what is its capacitance cannot be told apart",
                   "sweep over two decades or more; for one frequency measure with coilassay sine");
  }
  data.points.u = {1};
  data.points.scale_known = false;
  if (!known.u_ratio.empty()) {
    data.points.u.clear();
    data.points.scale_known = true;
    for (const std::size_t i : data.index) data.points.u.push_back(u_of(known.u_ratio, i));
    for (const std::size_t i : data.index) {
      if (!known.u_phase.empty()) data.points.u_phase.push_back(u_of(known.u_phase, i));
    }
  }
  if (!data.has_phase) data.points.u_phase.assign(data.index.size(), HUGE_VAL);
  for (const ImpedanceErrorTerm& each : known.errors) {
    ImpedanceErrorTerm term = each;
    term.dz_ohm.clear();
    for (const std::size_t i : data.index) term.dz_ohm.push_back(each.dz_ohm[i]);
    data.errors.push_back(std::move(term));
  }
  add_accuracy(data, sweep, request);
  return data;
}

ImpedanceErrorTerm frequency_error(const SweepData& data, const Circuit& circuit, const SweepRequest& request) {
  const Accuracy a = accuracy_of(request.bench.timebase, sweep_defaults::kFrequencyRatio, "±100 ppm", request);
  ImpedanceErrorTerm term = rectangular_error("frequency", a.basis);
  for (std::size_t i = 0; i < data.points.size(); ++i) {
    const double f = data.points.frequency_hz[i];
    const ImpedanceSlopes at = impedance_slopes(circuit, f);
    term.dz_ohm.push_back(a.half_width / std::sqrt(3.0) * f * at.by_frequency / at.z * data.points.z[i]);
  }
  return term;
}

}  // namespace coilassay
