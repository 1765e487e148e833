#include "analysis/coupling_readings.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <numeric>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Complex = std::complex<double>;
constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kNoiseUnknown = 1e-3;   // of a trace too short to show its scatter, until the fit does
constexpr double kLeastInductance = 1e-15, kMostInductance = 1e6;   // of anything that is wound
constexpr double kLeastRatio = 1e-9;
constexpr std::size_t kScatterPoints = 7;
constexpr std::size_t kMostPoints = 400;
constexpr double kNoisy = 0.1;           // beyond, the logarithm of a noisy number is biased

/// Relative noise from third differences of ln z over the grid, which a smooth curve does not touch; size and angle apart.
std::pair<double, double> scatter_of(const std::vector<Complex>& z) {
  if (z.size() < kScatterPoints) return {kNoiseUnknown, kNoiseUnknown};
  double size = 0, angle = 0;
  std::size_t count = 0;
  for (std::size_t i = 3; i < z.size(); ++i) {
    const Complex d = std::log(z[i] / z[i - 1] * (z[i - 2] / z[i - 1])) + std::log(z[i - 2] / z[i - 1] * (z[i - 2] / z[i - 3])) ;
    size += d.real() * d.real();
    angle += d.imag() * d.imag();
    ++count;
  }
  // (1, -3, 3, -1): the squares add up to 20.
  const double n = 20 * static_cast<double>(count);
  return {std::fmax(std::sqrt(size / n), kLeastCouplingNoise), std::fmax(std::sqrt(angle / n), kLeastCouplingNoise)};
}

struct Curve {
  std::vector<double> omega;
  std::vector<Complex> z;
};

/// One element of the matrix over rising frequency, marked and impossible points left out, neighbours averaged where there
/// are more than the fit needs.
Curve curve_of(const Sweep& sweep, std::size_t row, std::size_t column) {
  std::vector<std::size_t> order(sweep.frequency_hz.size());
  std::iota(order.begin(), order.end(), 0u);
  std::stable_sort(order.begin(), order.end(), [&](std::size_t a, std::size_t b) { return sweep.frequency_hz[a] < sweep.frequency_hz[b]; });
  Curve all;
  for (const std::size_t i : order) {
    const Complex z = sweep.z_ohm[i][row * sweep.ports + column];
    const bool marked = i < sweep.bad.size() && sweep.bad[i];
    if (marked || !(sweep.frequency_hz[i] > 0) || !std::isfinite(z.real()) || !std::isfinite(z.imag()) || std::abs(z) == 0) continue;
    all.omega.push_back(kTwoPi * sweep.frequency_hz[i]);
    all.z.push_back(z);
  }
  const std::size_t group = (all.z.size() + kMostPoints - 1) / kMostPoints;
  if (group < 2) return all;
  Curve few;
  for (std::size_t i = 0; i + group <= all.z.size(); i += group) {
    double ln_omega = 0;
    Complex ln_z = 0;
    for (std::size_t k = i; k < i + group; ++k) {
      ln_omega += std::log(all.omega[k]);
      ln_z += std::log(all.z[k] / all.z[i]);
    }
    const double n = static_cast<double>(group);
    few.omega.push_back(std::exp(ln_omega / n));
    few.z.push_back(all.z[i] * std::exp(ln_z / n));
  }
  return few;
}

class Collector {
 public:
  explicit Collector(const CouplingRequest& request) : request_(request) {}

  Result<CouplingReadings> collect() {
    if (request_.common_accuracy && *request_.common_accuracy > 0) {
      common_ = add_shared({"accuracy common to all", ErrorLaw::Kind::rectangular, 'B', true, "stated"});
      common_u_ = *request_.common_accuracy / std::sqrt(3.0);
    }
    if (auto fine = check_files(); !fine) return failure(fine);
    for (const CouplingInput& input : request_.inputs) {
      Result<void> taken;
      if (const auto* value = std::get_if<CouplingValue>(&input.given)) taken = take_value(input.item, *value);
      if (const auto* sweep = std::get_if<Sweep>(&input.given)) taken = take_sweep(input.item, *sweep);
      if (const auto* sine = std::get_if<Measurement>(&input.given)) take_sine(input.item, *sine);
      if (!taken) return failure(taken);
    }
    if (request_.ports) take_ports(*request_.ports);
    for (const CouplingTrace& trace : all_.traces) {
      all_.shows_m = all_.shows_m || shows_sign(trace.item);
      for (const CouplingReading& r : trace.readings) all_.complex_read = all_.complex_read || !r.real;
    }
    return std::move(all_);
  }

 private:
  /// One file cannot be two measurements; the two directions of a two-port file are.
  Result<void> check_files() const {
    struct File {
      std::string sha256, name, as;
      bool one_direction;
    };
    std::vector<File> files;
    const auto add = [&](const Source& source, std::string as, bool one_direction) -> Result<void> {
      if (source.sha256.empty()) return {};
      for (const File& f : files) {
        if (f.sha256 != source.sha256 || (f.one_direction && one_direction && f.as != as)) continue;
        return failure(Problem::usage, source.name, "the same file is given as " + f.as + " and as " + as + ", and one measurement does not count twice",
                       "give another file for one of the two, or leave one out");
      }
      files.push_back({source.sha256, source.name, std::move(as), one_direction});
      return {};
    };
    for (const CouplingInput& input : request_.inputs) {
      const std::string as(option_of(input.item));
      Result<void> fine;
      if (const auto* sweep = std::get_if<Sweep>(&input.given)) fine = add(sweep->source, as, is_ratio(input.item) && sweep->ports == 2);
      if (const auto* sine = std::get_if<Measurement>(&input.given)) {
        for (const SourceRecord& record : sine->sources) {
          if (fine) fine = add(record.source, as, false);
        }
      }
      if (!fine) return fine;
    }
    return request_.ports ? add(request_.ports->source, "file of ports", false) : Result<void>{};
  }

  std::size_t add_shared(SharedError error) {
    all_.shared.push_back(std::move(error));
    return all_.shared.size() - 1;
  }
  void share_common(CouplingReading& reading, CouplingItem item) const {
    if (common_ && !is_ratio(item)) reading.shared.emplace_back(*common_, Complex(common_u_, 0));
  }

  Result<void> take_value(CouplingItem item, const CouplingValue& given) {
    const double size = std::fabs(given.value.value);
    const bool fine = is_ratio(item) ? size >= kLeastRatio && size <= 1 / kLeastRatio : size >= kLeastInductance && size <= kMostInductance;
    if (!fine) {
      return failure(Problem::bad_number, std::string(option_of(item)),
                     is_ratio(item) ? "no pair of windings has a voltage ratio below 1e-9 or above 1e9"
                                    : "no winding has an inductance below 1 fH or above 1 MH",
                     "look at the unit and its prefix: 100uH±1%");
    }
    CouplingTrace trace;
    trace.item = item;
    trace.source = in_words(item);
    CouplingReading reading;
    if (given.frequency_hz) {
      reading.omega = kTwoPi * *given.frequency_hz;
    } else if (request_.at_hz.size() == 1) {
      reading.omega = kTwoPi * request_.at_hz.front();
    } else if (request_.at_hz.size() > 1) {
      return failure(Problem::usage, std::string(option_of(item)),
                     "several frequencies are given with --at, and it is not said at which this value was read",
                     "write the value's own frequency behind it: 100uH±1%@10kHz");
    }
    const bool exact_bench = request_.propagation.exact_bench;
    const StatedValue& v = given.value;
    reading.size = v.value;
    const DefaultTolerance otherwise{coupling_defaults::kValueRatio * std::fabs(v.value), "±1 %"};
    const InputError error = input_error(trace.source, v, otherwise, request_.propagation);
    trace.law = error.law.kind;
    trace.basis = error.basis;
    reading.u_size = error.law.standard_uncertainty;
    if (!(reading.u_size > 0)) {
      // Least squares need a weight; a millionth is what no bench can do.
      reading.u_size = 1e-6 * std::fabs(v.value);
      trace.law = ErrorLaw::Kind::normal;
      if (v.law == Law::unstated && exact_bench) trace.basis = "not stated";
    }
    if (v.value < 0) all_.sign_shown = true;
    share_common(reading, item);
    trace.readings.push_back(std::move(reading));
    all_.traces.push_back(std::move(trace));
    return {};
  }

  /// The accuracy of a file's impedances: its own size and its own angle.
  void share_accuracy(CouplingTrace& trace, const std::optional<std::pair<std::size_t, std::size_t>>& own, double u) const {
    for (CouplingReading& reading : trace.readings) {
      if (own) {
        reading.shared.emplace_back(own->first, Complex(u, 0));
        reading.shared.emplace_back(own->second, Complex(0, u));
      }
      share_common(reading, trace.item);
    }
  }
  std::optional<std::pair<std::size_t, std::size_t>> own_accuracy(const std::string& file, double& u) {
    const std::optional<StatedValue>& stated = request_.bench.impedance.ratio;
    if (!stated && request_.propagation.exact_bench) return std::nullopt;
    const double half = stated ? stated->value : coupling_defaults::kSweepRatio;
    if (!(half > 0)) return std::nullopt;
    u = half / std::sqrt(3.0);
    const std::string basis = stated ? "stated" : "default: ±0.5 %";
    const std::size_t size = add_shared({"accuracy of " + file, ErrorLaw::Kind::rectangular, 'B', true, basis});
    const std::size_t angle = add_shared({"accuracy of " + file, ErrorLaw::Kind::rectangular, 'B', true, basis});
    return std::pair{size, angle};
  }

  CouplingTrace trace_of(CouplingItem item, Curve curve, const std::string& file) {
    CouplingTrace trace;
    trace.item = item;
    trace.source = "noise of " + std::string(in_words(item));
    trace.file = file;
    trace.kind = 'A';
    trace.basis = "data";
    trace.scatter = true;
    const auto [size, angle] = scatter_of(curve.z);
    const bool noisy = size > kNoisy || angle > kNoisy;
    std::vector<double> per_omega;
    for (std::size_t i = 0; i < curve.z.size(); ++i) per_omega.push_back(std::abs(curve.z[i]) / (is_ratio(item) ? 1 : curve.omega[i]));
    std::nth_element(per_omega.begin(), per_omega.begin() + static_cast<std::ptrdiff_t>(per_omega.size() / 2), per_omega.end());
    const double middle = per_omega[per_omega.size() / 2];
    for (std::size_t i = 0; i < curve.z.size(); ++i) {
      CouplingReading reading;
      reading.omega = curve.omega[i];
      reading.real = false;
      reading.z = curve.z[i];
      reading.u_size = size;
      reading.u_angle = angle;
      if (noisy) reading.reference = middle * (is_ratio(item) ? 1 : curve.omega[i]);
      trace.readings.push_back(std::move(reading));
    }
    return trace;
  }

  void add_source(const Sweep& sweep) {
    SourceRecord record;
    record.source = sweep.source;
    record.samples = sweep.frequency_hz.size();
    all_.sources.push_back(std::move(record));
    all_.findings.insert(all_.findings.end(), sweep.findings.begin(), sweep.findings.end());
  }

  static Result<void> empty_file(const Sweep& sweep) {
    return failure(Problem::too_few_samples, sweep.source.name, "no usable point was found in the file",
                   "check the export; points that the file marks as bad do not count");
  }

  Result<void> take_sweep(CouplingItem item, const Sweep& sweep) {
    const std::size_t needed = is_ratio(item) ? 2 : 1;
    if (sweep.ports != needed) {
      return failure(Problem::usage, sweep.source.name,
                     "the file has " + std::to_string(sweep.ports) + (sweep.ports == 1 ? " port, and " : " ports, and ") +
                         std::string(option_of(item)) + " takes " +
                         (needed == 1 ? "the impedance at one pair of terminals" : "a ratio from a two-port file"),
                     needed == 1 ? "give a two-port file as a word of its own: coilassay coupling pair.s2p"
                                 : "give the ratio as a number, a two-port file, or a capture of both voltages");
    }
    Curve curve;
    if (needed == 1) {
      curve = curve_of(sweep, 0, 0);
    } else {
      const bool forward = item == CouplingItem::ratio_forward;
      const Curve open = forward ? curve_of(sweep, 0, 0) : curve_of(sweep, 1, 1);
      const Curve across = forward ? curve_of(sweep, 1, 0) : curve_of(sweep, 0, 1);
      if (open.z.size() != across.z.size()) return empty_file(sweep);
      curve = across;
      for (std::size_t i = 0; i < curve.z.size(); ++i) curve.z[i] /= open.z[i];
      all_.sign_shown = true;
    }
    if (curve.z.empty()) return empty_file(sweep);
    add_source(sweep);
    CouplingTrace trace = trace_of(item, std::move(curve), sweep.source.name);
    double u = 0;
    const auto own = own_accuracy(shown(sweep.source.name, 60), u);
    share_accuracy(trace, own, u);
    all_.traces.push_back(std::move(trace));
    return {};
  }

  void take_ports(const Sweep& sweep) {
    add_source(sweep);
    // Of two ports the joint solution judges reciprocity itself, against the noise.
    if (sweep.ports == 2) std::erase_if(all_.findings, [](const Finding& f) { return f.code == "not_reciprocal"; });
    all_.sign_shown = true;
    const std::size_t a = request_.pair.first, b = request_.pair.second;
    struct Element {
      CouplingItem item;
      std::size_t row, column;
    };
    const std::string file = shown(sweep.source.name, 60);
    double u = 0;
    const bool scattering = sweep.as_read == "S";
    std::optional<std::pair<std::size_t, std::size_t>> own;
    std::vector<std::size_t> parts;
    if (!scattering) {
      own = own_accuracy(file, u);
    } else {
      parts = scattering_errors(sweep, file, u);
    }
    for (const Element& e : {Element{CouplingItem::primary_open, a, a}, Element{CouplingItem::secondary_open, b, b},
                             Element{CouplingItem::mutual_21, b, a}, Element{CouplingItem::mutual_12, a, b}}) {
      Curve curve = curve_of(sweep, e.row, e.column);
      if (curve.z.empty()) continue;
      CouplingTrace trace = trace_of(e.item, std::move(curve), sweep.source.name);
      share_accuracy(trace, own, u);
      if (!parts.empty()) share_scattering(trace, sweep, e.row, e.column, parts, u);
      all_.traces.push_back(std::move(trace));
    }
  }

  /// Errors of S11, S12, S21, S22 of the pair, constant over frequency, real and imaginary part of each.
  std::vector<std::size_t> scattering_errors(const Sweep& sweep, const std::string& file, double& u) {
    const std::optional<StatedValue>& stated = request_.bench.impedance.scattering;
    if ((!stated && request_.propagation.exact_bench) || sweep.ports < 2 || sweep.reference_ohm.size() < sweep.ports) return {};
    const double half = stated ? stated->value : coupling_defaults::kScattering;
    if (!(half > 0)) return {};
    u = half / std::sqrt(3.0);
    std::vector<std::size_t> parts;
    for (int i = 0; i < 8; ++i) {
      parts.push_back(add_shared({"scattering accuracy of " + file, ErrorLaw::Kind::rectangular, 'B', true,
                                  stated ? "stated" : "default: ±0.01 of S"}));
    }
    return parts;
  }

  /// With Z = r (1 + S)/(1 - S): dZ = (Z + r) dS (Z + r)/(2 r), for matrices and one reference resistance. Ports beyond the
  /// pair are taken as exact.
  void share_scattering(CouplingTrace& trace, const Sweep& sweep, std::size_t row, std::size_t column,
                        const std::vector<std::size_t>& parts, double u) const {
    const std::size_t pair[2] = {request_.pair.first, request_.pair.second};
    std::size_t at = 0;
    for (CouplingReading& reading : trace.readings) {
      while (at + 1 < sweep.frequency_hz.size() && kTwoPi * sweep.frequency_hz[at] < reading.omega * (1 - 1e-9)) ++at;
      const std::vector<Complex>& z = sweep.z_ohm[at];
      const auto with_reference = [&](std::size_t i, std::size_t j) {
        return z[i * sweep.ports + j] + (i == j ? sweep.reference_ohm[i] : 0.0);
      };
      for (std::size_t p = 0; p < 2; ++p) {
        for (std::size_t q = 0; q < 2; ++q) {
          const double reference = std::sqrt(sweep.reference_ohm[pair[p]] * sweep.reference_ohm[pair[q]]);
          const Complex effect = with_reference(row, pair[p]) * with_reference(pair[q], column) / (2 * reference) / reading.z * u;
          reading.shared.emplace_back(parts[(p * 2 + q) * 2], effect);
          reading.shared.emplace_back(parts[(p * 2 + q) * 2 + 1], Complex(0, 1) * effect);
        }
      }
    }
  }

  /// What a bench error does is the same for all captures taken on that bench.
  std::size_t bench_error(const BudgetLine& line) {
    for (std::size_t i = 0; i < all_.shared.size(); ++i) {
      if (all_.shared[i].source == line.source) return i;
    }
    return add_shared({line.source, ErrorLaw::Kind::normal, line.kind, true, line.basis});
  }

  void take_sine(CouplingItem item, const Measurement& sine) {
    all_.sources.insert(all_.sources.end(), sine.sources.begin(), sine.sources.end());
    const std::string file = sine.sources.empty() ? "" : sine.sources.front().source.name;
    for (Finding finding : sine.findings) {
      const bool about_coil = finding.code == "low_q" || finding.code == "resistance_unresolved" || finding.code == "skew_limited" ||
                              finding.code == "shunt_drop_included" || finding.code == "negative_resistance";
      if (about_coil || (is_ratio(item) && finding.code == "channels_suspect")) continue;   // of no meaning for a joint solution
      if (finding.severity == Severity::refusal) finding.message = std::string(in_words(item)) + ": " + finding.message;
      all_.findings.push_back(std::move(finding));
    }
    const Estimate* size = sine.find("Z");
    const Estimate* angle = sine.find("phi");
    if (size == nullptr || angle == nullptr || !sine.conditions.frequency_hz) return;
    CouplingTrace trace;
    trace.item = item;
    trace.source = in_words(item);
    trace.file = file;
    trace.kind = 'A';
    trace.basis = "data";
    CouplingReading reading;
    reading.real = false;
    reading.omega = kTwoPi * *sine.conditions.frequency_hz;
    reading.z = std::polar(size->quantity.value, angle->quantity.value);
    const double direction = is_ratio(item) ? -1 : 1;
    if (is_ratio(item)) {
      reading.z = 1.0 / reading.z;
      all_.sign_shown = true;
    }
    const auto split = [&](const char* symbol, double per, Complex unit, double& own) {
      double variance = 0;
      const auto lines = sine.budget.find(symbol);
      if (lines == sine.budget.end()) return;
      for (const BudgetLine& line : lines->second) {
        if (line.common) {
          reading.shared.emplace_back(bench_error(line), direction * line.u / per * unit);
        } else {
          variance += line.u * line.u / (per * per);
        }
      }
      own = std::fmax(std::sqrt(variance), kLeastCouplingNoise);
    };
    reading.u_size = reading.u_angle = kLeastCouplingNoise;
    split("Z", size->quantity.value, Complex(1, 0), reading.u_size);
    split("phi", 1, Complex(0, 1), reading.u_angle);
    share_common(reading, item);
    trace.readings.push_back(std::move(reading));
    all_.traces.push_back(std::move(trace));
    if (sine.conditions.level_v) all_.peak_v = std::fmax(std::isfinite(all_.peak_v) ? all_.peak_v : 0, *sine.conditions.level_v * std::sqrt(2.0));
    if (sine.conditions.level_a) all_.level_a = *sine.conditions.level_a;
  }

  const CouplingRequest& request_;
  CouplingReadings all_;
  std::optional<std::size_t> common_;
  double common_u_ = 0;
};

}  // namespace

Result<CouplingReadings> coupling_readings(const CouplingRequest& request) { return Collector(request).collect(); }

}  // namespace coilassay
