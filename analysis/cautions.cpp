#include "analysis/cautions.h"

#include "base/number_text.h"

namespace coilassay {

namespace {

constexpr double kEnergyNote_j = 1e-3;
constexpr double kEnergyCaution_j = 50e-3;
constexpr double kEnergyStop_j = 1;
constexpr double kTouchVoltage_v = 42;
constexpr const char* kFromMemory = "from memory";

}  // namespace

std::vector<Caution> ring_down_cautions(double peak_voltage_v, double peak_current_a, double energy_j) {
  std::vector<Caution> cautions;
  std::string message = "the coil stores " + to_text(energy_j, Unit::joule, Script::utf8, 2) + " at the release (" +
                        to_text(peak_current_a, Unit::ampere, Script::utf8, 3) + ")";
  Severity severity = Severity::note;
  if (energy_j >= kEnergyStop_j) {
    severity = Severity::refusal;
    message += ": stop, and let someone licensed for such work look at the set-up before it is energised again";
  } else if (energy_j >= kEnergyCaution_j) {
    severity = Severity::caution;
    message += ": enough to hurt; never open the circuit by hand, wait until it has died away, follow your local rules";
  } else if (energy_j >= kEnergyNote_j) {
    message += ": never open the circuit by hand under current";
  }
  cautions.push_back({"stored_energy", severity, message, energy_j, Unit::joule, kFromMemory});
  if (peak_voltage_v > kTouchVoltage_v) {
    cautions.push_back({"over_voltage", Severity::caution,
                        "the ringing reaches " + to_text(peak_voltage_v, Unit::volt, Script::utf8, 3) +
                            " peak, above the 42 V usually taken as safe to touch: keep hands off, check the ratings of "
                            "capacitor and probe at this frequency, and follow your local rules",
                        peak_voltage_v, Unit::volt, kFromMemory});
  }
  return cautions;
}

}  // namespace coilassay
