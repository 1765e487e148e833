// What each kind of test can say, and which test a limit is judged from.
#include <algorithm>
#include <array>
#include <span>

#include "inspection/part_sheet.h"

namespace coilassay {

namespace {

struct Kind {
  std::string_view kind;
  std::span<const std::string_view> symbols;
};

constexpr std::string_view kRingDown[] = {"f_0", "f_d", "alpha", "Q", "L_s", "R_s", "Q_coil", "L", "C_par"};
constexpr std::string_view kRamp[] = {"L_0", "I_sat_10", "I_sat_20", "I_sat_30", "I_sat_10_secant", "I_sat_20_secant",
                                      "I_sat_30_secant", "R_dc", "E_max", "W_loop"};
constexpr std::string_view kSine[] = {"f", "Z", "phi", "R_s", "X_s", "L_s", "R_p", "L_p", "Q", "D", "P", "P_winding",
                                      "skew", "I_sat_10", "I_sat_20", "I_sat_30"};
constexpr std::string_view kSweep[] = {"L", "R_dc", "C_par", "R_par", "R_ac", "f_r", "Z", "phi", "R_s", "L_s", "R_p", "L_p",
                                       "Q", "D"};
constexpr std::string_view kCoupling[] = {"L_1", "L_2", "M", "k", "n", "L_leak_1", "L_leak_2"};
constexpr std::string_view kResistance[] = {"R_dc", "R_dc_20", "T_winding", "T_rise"};
constexpr std::array kKinds = {Kind{"ringdown", kRingDown}, Kind{"ramp", kRamp},         Kind{"sine", kSine},
                               Kind{"sweep", kSweep},       Kind{"coupling", kCoupling}, Kind{"resistance", kResistance}};

bool same_quantity(const Limit& limit, std::string_view kind) {
  if (test_gives(kind, limit.quantity)) return true;
  return limit.at.definition == "ramp_secant" && test_gives(kind, limit.quantity + "_secant");
}

}  // namespace

bool test_gives(std::string_view kind, std::string_view symbol) {
  if (kind == "reading") return true;
  const auto found = std::find_if(kKinds.begin(), kKinds.end(), [&](const Kind& k) { return k.kind == kind; });
  return found != kKinds.end() && std::find(found->symbols.begin(), found->symbols.end(), symbol) != found->symbols.end();
}

bool limit_uses(const Limit& limit, const TestPlan& test) {
  if (!limit.test.empty() && limit.test != test.name && limit.test != test.kind) return false;
  return same_quantity(limit, test.kind);
}

std::vector<double> frequencies_needed(const PartSheet& sheet, const TestPlan& test) {
  if (test.kind != "sweep" && test.kind != "coupling") return {};
  std::vector<double> frequencies = test.at_hz;
  for (const Limit& limit : sheet.limits) {
    if (limit.at.frequency_hz && limit_uses(limit, test)) frequencies.push_back(*limit.at.frequency_hz);
  }
  std::sort(frequencies.begin(), frequencies.end());
  frequencies.erase(std::unique(frequencies.begin(), frequencies.end()), frequencies.end());
  return frequencies;
}

std::size_t TestPlan::joint_captures() const {
  if (kind == "ringdown") return std::max<std::size_t>(capacitors.size(), 1);
  if (kind == "sine") return std::max<std::size_t>(biases.size(), 1);
  return 1;
}

const TestPlan* PartSheet::find_test(std::string_view test) const {
  const auto found = std::find_if(tests.begin(), tests.end(), [&](const TestPlan& plan) { return plan.name == test; });
  return found == tests.end() ? nullptr : &*found;
}

}  // namespace coilassay
