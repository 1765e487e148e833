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
constexpr double kLeastFall = 0.02;      // of the logarithm of the amplitude over the window
constexpr double kClearDecay = 2.5;      // standard uncertainties
constexpr double kCurvedRegion = 2;      // Q below: the region of (a, q) is far from an ellipse at moderate noise
constexpr double kHardlySampled = 3;   // samples a period: the fold could be on either side
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
    // The sheet may serve other captures of this bench: one without the current channel is no fault here.
    const auto found = find_channel(capture, *bench.current.column, "--current");
    if (found) current = *found;
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
             " samples a period: if the true frequency lies above half the sampling rate, this one and all that "
             "follows from it are wrong without limit; capture faster to be sure",
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
  result.decay.reset();
  result.findings.push_back({"drive_in_window", Severity::refusal,
                             "--from lies before the free decay, which starts at " +
                                 to_text(release, Unit::second, Script::utf8, 4) + ": leave it out, or move it there",
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
    result.own_samples = std::move(masked);
    result.samples = result.own_samples;
  }
  return decay;
}

/// Clipped crests of the decay: the window restarts after the last of them where enough of the decay is left; otherwise
/// the clipped samples alone are left out.
void leave_out_clipped(CaptureDecay& result, const std::vector<const Channel*>& channels, DecaySearch& search) {
  const Decay& decay = *result.decay;
  const double w = decay.fit.model.damped_omega();
  const double period = w > 0 ? 2 * std::numbers::pi / w : INFINITY;
  std::vector<FlatTop> tops;
  std::size_t clipped = 0;
  std::string name;
  for (const Channel* channel : channels) {
    for (const FlatTop& top : find_flat_tops(*channel, search.from.value_or(0), decay.end)) {
      // A level held longer than half a period is a drive, not a crest.
      if (static_cast<double>(top.end - top.first) > 0.55 * period) continue;
      clipped += top.end - top.first;
      tops.push_back(top);
      name = channel->name;
    }
  }
  if (clipped == 0) return;
  std::sort(tops.begin(), tops.end(), [](const FlatTop& a, const FlatTop& b) { return a.end < b.end; });
  for (const FlatTop& top : tops) result.release = std::min(result.release, top.first);
  const std::string what = std::to_string(clipped) + " samples of " + shown(name) + " are clipped";
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
                                 name, static_cast<double>(clipped), Unit::one});
      return;
    }
    result.decay = std::move(*rest);
  }
  result.findings.push_back(
      {"clipped", Severity::caution, what + how, name, static_cast<double>(clipped), Unit::one});
}

}  // namespace

double CaptureDecay::a() const { return model().a; }
double CaptureDecay::q() const { return model().q; }
const DampedSine& CaptureDecay::model() const { return structure.modes ? structure.modes->first : decay->fit.model; }
Eigen::MatrixXd CaptureDecay::covariance() const {
  const Fit& fit = structure.modes ? structure.modes->fit : decay->fit.fit;
  return fit.covariance.topLeftCorner(2, 2);
}

namespace {

/// Samples of the voltage over the coil, the channels they were made of and the step between their codes.
struct CoilVoltage {
  std::vector<const Channel*> channels;   // as captured; empty where no sample stands as it was captured
  std::string name;
  double resolution = std::nan("");
};

/// Fills the record's samples and time: the voltage column, less the low column where one is named.
Result<CoilVoltage> take_voltage(const Capture& capture, const RingDownRequest& request, CaptureDecay& result,
                                 std::size_t voltage) {
  const Channel& high = capture.channels[voltage];
  CoilVoltage coil{{&high}, high.name, high.resolution};
  Result<EvenRecord> record = on_even_steps(capture, voltage);
  if (!record) return failure(record);
  result.step_s = record->step_s;
  result.start_s = record->start_s;
  result.findings = capture.findings;
  for (Finding& finding : record->findings) {
    const bool known = std::any_of(result.findings.begin(), result.findings.end(),
                                   [&](const Finding& other) { return other.code == finding.code; });
    if (!known) result.findings.push_back(std::move(finding));
  }
  result.own_samples = std::move(record->samples);
  if (!result.own_samples.empty()) {
    coil.channels.clear();
    coil.resolution = std::nan("");
  }
  if (request.bench.voltage.low_column) {
    const Result<std::size_t> low = find_channel(capture, *request.bench.voltage.low_column, "--voltage-low");
    if (!low) return failure(low);
    Result<EvenRecord> other = on_even_steps(capture, *low);
    if (!other) return failure(other);
    const Channel& below = capture.channels[*low];
    const std::vector<double>& subtract = other->samples.empty() ? below.samples : other->samples;
    std::vector<double> difference = result.own_samples.empty() ? high.samples : std::move(result.own_samples);
    difference.resize(std::min(difference.size(), subtract.size()));
    for (std::size_t i = 0; i < difference.size(); ++i) difference[i] -= subtract[i];
    result.own_samples = std::move(difference);
    if (!coil.channels.empty()) {
      coil.channels.push_back(&below);
      coil.resolution = std::fmax(high.resolution, below.resolution);
    }
    coil.name += " - " + below.name;
  }
  result.samples = result.own_samples.empty() ? std::span<const double>(high.samples) : result.own_samples;
  if (request.bench.voltage.gain) result.gain = request.bench.voltage.gain->value;
  return coil;
}

Finding why_not(const Error& error, const std::string& name, std::size_t samples) {
  if (error.problem == Problem::too_few_samples) {
    return {"too_few_samples", Severity::refusal, shown(name) + ": " + error.finding + "; " + error.remedy, name,
            static_cast<double>(samples), Unit::one};
  }
  return {"no_ringing", Severity::refusal,
          "no ringing stands out of the noise in " + shown(name) +
              ": check the trigger, the range, the capacitor and that the coil was released",
          name, 0, Unit::one};
}

/// Near critical damping: the region of (a, q) itself. Where it is open the natural frequency has only a lower limit, and
/// the decay is given up with a refusal that says so.
void take_contour(CaptureDecay& result, std::span<const double> window) {
  DecayContour contour = decay_contour(window, result.decay->fit);
  if (!contour.open) {
    result.contour = std::move(contour.points);
    return;
  }
  double least = INFINITY;
  for (const DecayPoint& point : contour.points) {
    const double omega = std::sqrt(std::fmax(point.a * point.a + point.q, 0)) / result.step_s;
    least = std::fmin(least, omega / (2 * std::numbers::pi));
  }
  result.decay.reset();
  result.findings.push_back({"near_critical", Severity::refusal,
                             "the record shows one falling exponential: the circuit is damped beyond swinging and its "
                             "natural frequency is only known to be above " +
                                 to_text(least, Unit::hertz, Script::utf8, 2) +
                                 "; use a smaller capacitor, take away what damps the coil, or capture with less noise",
                             "f_0", least, Unit::hertz});
}

/// A sine whose amplitude does not fall is driven: its frequency is the generator's, not the coil's.
bool refuse_steady(CaptureDecay& result, const std::string& channel) {
  const double length = static_cast<double>(result.decay->end - result.decay->first);
  const double u = std::sqrt(std::fmax(result.covariance()(0, 0), 0)) + result.structure.spread_a;
  const double cycles = result.model().damped_omega() * length / (2 * std::numbers::pi);
  const double fall = result.a() * length;
  if (cycles < kFewCycles || (fall > kLeastFall && result.a() > kClearDecay * u)) return false;
  const bool hidden = (result.a() + 3 * u) * length > 0.1;
  result.decay.reset();
  if (hidden) {
    result.findings.push_back({"no_ringing", Severity::refusal,
                               "something swings in " + shown(channel) +
                                   ", but whether it dies away is lost in the noise: average captures, use a finer range or a "
                                   "longer record",
                               channel, fall, Unit::one});
    return true;
  }
  result.findings.push_back({"drive_in_window", Severity::refusal,
                             "the amplitude in " + shown(channel) + (fall < 0 ? " grows" : " does not fall") +
                                 " over the window: this is a driven sine, not a free decay, and its frequency says nothing "
                                 "about the coil. Release the coil and capture what follows, for at least a tenth of its decay",
                             channel, fall, Unit::one});
  return true;
}

}  // namespace

Result<CaptureDecay> decay_of_capture(const Capture& capture, const RingDownRequest& request) {
  const Result<std::size_t> voltage = voltage_channel(capture, request.bench);
  if (!voltage) return failure(voltage);
  CaptureDecay result;
  const Result<CoilVoltage> coil = take_voltage(capture, request, result, *voltage);
  if (!coil) return failure(coil);

  DecaySearch search;
  search.resolution = coil->resolution;
  if (!coil->channels.empty() && !request.bench.voltage.low_column) search.drive = drive_channel(capture, *voltage);
  search.from = sample_at(request.from_s, result);
  search.to = sample_at(request.to_s, result);
  Result<Decay> decay = find_decay(result.samples, search);
  if (!decay) {
    result.findings.push_back(why_not(decay.error(), coil->name, result.samples.size()));
    return result;
  }
  result.decay = std::move(*decay);
  result.release = result.decay->first - std::min(result.decay->skipped, result.decay->first);
  leave_out_clipped(result, coil->channels, search);
  if (!result.decay) return result;

  const auto window = result.samples.subspan(result.decay->first, result.decay->end - result.decay->first);
  result.structure = look_at_structure(window, *result.decay, search.resolution, result.step_s);
  for (const Finding& finding : result.structure.findings) result.findings.push_back(finding);
  for (const Channel* channel : coil->channels) {
    for (Finding& finding : check_range(*channel, result.decay->first, result.decay->end)) {
      result.findings.push_back(std::move(finding));
    }
  }
  if (!result.structure.modes && result.decay->fit.model.quality() < kCurvedRegion) {
    take_contour(result, window);
    if (!result.decay) return result;
  }
  note_drive(result, coil->name, search.from.has_value());
  if (request.from_s) warn_of_drive(result, search, coil->name);
  if (!result.decay) return result;
  if (refuse_steady(result, coil->name)) return result;
  note_sampling(result, coil->name);
  return result;
}

}  // namespace coilassay
