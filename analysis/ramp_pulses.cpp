#include "analysis/ramp_pulses.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "base/number_text.h"
#include "base/outside_text.h"
#include "fitting/statistics.h"

namespace coilassay {

namespace {

constexpr std::size_t kLeastRise = 100;      // samples of a rise
constexpr std::size_t kLeastQuiet = 6;       // samples that show a zero line
constexpr double kRegion = 0.25;             // of the peak current: certainly inside a pulse
constexpr double kDriveOn = 0.3;             // of the drive's voltage
constexpr double kReturned = 0.02;           // of the peak current: back at zero
constexpr double kJump = 0.01;               // of the record: a current that rises faster than this jumps
constexpr double kClippedShare = 0.02;       // of the drive's samples at the end of the range

/// Noise of single samples by the median of second differences.
double sample_noise(const std::vector<double>& v) {
  std::vector<double> second;
  const std::size_t stride = v.size() / 8192 + 1;
  for (std::size_t i = 1; i + 1 < v.size(); i += stride) {
    const double d = v[i - 1] - 2 * v[i] + v[i + 1];
    if (!std::isnan(d)) second.push_back(std::fabs(d));
  }
  return second.empty() ? 0 : median(second) / 0.6745 / std::sqrt(6.0);
}

/// Centred means over `width` samples: only to find things by.
std::vector<double> smoothed(const std::vector<double>& v, std::size_t width) {
  if (width < 2) return v;
  std::vector<double> sum(v.size() + 1, 0.0), out(v.size());
  for (std::size_t i = 0; i < v.size(); ++i) sum[i + 1] = sum[i] + v[i];
  for (std::size_t i = 0; i < v.size(); ++i) {
    const std::size_t a = i >= width / 2 ? i - width / 2 : 0, b = std::min(v.size(), i + width / 2 + 1);
    out[i] = (sum[b] - sum[a]) / static_cast<double>(b - a);
  }
  return out;
}

/// Missing samples by straight lines: flux needs every sample.
void bridge(std::vector<double>& v) {
  std::size_t last = v.size();
  for (std::size_t i = 0; i < v.size(); ++i) {
    if (std::isnan(v[i])) continue;
    if (last < i && i - last > 1) {
      for (std::size_t k = last + 1; k < i; ++k) {
        v[k] = v[last] + (v[i] - v[last]) * static_cast<double>(k - last) / static_cast<double>(i - last);
      }
    } else if (last == v.size()) {
      std::fill(v.begin(), v.begin() + static_cast<std::ptrdiff_t>(i), v[i]);
    }
    last = i;
  }
  for (std::size_t k = last + 1; last < v.size() && k < v.size(); ++k) v[k] = v[last];
}

struct ZeroLine {
  double value, u;
};
/// Mean of a quiet stretch. Noise that does not dither the converter leaves part of a step open.
ZeroLine zero_line(const std::vector<double>& v, std::size_t end, double noise, double resolution) {
  const double mean = summarise(std::span(v).first(end)).mean;
  double u = noise / std::sqrt(static_cast<double>(end));
  if (resolution > 0) {
    const double ratio = noise / resolution;
    const double amplitude = std::min(0.5, std::exp(-2 * std::numbers::pi * std::numbers::pi * ratio * ratio)) * resolution;
    u = std::hypot(u, amplitude / std::sqrt(3.0));
  }
  return {mean, u};
}

Finding refusal(const char* code, std::string message, std::string about, double figure, Unit unit) {
  return {code, Severity::refusal, std::move(message), std::move(about), figure, unit};
}

double largest(const std::vector<double>& v, std::size_t first, std::size_t end) {
  double most = 0;
  for (std::size_t i = first; i < end; ++i) most = std::fmax(most, std::fabs(v[i]));
  return most;
}

/// Share of the samples of [first, end) of a channel that stand at the end of its range.
double share_at_end_of_range(const Channel& channel, std::size_t first, std::size_t end) {
  if (!(channel.full_scale > 0) || !(channel.resolution > 0)) return 0;
  std::size_t count = 0;
  for (std::size_t i = first; i < std::min(end, channel.samples.size()); ++i) {
    const double v = channel.samples[i];
    count += v >= channel.full_scale - 1.01 * channel.resolution || v <= -channel.full_scale ? 1U : 0U;
  }
  return end > first ? static_cast<double>(count) / static_cast<double>(end - first) : 0;
}

class Finder {
 public:
  Finder(const Capture& capture, const DrivenRecord& record, RampLayout& layout)
      : capture_(capture), record_(record), out_(layout) {}

  void run() {
    take_zero_lines();
    if (!make_positive()) return;
    const std::size_t width = std::max<std::size_t>(out_.amps.size() / 2000, 1);
    width_ = static_cast<double>(width);
    slow_amps_ = smoothed(out_.amps, 2 * width + 1);
    slow_volts_ = smoothed(out_.volts, 2 * width + 1);
    out_.peak_a = largest(slow_amps_, 0, slow_amps_.size());
    if (looks_swapped()) return;
    std::size_t at = 0;
    while (at < slow_amps_.size()) {
      while (at < slow_amps_.size() && slow_amps_[at] < kRegion * out_.peak_a) ++at;
      if (at >= slow_amps_.size()) break;
      std::size_t region_end = at;
      while (region_end < slow_amps_.size() && slow_amps_[region_end] >= 0.6 * kRegion * out_.peak_a) ++region_end;
      add_pulse(at, region_end);
      at = std::max(region_end, out_.pulses.empty() ? region_end : out_.pulses.back().end);
    }
    if (out_.refused()) return;
    if (out_.pulses.empty()) {
      refuse("no_ramp",
             "the current reaches " + to_text(out_.peak_a, Unit::ampere, Script::utf8, 3) +
                 ", but no stretch of at least 100 samples holds a rise under a steady drive: capture the rise with more samples",
             out_.peak_a, Unit::ampere);
    }
  }

 private:
  void refuse(const char* code, std::string message, double figure, Unit unit) {
    out_.findings.push_back(refusal(code, std::move(message), shown(record_.amp_name), figure, unit));
  }

  void take_zero_lines() {
    const std::vector<double>& v = out_.volts;
    const std::size_t n = v.size();
    out_.volt_noise = sample_noise(v);
    out_.amp_noise = sample_noise(out_.amps);
    const std::size_t first = std::clamp<std::size_t>(n / 200, 3, 50);
    const double begin = median(std::span(v).first(std::min(first, n)));
    double span = 0;
    for (double x : v) span = std::fmax(span, std::fabs(x - begin));
    const double begin_a = median(std::span(out_.amps).first(std::min(first, n)));
    double span_a = 0;
    for (double x : out_.amps) span_a = std::fmax(span_a, std::fabs(x - begin_a));
    // Quiet as long as both stay near where they began.
    std::size_t quiet = 0;
    while (quiet < n && std::fabs(v[quiet] - begin) < 0.1 * span + 4 * out_.volt_noise &&
           std::fabs(out_.amps[quiet] - begin_a) < 0.1 * span_a + 4 * out_.amp_noise) {
      ++quiet;
    }
    if (quiet == n) return;
    const bool in_drive = std::fabs(begin) > 0.5 * largest(v, 0, n);
    // The last samples before the edge belong to the edge where a scope filters, or the channels are skewed.
    const std::size_t end = quiet - std::min(quiet, quiet / 20 + 1);
    if (in_drive || end < kLeastQuiet) return;
    const ZeroLine volt = zero_line(v, end, out_.volt_noise, record_.volt_resolution);
    const ZeroLine amp = zero_line(out_.amps, end, out_.amp_noise, record_.amp_resolution);
    out_.zero_known = true;
    out_.volt_zero = volt.value;
    out_.volt_zero_u = volt.u;
    out_.amp_zero = amp.value;
    out_.amp_zero_u = amp.u;
    for (double& x : out_.volts) x -= volt.value;
    for (double& x : out_.amps) x -= amp.value;
  }

  /// Both channels positive during the rise; false after a refusal.
  bool make_positive() {
    const std::vector<double> slow = smoothed(out_.amps, out_.amps.size() / 200 + 1);
    std::size_t peak = 0;
    for (std::size_t i = 0; i < slow.size(); ++i) {
      if (std::fabs(slow[i]) > std::fabs(slow[peak])) peak = i;
    }
    const double reach = std::fabs(slow[peak]);
    const double seen = out_.amp_noise + (record_.amp_resolution > 0 ? record_.amp_resolution : 0);
    if (!(reach > 2 * seen) || peak == 0) {
      refuse("no_ramp",
             "the current never rises: it stays within " + to_text(std::fmax(reach, seen), Unit::ampere, Script::utf8, 2) +
                 "; check that the drive is on, the coil is in the circuit and the current channel is the right one",
             reach, Unit::ampere);
      return false;
    }
    double flux = 0;
    for (std::size_t i = 0; i <= peak; ++i) flux += out_.volts[i];
    const double amp_sign = slow[peak] < 0 ? -1 : 1, volt_sign = flux < 0 ? -1 : 1;
    if (amp_sign != volt_sign) {
      out_.findings.push_back({"scale_suspect", Severity::note,
                               "voltage and current have opposite signs while the current rises: one of the channels is "
                               "reversed; the current was taken the other way round",
                               shown(record_.amp_name), -1, Unit::one});
    }
    for (double& x : out_.volts) x *= volt_sign;
    for (double& x : out_.amps) x *= amp_sign;
    out_.volt_zero *= volt_sign;
    out_.amp_zero *= amp_sign;
    return true;
  }

  void add_pulse(std::size_t inside, std::size_t region_end) {
    const std::size_t before = out_.pulses.empty() ? 0 : out_.pulses.back().end;
    std::size_t top = inside;
    for (std::size_t i = inside; i < region_end; ++i) {
      if (slow_amps_[i] > slow_amps_[top]) top = i;
    }
    RampPulse pulse;
    pulse.drive_v = median(std::span(out_.volts).subspan(inside, std::max<std::size_t>(top - inside, 1)));
    std::size_t start = inside;
    while (start > before && out_.volts[start - 1] > kDriveOn * pulse.drive_v) --start;
    // The voltage over the rise, its first quarter included.
    if (top > start) pulse.drive_v = median(std::span(out_.volts).subspan(start, top - start));
    if (!(pulse.drive_v > 3 * out_.volt_noise)) return;
    const double noticeable = std::fmax(4 * out_.volt_noise, 0.02 * pulse.drive_v);
    while (start > before && out_.volts[start - 1] > noticeable) --start;
    std::size_t peak = inside;
    while (peak < out_.volts.size() && slow_volts_[peak] > 0.2 * pulse.drive_v) ++peak;
    // Back from the smoothed edge to the last sample under full drive.
    while (peak > inside && peak > 0 && out_.volts[peak - 1] < 0.5 * (slow_volts_[inside] > 0 ? pulse.drive_v : 0)) --peak;
    std::size_t end = peak;
    while (end < out_.amps.size() && slow_amps_[end] > kReturned * out_.peak_a) ++end;
    pulse.returns = peak < out_.amps.size() && end < out_.amps.size();
    // What little is left falls on; the flux of a closed pulse counts all of it.
    const double nothing = std::fmax(0.002 * out_.peak_a, 2 * out_.amp_noise / std::sqrt(2.0 * width_ + 1));
    while (end < out_.amps.size() && slow_amps_[end] > nothing && slow_volts_[end] < kDriveOn * pulse.drive_v) ++end;
    if (pulse.returns && end > peak) {
      // A lossy core carries eddy currents the other way: it is at rest when the diode's voltage is gone.
      const double fall_v = median(std::span(out_.volts).subspan(peak, end - peak));
      while (end < out_.volts.size() && slow_volts_[end] < 0.3 * fall_v) ++end;
    }
    const std::size_t after_peak = pulse.returns ? end : peak;
    pulse.start = start;
    pulse.peak = peak;
    pulse.end = after_peak;
    if (peak < start + kLeastRise) return;
    note_plateau(pulse, region_end);
    cut_clipped(pulse);
    if (out_.refused() || pulse.peak < pulse.start + kLeastRise) return;
    for (std::size_t i = start > before + 2 ? start - 2 : before; i < std::min(start + 2, out_.volts.size() - 1); ++i) {
      pulse.edge_v = std::fmax(pulse.edge_v, std::fabs(out_.volts[i + 1] - out_.volts[i]));
    }
    const std::size_t look = std::min<std::size_t>(start - before, std::max<std::size_t>(start / 10, 8));
    if (look >= 4) {
      pulse.start_a = summarise(std::span(out_.amps).subspan(start - look, look - 1)).mean;
      pulse.start_u_a = out_.amp_noise / std::sqrt(static_cast<double>(look - 1));
    }
    out_.pulses.push_back(pulse);
  }

  /// A coil's current cannot jump, and the voltage of a drive does not creep up.
  bool looks_swapped() {
    const auto rise = [](const std::vector<double>& v) {
      const double most = largest(v, 0, v.size());
      std::size_t low = 0;
      while (low + 1 < v.size() && v[low] < 0.1 * most) ++low;
      std::size_t high = low;
      while (high + 1 < v.size() && v[high] < 0.8 * most) ++high;
      return static_cast<double>(high - low) / static_cast<double>(v.size());
    };
    const double of_current = rise(slow_amps_), of_voltage = rise(slow_volts_);
    if (of_current > kJump || of_voltage < 10 * of_current + kJump) return false;
    refuse("scale_suspect",
           "the current jumps to its height within " + to_percent_text(of_current) +
               " of the record while the voltage creeps up: the channels look swapped; exchange --voltage and --current",
           of_current, Unit::one);
    return true;
  }

  void note_plateau(RampPulse& pulse, std::size_t region_end) const {
    // After a drive that the switch ends by itself the current stands, with no voltage left over the coil.
    std::size_t stands = pulse.peak;
    const double level = slow_amps_[std::min(pulse.peak, slow_amps_.size() - 1)];
    while (stands < region_end && slow_amps_[stands] > 0.97 * level && slow_volts_[stands] > -0.02 * pulse.drive_v) ++stands;
    pulse.plateau = static_cast<double>(stands - pulse.peak) > 0.1 * static_cast<double>(pulse.peak - pulse.start);
  }

  void cut_clipped(RampPulse& pulse) {
    const Channel& voltage = capture_.channels[record_.columns.voltage];
    const Channel& current = capture_.channels[record_.columns.current];
    const double clipped_volts = share_at_end_of_range(voltage, out_.first + pulse.start, out_.first + pulse.peak);
    if (clipped_volts > kClippedShare) {
      out_.findings.push_back(refusal("clipped",
                                      shown(voltage.name) + " stands at the end of its range for " +
                                          to_percent_text(clipped_volts) +
                                          " of the drive: the flux cannot be known; use a larger range",
                                      shown(voltage.name), clipped_volts, Unit::one));
      return;
    }
    const std::vector<double>& i = out_.amps;
    const double most = *std::max_element(i.begin() + static_cast<std::ptrdiff_t>(pulse.start),
                                          i.begin() + static_cast<std::ptrdiff_t>(pulse.peak));
    const double step = record_.amp_resolution > 0 ? record_.amp_resolution : 1e-6 * most;
    const auto reaches = [&](double level) {
      std::size_t k = pulse.start;
      while (k < pulse.peak && i[k] < level) ++k;
      return k;
    };
    const std::size_t top = reaches(most - 0.5 * step), near = reaches(most - 4.5 * step);
    const std::size_t rest = pulse.peak - top;
    std::size_t equal = 0;
    for (std::size_t k = top; k < pulse.peak; ++k) equal += i[k] > most - 0.5 * step ? 1U : 0U;
    const bool stands = rest > 8 && rest > top - near && 10 * equal > 9 * rest;
    const bool at_end = share_at_end_of_range(current, out_.first + pulse.start, out_.first + pulse.peak) > kClippedShare / 4;
    if (!stands && !at_end) return;
    pulse.clipped = true;
    // Noise reaches the top before the level does.
    const double margin = 4 * out_.amp_noise + step;
    pulse.peak = reaches(most - margin);
    pulse.end = pulse.peak;
    pulse.returns = false;
    if (pulse.peak < pulse.start + kLeastRise) {
      refuse("clipped", "the current stands at the end of its range throughout: use a larger range", most, Unit::ampere);
      return;
    }
    out_.findings.push_back({"clipped", Severity::caution,
                             "the current channel ends at " + to_text(most, Unit::ampere, Script::utf8, 3) +
                                 ": what is above is lost, the curve stops there; use a larger range",
                             shown(record_.amp_name), most, Unit::ampere});
  }

  const Capture& capture_;
  const DrivenRecord& record_;
  RampLayout& out_;
  std::vector<double> slow_amps_, slow_volts_;
  double width_ = 1;   // half, of the smoothing
};

}  // namespace

bool RampLayout::refused() const {
  return std::any_of(findings.begin(), findings.end(), [](const Finding& f) { return f.severity == Severity::refusal; });
}

RampLayout find_ramps(const Capture& capture, const DrivenRecord& record, std::optional<double> from_s,
                      std::optional<double> to_s) {
  RampLayout layout;
  layout.step_s = record.step_s;
  const auto index = [&](double t) {
    return static_cast<std::size_t>(std::clamp((t - record.start_s) / record.step_s, 0.0, static_cast<double>(record.amps.size())));
  };
  const std::size_t first = from_s ? index(*from_s) : 0, end = to_s ? std::max(index(*to_s), first) : record.amps.size();
  layout.first = first;
  layout.start_s = record.start_s + static_cast<double>(first) * record.step_s;
  const auto at = [](const std::vector<double>& v, std::size_t i) { return v.begin() + static_cast<std::ptrdiff_t>(i); };
  layout.volts.assign(at(record.volts, first), at(record.volts, end));
  layout.amps.assign(at(record.amps, first), at(record.amps, end));
  bridge(layout.volts);
  bridge(layout.amps);
  if (layout.amps.size() < 2 * kLeastRise || std::isnan(layout.amps.front()) || std::isnan(layout.volts.front())) {
    layout.findings.push_back(refusal("no_ramp",
                                      std::to_string(layout.amps.size()) +
                                          " samples are too few to fit a curve to: a ramp needs at least 200",
                                      "", static_cast<double>(layout.amps.size()), Unit::one));
    return layout;
  }
  Finder(capture, record, layout).run();
  return layout;
}

}  // namespace coilassay
