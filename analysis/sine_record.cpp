#include "analysis/sine_record.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <utility>

#include "analysis/capture_checks.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr double kTwoPi = 2 * std::numbers::pi;
constexpr double kFewCycles = 3;
constexpr double kHardlySampled = 2.2;      // samples a period: the fold could be on either side
constexpr double kThinlySampled = 5;
constexpr double kMostClipped = 0.4;        // of the samples: beyond, no crest is left to judge the shape by
constexpr double kApartInSigma = 8;         // frequencies of the channels
constexpr double kApartInBins = 0.05;
constexpr double kNotSteady = 3;            // scatter in the band of the sine over that of single samples
constexpr double kLeastSnr = 5;             // amplitude over its standard uncertainty
constexpr double kStrongThird = 0.03;       // third harmonic of the current over its fundamental

void find_window(SineRecord& sine, const SineRequest& request) {
  const DrivenRecord& r = sine.record;
  const double last = static_cast<double>(r.volts.size());
  const auto at = [&](double time_s) {
    return static_cast<std::size_t>(std::clamp(std::ceil((time_s - r.start_s) / r.step_s - 1e-6), 0.0, last));
  };
  sine.first = request.from_s ? at(*request.from_s) : 0;
  sine.end = request.to_s ? std::max(sine.first, at(*request.to_s)) : r.volts.size();
}

/// Clipped samples of a column are taken for missing, with one more on either side: it may be half cut.
bool leave_out_clipped(SineRecord& sine, const Capture& capture, std::size_t column, std::vector<double>& samples) {
  const Channel& channel = capture.channels[column];
  if (!capture.time.uniform()) return true;  // resampled: equal samples mean nothing any more
  std::size_t clipped = 0;
  for (const FlatTop& top : find_flat_tops(channel, sine.first, sine.end)) {
    clipped += top.end - top.first;
    const std::size_t first = std::max(sine.first, top.first > 0 ? top.first - 1 : 0);
    for (std::size_t i = first; i < std::min(top.end + 1, sine.end); ++i) samples[i] = std::nan("");
  }
  if (clipped == 0) return true;
  const double share = static_cast<double>(clipped) / static_cast<double>(sine.end - sine.first);
  const bool hopeless = share > kMostClipped;
  sine.findings.push_back({"clipped", hopeless ? Severity::refusal : Severity::caution,
                           std::to_string(clipped) + " samples of " + shown(channel.name) + " are clipped (" +
                               to_percent_text(share) + ")" +
                               (hopeless ? ": capture again at a coarser range"
                                         : "; they are left out of the fit. A coarser range keeps the whole wave"),
                           channel.name, static_cast<double>(clipped), Unit::one});
  return !hopeless;
}

void look_at_columns(SineRecord& sine, const Capture& capture, bool& usable) {
  const DrivenRecord::Columns& c = sine.record.columns;
  usable = true;
  const auto look = [&](std::size_t column, std::vector<double>& samples) {
    usable = leave_out_clipped(sine, capture, column, samples) && usable;
  };
  look(c.voltage, sine.record.volts);
  if (c.voltage_low) look(*c.voltage_low, sine.record.volts);
  look(c.current, sine.record.amps);
  if (c.current_low) look(*c.current_low, sine.record.amps);
  for (const std::size_t column : {c.voltage, c.current}) {
    if (!capture.time.uniform()) break;
    for (Finding& finding : check_range(capture.channels[column], sine.first, sine.end)) {
      sine.findings.push_back(std::move(finding));
    }
  }
}

/// Each channel by itself: do both show the frequency of the common fit?
bool one_frequency(SineRecord& sine) {
  std::array<std::optional<SineFit>, 2> alone;
  const std::array channels = {SineChannel{sine.volts(), sine.record.volt_resolution},
                               SineChannel{sine.amps(), sine.record.amp_resolution}};
  for (std::size_t c = 0; c < 2; ++c) {
    // Without its crests a wave shows a harmonic first: alone it says nothing of its frequency then.
    const auto missing = std::count_if(channels[c].y.begin(), channels[c].y.end(),
                                       [](double v) { return std::isnan(v); });
    if (20 * static_cast<std::size_t>(missing) > channels[c].y.size()) return true;
    if (Result<SineFit> fit = fit_sines({&channels[c], 1})) alone[c] = std::move(*fit);
  }
  if (!alone[0] || !alone[1]) return true;
  const double apart = std::fabs(alone[0]->omega - alone[1]->omega);
  const double u = std::hypot(alone[0]->fit.standard_uncertainty(0), alone[1]->fit.standard_uncertainty(0));
  const double bin = kTwoPi / static_cast<double>(sine.end - sine.first);
  if (!(apart > kApartInSigma * u) || !(apart > kApartInBins * bin)) return true;
  const auto hertz = [&](const SineFit& fit) { return fit.omega / kTwoPi / sine.record.step_s; };
  sine.findings.push_back({"different_frequencies", Severity::refusal,
                           shown(sine.record.volt_name) + " swings at " +
                               to_text(hertz(*alone[0]), Unit::hertz, Script::utf8, 7) + " and " +
                               shown(sine.record.amp_name) + " at " +
                               to_text(hertz(*alone[1]), Unit::hertz, Script::utf8, 7) +
                               ": an impedance needs one frequency in both; check what is connected to the channels",
                           sine.record.amp_name, apart / kTwoPi / sine.record.step_s, Unit::hertz});
  return false;
}

void note_sampling(SineRecord& sine) {
  const double per_period = kTwoPi / sine.fit->omega;
  const double cycles = sine.fit->cycles;
  if (cycles < kFewCycles) {
    sine.findings.push_back({"few_cycles", Severity::note,
                             "the window holds " + to_text(cycles, Unit::one, Script::utf8, 2) +
                                 " periods: the interval allows for it, a longer record would narrow it",
                             sine.record.volt_name, cycles, Unit::one});
  }
  if (per_period < kThinlySampled) {
    const bool hardly = per_period < kHardlySampled;
    sine.findings.push_back({"aliased", hardly ? Severity::caution : Severity::note,
                             "only " + to_text(per_period, Unit::one, Script::utf8, 2) +
                                 " samples a period: the true frequency may be above half the sampling rate; capture "
                                 "faster to be sure",
                             sine.record.volt_name, per_period, Unit::one});
  }
}

/// Signal in both channels, steady, and what its harmonics say.
bool note_shape(SineRecord& sine) {
  const std::array names = {sine.record.volt_name, sine.record.amp_name};
  for (std::size_t c = 0; c < 2; ++c) {
    const FittedSine& one = sine.fit->channels[c];
    const double amplitude = std::abs(one.phasor);
    const auto at = static_cast<Eigen::Index>(1 + 3 * c);
    const double u = std::sqrt(sine.fit->fit.covariance.diagonal().segment<2>(at).maxCoeff());
    if (amplitude < kLeastSnr * u) {
      sine.findings.push_back({"no_signal", Severity::refusal,
                               "no sine stands out of the noise in " + shown(names[c]) +
                                   ": check what is connected to it, or use a finer range or a longer record",
                               names[c], amplitude / u, Unit::one});
      return false;
    }
    const double ratio = one.sigma_in_band / one.sigma_per_sample;
    if (ratio > kNotSteady) {
      sine.findings.push_back({"not_steady", Severity::caution,
                               shown(names[c]) + " is no steady sine: what the fit leaves over near its frequency is " +
                                   to_text(ratio, Unit::one, Script::utf8, 2) +
                                   " times the noise; the interval is widened by as much. Capture after the source has "
                                   "settled, or narrow the window with --from and --to",
                               names[c], ratio, Unit::one});
    }
  }
  const FittedSine& amps = sine.fit->channels[1];
  const double third = std::abs(amps.harmonics[1]) / std::abs(amps.phasor);
  if (third > kStrongThird && std::abs(amps.harmonics[1]) > 5 * amps.harmonic_u) {
    sine.findings.push_back({"harmonics", Severity::note,
                             "the current's third harmonic is " + to_percent_text(third) +
                                 " of its fundamental: the core begins to saturate at this level, and the values hold for "
                                 "this level only",
                             sine.record.amp_name, third, Unit::one});
  }
  return true;
}

}  // namespace

Result<SineRecord> sine_of_capture(const Capture& capture, const SineRequest& request) {
  Result<DrivenRecord> record = driven_record(capture, request.bench, request.propagation);
  if (!record) return failure(record);
  SineRecord sine;
  sine.record = std::move(*record);
  if (request.turns_ratio) take_turns_ratio(sine.record, *request.turns_ratio, request.propagation);
  sine.findings = sine.record.findings;
  find_window(sine, request);
  bool usable = true;
  look_at_columns(sine, capture, usable);
  if (!usable) return sine;

  const std::array channels = {SineChannel{sine.volts(), sine.record.volt_resolution},
                               SineChannel{sine.amps(), sine.record.amp_resolution}};
  Result<SineFit> fit = fit_sines(channels);
  if (fit && fit->fit.usable()) sine.fit = std::move(*fit);
  // Also when the common fit failed: two frequencies are why it may have.
  if (!one_frequency(sine)) {
    sine.fit.reset();
    return sine;
  }
  if (!sine.fit) {
    const Problem problem = fit ? Problem::no_signal : fit.error().problem;
    const std::string code = problem == Problem::too_few_samples ? "too_few_samples"
                             : problem == Problem::not_converged ? "not_steady"
                                                                 : "no_signal";
    const std::string why = fit ? "the record does not determine a sine" : fit.error().finding + "; " + fit.error().remedy;
    sine.findings.push_back({code, Severity::refusal, why, sine.record.volt_name,
                             static_cast<double>(sine.end - sine.first), Unit::one});
    return sine;
  }
  note_sampling(sine);
  if (!note_shape(sine)) sine.fit.reset();
  return sine;
}

namespace {
enum Place : std::size_t { kVoltageGain, kCurrentGain, kSkew, kTau, kCorner, kTimebase };
}

SineInputs::SineInputs(const SineRecord& sine)
    : step_s_(sine.record.step_s), shunt_(sine.record.errors.current_gain.source.starts_with("shunt")) {
  const DrivenRecord::Errors& e = sine.record.errors;
  errors_ = {e.voltage_gain, e.current_gain, e.skew, e.shunt_tau, e.probe_corner, e.timebase};
  const Fit& fit = sine.fit->fit;
  const std::array<Eigen::Index, 5> used = {0, 1, 2, 4, 5};  // the offsets are of no interest
  fitted_.values.resize(5);
  fitted_.covariance.resize(5, 5);
  for (Eigen::Index i = 0; i < 5; ++i) {
    const Eigen::Index from = used[static_cast<std::size_t>(i)];
    fitted_.values[i] = fit.parameters[from];
    for (Eigen::Index j = 0; j < 5; ++j) {
      fitted_.covariance(i, j) = fit.covariance(from, used[static_cast<std::size_t>(j)]);
    }
  }
  fitted_.dof = std::min(sine.fit->channels[0].dof, sine.fit->channels[1].dof);
  if (fitted_.dof > 200) fitted_.dof = 0;
}

SineInputs::Draw SineInputs::draw(std::span<const double> x, bool skew_taken_out) const {
  const std::span<const double> fit = x.subspan(x.size() - 5);  // errors may have been added behind the bench's own
  Draw d;
  d.omega = fit[0] / (step_s_ * (1 + x[kTimebase]));
  d.volts = x[kVoltageGain] * std::complex(fit[1], fit[2]);
  const std::complex<double> shown_amps(fit[3], fit[4]);
  const double factor = shunt_ ? 1 / x[kCurrentGain] : x[kCurrentGain];
  d.amps = factor * shown_amps / current_chain(d.omega, skew_taken_out ? x[kSkew] : 0, x[kTau], x[kCorner]);
  return d;
}

std::vector<double> SineInputs::best() const {
  std::vector<double> x;
  for (const InputError& error : errors_) x.push_back(error.value);
  x.insert(x.end(), fitted_.values.begin(), fitted_.values.end());
  return x;
}

}  // namespace coilassay
