#include "analysis/ring_down_decay.h"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/capture_checks.h"
#include "analysis/even_steps.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr double kFewCycles = 3;
constexpr double kCurvedRegion = 2;      // Q below: the region of (a, q) is far from an ellipse at moderate noise
constexpr double kHardlySampled = 2.2;   // samples a period: the fold could be on either side
constexpr double kThinlySampled = 5;

Result<std::size_t> voltage_channel(const Capture& capture, const BenchSetup& bench) {
  if (bench.voltage.column) return find_channel(capture, *bench.voltage.column, "--voltage");
  if (capture.channels.empty()) {
    return failure(Problem::not_a_capture, capture.source.name, "the file holds no channel",
                   "check that the export has a column of samples");
  }
  // The first channel in volts that the sheet has not given to the current.
  std::optional<std::size_t> current;
  if (bench.current.column) {
    const auto found = find_channel(capture, *bench.current.column, "--current");
    if (!found) return failure(found);
    current = *found;
  }
  for (const bool volts_only : {true, false}) {
    for (std::size_t i = 0; i < capture.channels.size(); ++i) {
      if (current == i) continue;
      if (volts_only && capture.channels[i].unit != Unit::volt) continue;
      return i;
    }
  }
  return failure(Problem::missing_column, capture.source.name, "the only channel is the current",
                 "name the voltage column with --voltage");
}

/// A second channel whose samples may show the drive.
std::span<const double> drive_channel(const Capture& capture, std::size_t voltage) {
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (i != voltage && capture.channels[i].samples.size() == capture.channels[voltage].samples.size()) {
      return capture.channels[i].samples;
    }
  }
  return {};
}

void note_sampling(CaptureDecay& result, const std::string& channel) {
  const Decay& decay = *result.decay;
  const double w = decay.fit.model.damped_omega();
  if (!(w > 0)) return;
  const double per_period = 2 * std::numbers::pi / w;
  const double cycles = static_cast<double>(decay.end - decay.first) / per_period;
  if (cycles < kFewCycles) {
    result.findings.push_back({"few_cycles", Severity::note,
                               "the window holds " + to_text(cycles, Unit::one, Script::utf8, 2) +
                                   " periods: the interval allows for it, a longer record would narrow it",
                               channel, cycles, Unit::one});
  }
  if (per_period < kThinlySampled) {
    const bool hardly = per_period < kHardlySampled;
    result.findings.push_back(
        {"aliased", hardly ? Severity::caution : Severity::note,
         "only " + to_text(per_period, Unit::one, Script::utf8, 2) +
             " samples a period: the true frequency may be above half the sampling rate; capture faster to be sure",
         channel, per_period, Unit::one});
  }
}

void note_drive(CaptureDecay& result, const std::string& channel, bool stated_start) {
  const Decay& decay = *result.decay;
  const double at = result.start_s + static_cast<double>(decay.first) * result.step_s;
  if (decay.retriggered) {
    const double end = result.start_s + static_cast<double>(decay.end) * result.step_s;
    result.findings.push_back({"drive_in_window", Severity::caution,
                               "a second burst begins in the record; the window ends before it at " +
                                   to_text(end, Unit::second, Script::utf8, 4),
                               channel, end, Unit::second});
  } else if (decay.drive_before && !stated_start) {
    result.findings.push_back({"drive_in_window", Severity::note,
                               "the record holds the drive up to " + to_text(at, Unit::second, Script::utf8, 4) +
                                   "; the window begins after it",
                               channel, at, Unit::second});
  }
}

/// With a stated start: does the stretch after it look driven, so that a later start describes it far better?
void warn_of_drive(CaptureDecay& result, const DecaySearch& search, const std::string& channel) {
  if (result.decay->residuals.chance > 1e-6 && result.decay->residuals.early_z < 8) return;
  DecaySearch free_start = search;
  free_start.from.reset();
  const Result<Decay> found = find_decay(result.samples, free_start);
  if (!found || found->first <= result.decay->first || found->residuals.chance < 1e-6) return;
  const double release = result.start_s + static_cast<double>(found->first) * result.step_s;
  result.findings.push_back({"drive_in_window", Severity::caution,
                             "the stated window begins before the free decay, which starts at " +
                                 to_text(release, Unit::second, Script::utf8, 4) +
                                 ": leave out --from, or move it there",
                             channel, release, Unit::second});
}

std::optional<std::size_t> sample_at(std::optional<double> time_s, const CaptureDecay& result) {
  if (!time_s) return std::nullopt;
  const double n = std::ceil((*time_s - result.start_s) / result.step_s - 1e-6);
  return static_cast<std::size_t>(std::clamp(n, 0.0, static_cast<double>(result.samples.size())));
}

/// Decay with its clipped samples taken for missing: for records in which the clipping lasts nearly to the end.
Result<Decay> without_clipped(CaptureDecay& result, const std::vector<FlatTop>& tops, DecaySearch search) {
  std::vector<double> masked(result.samples.begin(), result.samples.end());
  for (const FlatTop& top : tops) {
    // One sample more on either side: it may be half cut.
    const std::size_t first = top.first > 0 ? top.first - 1 : 0;
    const std::size_t end = std::min(top.end + 1, masked.size());
    std::fill(masked.begin() + static_cast<std::ptrdiff_t>(first), masked.begin() + static_cast<std::ptrdiff_t>(end),
              std::nan(""));
  }
  search.from = std::max(search.from.value_or(0), result.decay->first);
  search.near_omega = result.decay->fit.model.damped_omega();
  Result<Decay> decay = find_decay(masked, search);
  if (decay) {
    result.resampled = std::move(masked);
    result.samples = result.resampled;
  }
  return decay;
}

/// Clipped crests of the decay: the window restarts after the last of them where enough of the decay is left; otherwise
/// the clipped samples alone are left out.
void leave_out_clipped(CaptureDecay& result, const Channel& channel, DecaySearch& search) {
  const Decay& decay = *result.decay;
  const double w = decay.fit.model.damped_omega();
  const double period = w > 0 ? 2 * std::numbers::pi / w : INFINITY;
  std::vector<FlatTop> tops;
  std::size_t clipped = 0;
  for (const FlatTop& top : find_flat_tops(channel, search.from.value_or(0), decay.end)) {
    // A level held longer than half a period is a drive, not a crest.
    if (static_cast<double>(top.end - top.first) > 0.55 * period) continue;
    clipped += top.end - top.first;
    tops.push_back(top);
  }
  if (clipped == 0) return;
  const std::string what = std::to_string(clipped) + " samples of " + shown(channel.name) + " are clipped";
  std::string how = "; the window begins after the last of them. A coarser range keeps the whole decay";
  const std::size_t last = tops.back().end;
  if (last > decay.first) {
    const bool enough = static_cast<double>(decay.end - last) > 10 * period && decay.end - last > (decay.end - decay.first) / 2;
    DecaySearch later = search;
    later.from = last;
    Result<Decay> rest = enough ? find_decay(result.samples, later) : without_clipped(result, tops, search);
    if (!enough) how = "; they are left out of the fit. A coarser range keeps the whole decay";
    if (!rest) {
      result.decay.reset();
      result.findings.push_back({"clipped", Severity::refusal,
                                 what + " and what is left without them does not ring: capture again at a coarser range",
                                 channel.name, static_cast<double>(clipped), Unit::one});
      return;
    }
    result.decay = std::move(*rest);
  }
  result.findings.push_back(
      {"clipped", Severity::caution, what + how, channel.name, static_cast<double>(clipped), Unit::one});
}

}  // namespace

double CaptureDecay::a() const { return model().a; }
double CaptureDecay::q() const { return model().q; }
const DampedSine& CaptureDecay::model() const { return structure.modes ? structure.modes->first : decay->fit.model; }
Eigen::MatrixXd CaptureDecay::covariance() const {
  const Fit& fit = structure.modes ? structure.modes->fit : decay->fit.fit;
  return fit.covariance.topLeftCorner(2, 2);
}

Result<CaptureDecay> decay_of_capture(const Capture& capture, const RingDownRequest& request) {
  const Result<std::size_t> voltage = voltage_channel(capture, request.bench);
  if (!voltage) return failure(voltage);
  Result<EvenRecord> record = on_even_steps(capture, *voltage);
  if (!record) return failure(record);

  CaptureDecay result;
  const Channel& channel = capture.channels[*voltage];
  result.step_s = record->step_s;
  result.start_s = record->start_s;
  result.findings = capture.findings;
  for (Finding& finding : record->findings) {
    const bool known = std::any_of(result.findings.begin(), result.findings.end(),
                                   [&](const Finding& other) { return other.code == finding.code; });
    if (!known) result.findings.push_back(std::move(finding));
  }
  result.resampled = std::move(record->samples);
  result.samples = result.resampled.empty() ? std::span<const double>(channel.samples) : result.resampled;
  if (request.bench.voltage.gain) result.gain = request.bench.voltage.gain->value;

  DecaySearch search;
  search.resolution = result.resampled.empty() ? channel.resolution : std::nan("");
  if (result.resampled.empty()) search.drive = drive_channel(capture, *voltage);
  search.from = sample_at(request.from_s, result);
  search.to = sample_at(request.to_s, result);

  const auto refuse = [&](const std::string& code, const std::string& message, double figure) {
    result.findings.push_back({code, Severity::refusal, message, channel.name, figure, Unit::one});
  };
  Result<Decay> decay = find_decay(result.samples, search);
  if (!decay) {
    switch (decay.error().problem) {
      case Problem::too_few_samples:
        refuse("too_few_samples", shown(channel.name) + ": " + decay.error().finding + "; " + decay.error().remedy,
               static_cast<double>(result.samples.size()));
        break;
      default:
        refuse("no_ringing",
               "no ringing stands out of the noise in " + shown(channel.name) +
                   ": check the trigger, the range, the capacitor and that the coil was released",
               0);
    }
    return result;
  }
  result.decay = std::move(*decay);
  if (result.resampled.empty()) leave_out_clipped(result, channel, search);
  if (!result.decay) return result;

  const auto window = result.samples.subspan(result.decay->first, result.decay->end - result.decay->first);
  result.structure = look_at_structure(window, *result.decay, search.resolution, result.step_s);
  for (const Finding& finding : result.structure.findings) result.findings.push_back(finding);
  for (Finding& finding : check_range(channel, result.decay->first, result.decay->end)) {
    result.findings.push_back(std::move(finding));
  }
  if (!result.structure.modes && result.decay->fit.model.quality() < kCurvedRegion) {
    DecayContour contour = decay_contour(window, result.decay->fit);
    if (contour.open) {
      double least = INFINITY;
      for (const DecayPoint& point : contour.points) {
        least = std::fmin(least, std::sqrt(std::fmax(point.a * point.a + point.q, 0)) / (2 * std::numbers::pi * result.step_s));
      }
      result.decay.reset();
      result.findings.push_back({"near_critical", Severity::refusal,
                                 "the record shows one falling exponential: the circuit is damped beyond swinging and its "
                                 "natural frequency is only known to be above " +
                                     to_text(least, Unit::hertz, Script::utf8, 2) +
                                     "; use a larger capacitor, less damping across the coil or a quieter capture",
                                 "f_0", least, Unit::hertz});
      return result;
    }
    result.contour = std::move(contour.points);
  }
  note_sampling(result, channel.name);
  note_drive(result, channel.name, search.from.has_value());
  if (search.from) warn_of_drive(result, search, channel.name);
  return result;
}

}  // namespace coilassay
