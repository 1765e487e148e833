#include "analysis/cautions.h"

#include <cmath>

#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kEnergyNote_j = 1e-3;
constexpr double kEnergyCaution_j = 50e-3;
constexpr double kEnergyStop_j = 1;
constexpr double kTouchVoltage_v = 42;
constexpr double kStray_f = 100e-12;    // of a winding, its leads and an open switch
constexpr double kWarmShunt_w = 0.1;
constexpr const char* kFromMemory = "from memory";

/// `where`: "at the start of the window".
Caution stored_energy(double energy_j, double peak_current_a, const char* where) {
  std::string message = "the coil stores " + to_text(energy_j, Unit::joule, Script::utf8, 2) + " " + where + " (" +
                        to_text(peak_current_a, Unit::ampere, Script::utf8, 3) + ")";
  Severity severity = Severity::note;
  if (energy_j >= kEnergyStop_j) {
    severity = Severity::caution;
    message += ": stop, and let someone licensed for such work look at the set-up before it is energised again";
  } else if (energy_j >= kEnergyCaution_j) {
    severity = Severity::caution;
    message += ": enough to hurt; never open the circuit by hand, wait until it has died away, follow your local rules";
  } else if (energy_j >= kEnergyNote_j) {
    message += ": never open the circuit by hand under current";
  }
  return {"stored_energy", severity, message, energy_j, Unit::joule, kFromMemory};
}

/// `current`: what the clip would carry, in words.
Caution earthed_scope(const std::string& current, double figure_a) {
  return {"earthed_scope", Severity::note,
          "on a scope whose inputs share earth the shunt must sit at the earthed end, with no clip between coil and shunt, or "
          "the clip carries the coil's " + current +
              "; the coil's voltage is then the difference of both inputs (--voltage-low)",
          figure_a, Unit::ampere, kFromMemory};
}

}  // namespace

std::vector<Caution> ring_down_cautions(double peak_voltage_v, double peak_current_a, double energy_j, bool at_release) {
  std::vector<Caution> cautions;
  if (std::isfinite(energy_j)) {
    cautions.push_back(stored_energy(energy_j, peak_current_a, at_release ? "at the release" : "at the start of the window"));
  }
  if (peak_voltage_v > kTouchVoltage_v) {
    cautions.push_back({"over_voltage", Severity::caution,
                        "the ringing reaches " + to_text(peak_voltage_v, Unit::volt, Script::utf8, 3) +
                            " peak, above the 42 V usually taken as safe to touch: keep hands off, check the ratings of "
                            "capacitor and probe at this frequency, and follow your local rules",
                        peak_voltage_v, Unit::volt, kFromMemory});
  }
  return cautions;
}

std::vector<Caution> ramp_cautions(const RampLoad& load) {
  std::vector<Caution> cautions = {stored_energy(load.energy_j, load.peak_a, "at the peak current")};
  const double flyback = load.peak_a * std::sqrt(load.inductance_h / kStray_f);
  if (!load.fall_seen && flyback > kTouchVoltage_v) {
    cautions.push_back({"flyback", Severity::caution,
                        "no fall through a diode is in the record: without a clamp, opening the circuit at the peak current "
                        "can raise up to " + to_text(flyback, Unit::volt, Script::utf8, 2) +
                            " (into an assumed 100 pF), more than most switches and probes bear; clamp the coil and never "
                            "unclip it under current",
                        flyback, Unit::volt, kFromMemory});
  }
  std::string heat = "one pulse leaves " + to_text(load.winding_j, Unit::joule, Script::utf8, 2) + " in the winding";
  if (load.winding_assumed) heat += " (by an assumed resistance)";
  if (std::isfinite(load.period_s)) {
    heat += ", repeated as in this record " + to_text(load.winding_j / load.period_s, Unit::watt, Script::utf8, 2);
  }
  heat += ": a single pulse hardly warms it, repetition does";
  cautions.push_back({"pulse_heating", Severity::note, heat, load.winding_j, Unit::joule, kFromMemory});
  if (std::isfinite(load.shunt_j)) {
    cautions.push_back({"shunt_energy", Severity::note,
                        "one pulse leaves " + to_text(load.shunt_j, Unit::joule, Script::utf8, 2) +
                            " in the shunt: compare it with the shunt's pulse rating",
                        load.shunt_j, Unit::joule, kFromMemory});
  }
  if (load.shares_earth) {
    cautions.push_back(earthed_scope("peak of " + to_text(load.peak_a, Unit::ampere, Script::utf8, 3), load.peak_a));
  }
  return cautions;
}

std::vector<Caution> sine_cautions(const SineLoad& load) {
  std::vector<Caution> cautions;
  if (std::isfinite(load.energy_j)) cautions.push_back(stored_energy(load.energy_j, load.peak_a, "at the crest"));
  if (load.peak_v > kTouchVoltage_v) {
    cautions.push_back({"over_voltage", Severity::caution,
                        "the drive reaches " + to_text(load.peak_v, Unit::volt, Script::utf8, 3) +
                            " peak, above the 42 V usually taken as safe to touch: keep hands off, check the ratings of "
                            "probes and inputs, and follow your local rules",
                        load.peak_v, Unit::volt, kFromMemory});
  }
  if (load.shunt_w > kWarmShunt_w) {
    cautions.push_back({"shunt_heating", Severity::caution,
                        "the shunt takes " + to_text(load.shunt_w, Unit::watt, Script::utf8, 2) +
                            ": check its rating, and that its value does not drift while it warms",
                        load.shunt_w, Unit::watt, kFromMemory});
  }
  if (load.shares_earth) {
    const double rms_a = load.peak_a / std::sqrt(2.0);
    cautions.push_back(earthed_scope(to_text(rms_a, Unit::ampere, Script::utf8, 3), rms_a));
  }
  return cautions;
}

std::vector<Caution> coupling_cautions(const StepUp& step) {
  constexpr double kTouchable_v = 42, kNoteworthy = 3;
  if (std::isfinite(step.test_v)) {
    const double open = step.ratio * step.test_v;
    if (!(open > kTouchable_v)) return {};
    return {{"open_side_voltage", Severity::caution,
             "a test voltage of " + to_text(step.test_v, Unit::volt, Script::utf8, 3) + " peak across the other winding stands as " +
                 to_text(open, Unit::volt, Script::utf8, 3) + " peak at the open " + step.open_side +
                 ": do not touch it, and use a probe that stands it",
             open, Unit::volt, "from memory"}};
  }
  if (!(step.ratio > kNoteworthy)) return {};
  const double enough = kTouchable_v / step.ratio;
  return {{"open_side_voltage", Severity::note,
           "the open " + step.open_side + " carries " + to_text(step.ratio, Unit::one, Script::utf8, 2) + " times the test voltage: from " +
               to_text(enough, Unit::volt, Script::utf8, 2) + " peak on it passes 42 V",
           enough, Unit::volt, "from memory"}};
}

}  // namespace coilassay
