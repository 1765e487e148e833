// What a careful colleague would say about a ramp.
#include <algorithm>
#include <cmath>
#include <numbers>

#include "analysis/ramp_result.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using namespace ramp_output;

constexpr double kZeroCounts = 0.01;      // of the drive or the peak: a zero line worth naming
constexpr double kSlopeFalls = 0.9;       // of di/dt at the start
constexpr double kRises = 1.02;           // of L_0
constexpr double kDroops = 0.01;          // of the peak current, below zero after the pulse
constexpr double kFluxOpen = 0.01;        // of the peak flux
constexpr double kFirstDiffers = 0.005;   // of L_0 or I_sat
constexpr double kSure = 3;               // standard uncertainties

std::string text(double value, Unit unit, int digits = 3) { return to_text(value, unit, Script::utf8, digits); }

class Colleague {
 public:
  Colleague(Measurement& result, const RampStory& story)
      : result_(result), story_(story), curve_(story.shown()), pulse_(story.layout.pulses[story.first_counted()]),
        refused_(knee_is_refused(story)) {}

  void run() {
    zero_lines();
    resistance();
    falling_slope();
    knee();
    rise();
    edge();
    droop();
    closure();
    remanence();
    range();
  }

 private:
  void say(const char* code, Severity severity, std::string message, std::string about, double figure, Unit unit = Unit::one) {
    result_.findings.push_back({code, severity, std::move(message), std::move(about), figure, unit});
  }

  void zero_lines() {
    const RampLayout& layout = story_.layout;
    if (!layout.zero_known) {
      say("zero_offset", Severity::caution,
          "no quiet stretch before the drive shows where zero is: offsets of 1 % of the drive and of the peak current were "
          "allowed for; trigger later in the record so that it begins at rest",
          "L_0", ramp_defaults::kUnknownOffsetRatio);
      return;
    }
    const double volt = std::fabs(layout.volt_zero) / pulse_.drive_v, amp = std::fabs(layout.amp_zero) / layout.peak_a;
    if (std::fmax(volt, amp) < kZeroCounts) return;
    const bool of_volt = volt >= amp;
    say("zero_offset", Severity::note,
        shown(of_volt ? story_.record->volt_name : story_.record->amp_name) + " is off by " +
            text(of_volt ? layout.volt_zero : layout.amp_zero, of_volt ? Unit::volt : Unit::ampere) + " (" +
            to_percent_text(std::fmax(volt, amp)) + ") at rest; the stretch before the drive takes it out",
        of_volt ? "L_0" : "I_sat_30", std::fmax(volt, amp));
  }

  void resistance() {
    if (story_.resistance.from != RampResistance::From::unknown) return;
    say("resistance_unresolved", Severity::caution,
        "the winding resistance is not stated and cannot be told from this record, in which the current does not return to "
        "zero: a drop of up to 5 % of the voltage was allowed for; give --dcr, or capture the fall as well",
        "R_dc", ramp_defaults::kUnknownDropRatio);
  }

  /// A slope that falls is resistance, sag or a switch, never saturation: that only ever steepens.
  void falling_slope() {
    const double ratio = curve_.late_slope / curve_.early_slope;
    const bool falls = ratio < kSlopeFalls;
    if (!falls && !pulse_.plateau && !refused_) return;
    const double lost_v = 1 - curve_.late_v / curve_.early_v;
    const double lost_ir = (curve_.late_v - curve_.late_inner_v) / curve_.early_v;
    std::string cause;
    if (pulse_.plateau) {
      cause = "the current then stands still with no voltage left over the coil: the switch or the supply is at its limit";
    } else if (refused_) {
      cause = "the voltage that was captured does not explain it: it may not be taken over the coil alone, the winding "
              "resistance may be larger than stated, or the switch is at its limit; no knee is read from this record";
    } else if (lost_v > lost_ir) {
      cause = "the voltage over the coil sags by " + to_percent_text(std::fmax(lost_v, 0)) +
              " (supply, switch or leads); the flux takes that into account";
    } else {
      cause = "the winding resistance takes " + to_percent_text(std::fmax(lost_ir, 0)) + " of the voltage at the end; the flux "
              "takes that into account";
    }
    say("slope_falls", refused_ ? Severity::caution : Severity::note,
        "the current's slope falls to " + to_percent_text(std::fmax(ratio, 0)) +
            " of its start, which is not saturation (that steepens it): " + cause,
        refused_ ? "I_sat_30" : "", ratio);
  }

  void knee() {
    if (refused_) return;
    int missing = -1;
    for (int d = 2; d >= 0; --d) {
      if (!std::isfinite(curve_.values[kSat + d])) missing = d;
    }
    if (missing < 0) return;
    const double drop = 1 - curve_.late_inductance_ratio;
    if (drop > 0.1 * (missing + 1) && curve_.fit.lack_of_fit > ramp_defaults::kHopelessMisfit) {
      say("model_misfit", Severity::caution,
          "the inductance has dropped by " + to_percent_text(drop) + " at the highest current, but no curve follows how (off by " +
              text(curve_.fit.fit.residual_rms, Unit::ampere, 2) + " r.m.s.): the saturation currents are withheld; look at the figure, and "
              "give --from and --to if something else is in the rise",
          "I_sat_" + std::to_string(10 * (missing + 1)), curve_.fit.lack_of_fit);
      return;
    }
    say("knee_not_reached", Severity::note,
        std::to_string(10 * (missing + 1)) + " % drop not reached, highest current seen " + text(curve_.high_a, Unit::ampere) +
            (drop > 0.005 ? ", where the inductance has dropped by " + to_percent_text(drop)
                          : ", where the inductance has not dropped noticeably") +
            "; a longer drive shows more",
        "I_sat_" + std::to_string(10 * (missing + 1)), curve_.high_a, Unit::ampere);
  }

  void rise() {
    double most = 1, u = 0;
    for (int g = 0; g < kGridPoints; ++g) {
      const double ratio = curve_.values[kGrid + g] / curve_.values[kL0];
      if (ratio <= most) continue;
      most = ratio;
      // The two ends of the ratio share most of their errors; the larger of both alone is on the safe side.
      u = std::sqrt(std::fmax(curve_.covariance(kGrid + g, kGrid + g), curve_.covariance(kL0, kL0))) / curve_.values[kL0];
    }
    if (refused_ || most < kRises + kSure * u) return;
    say("l_rises_first", Severity::note,
        "the inductance first rises by " + to_percent_text(most - 1) +
            " before it falls; the drops of 10, 20 and 30 % count from its value at zero current",
        "L_0", most - 1);
  }

  /// The current steps together with the voltage, or starts late.
  void edge() {
    if (curve_.edge_lead_s == 0) return;
    const double seconds = std::fabs(curve_.edge_lead_s);
    const std::string how_much = text(seconds, Unit::second);
    if (curve_.edge_lead_s > 0) {
      const auto& shunt = story_.request->bench.current.shunt;
      const double henry = shunt ? seconds * shunt->value : 0;
      say("shunt_inductance", Severity::caution,
          "the current steps by " + text(curve_.edge_lead_s * curve_.early_slope, Unit::ampere, 2) +
              " with the voltage, as if it were " + how_much + " ahead" +
              (shunt ? ": the inductance of the shunt would be " + text(henry, Unit::henry, 2) +
                           "; give it with --shunt-inductance"
                     : ": inductance of a shunt, or skew; give --skew") +
              "; the flux was counted from where the current begins",
          "I_sat_30", shunt ? henry : seconds, shunt ? Unit::henry : Unit::second);
    } else {
      say("skew_limited", Severity::caution,
          "the current starts " + how_much + " after the voltage: the channels are skewed by more than was stated; give --skew " +
              how_much + "; the flux was counted from where the current begins",
          "I_sat_30", seconds, Unit::second);
    }
  }

  /// After the pulse a current probe without a DC path falls below zero and creeps back.
  void droop() {
    if (story_.record->errors.probe_corner.value > 0) return;   // taken out
    const RampPulse& last = story_.layout.pulses.back();
    if (!last.returns || !story_.layout.zero_known) return;
    const std::vector<double>& i = story_.layout.amps;
    const std::size_t length = i.size() - std::min(last.end, i.size());
    const std::size_t look = std::min<std::size_t>(length, std::max<std::size_t>((last.peak - last.start) / 4, 16));
    if (look < 16) return;
    double mean = 0;
    for (std::size_t k = last.end; k < last.end + look; ++k) mean += i[k] / static_cast<double>(look);
    const double u = std::hypot(story_.layout.amp_noise / std::sqrt(static_cast<double>(look)), story_.layout.amp_zero_u);
    if (mean > -kDroops * story_.layout.peak_a || mean > -kSure * u) return;
    const double corner = -mean / (2 * std::numbers::pi * std::fmax(story_.integrals.back().charge.back(), 1e-300));
    say("probe_droop", Severity::caution,
        "after the pulse the current reads " + text(mean, Unit::ampere, 2) + ": a current probe droops, with a corner near " +
            text(corner, Unit::hertz, 2) + "; it makes the inductance look larger at high currents; give --current-probe-corner",
        "I_sat_30", -mean / story_.layout.peak_a);
  }

  /// With a stated resistance the flux of a closed pulse must come back to its start.
  void closure() {
    if (story_.resistance.from != RampResistance::From::stated || std::isnan(story_.resistance.closure_u_ohm)) return;
    const InputError& stated = story_.inputs.errors[2];
    const double gap = story_.resistance.closure_ohm - stated.value;
    const auto& charge = story_.integrals[story_.first_counted()].charge;
    const double open = gap * charge.back();
    const double peak_flux = curve_.curve().integral(curve_.high_a);
    // The stated resistance, the gains behind the closing one, and its own noise.
    const double gains = std::hypot(story_.inputs.errors[0].law.standard_uncertainty,
                                    story_.inputs.errors[1].law.standard_uncertainty);
    const double u = std::sqrt(std::pow(stated.law.standard_uncertainty, 2) + std::pow(story_.resistance.closure_u_ohm, 2) +
                               std::pow(gains * story_.resistance.closure_ohm, 2));
    if (std::fabs(open) < kFluxOpen * peak_flux || std::fabs(gap) < kSure * u) return;
    say("flux_not_closed", Severity::caution,
        "the flux ends " + to_percent_text(std::fabs(open) / peak_flux) + " of its peak " + (open > 0 ? "above" : "below") +
            " where it began: with --dcr " + text(story_.resistance.closure_ohm, Unit::ohm) +
            " it would close; check the resistance (and its temperature), the zero of the voltage and where it is taken",
        "R_dc", open / peak_flux);
  }

  void remanence() {
    if (story_.curves.size() < 2) return;
    const RampCurve& first = story_.curves.front();
    double largest = 0;
    for (int o : {int{kL0}, int{kSat}, int{kSat} + 2}) {
      const double a = first.values[o], b = curve_.values[o];
      if (!std::isfinite(a) || !std::isfinite(b)) continue;
      const double u = std::sqrt(std::fmax(first.covariance(o, o), 0) + std::fmax(curve_.covariance(o, o), 0)) / b;
      const double difference = a / b - 1;
      if (std::fabs(difference) > std::fmax(kFirstDiffers, kSure * u) && std::fabs(difference) > std::fabs(largest)) {
        largest = difference;
      }
    }
    if (largest == 0) return;
    say("remanence", Severity::note,
        "the first pulse differs from the later ones by " + to_percent_text(std::fabs(largest)) +
            ": the core remembers where it was left; the values are those of the later pulses",
        "L_0", largest);
  }

  void range() {
    // The drive itself is a level, not a wave: only the current's use of its range says something.
    const RampLayout& layout = story_.layout;
    if (!(story_.record->amp_resolution > 0)) return;
    const double codes = layout.peak_a / story_.record->amp_resolution;
    if (codes >= 40) return;
    say("coarse_range", codes < 20 ? Severity::caution : Severity::note,
        shown(story_.record->amp_name) + " spans only " + text(codes, Unit::one, 2) +
            " codes of its converter: a finer range would show more",
        story_.record->amp_name, codes);
  }

  Measurement& result_;
  const RampStory& story_;
  const RampCurve& curve_;
  const RampPulse& pulse_;
  bool refused_;
};

}  // namespace

void add_ramp_findings(Measurement& result, const RampStory& story) { Colleague(result, story).run(); }

}  // namespace coilassay
