// One pulse: the current as a function of flux, by a family of roll-offs, and what every error does to it.
#pragma once

#include <Eigen/Core>
#include <array>
#include <optional>
#include <string>
#include <vector>

#include "analysis/driven_capture.h"
#include "analysis/ramp_flux.h"
#include "analysis/ramp_pulses.h"
#include "base/result.h"
#include "fitting/roll_off_fit.h"

namespace coilassay {

/// What a curve says, in this order: L_0, I_sat_10/20/30, I_sat_10/20/30 by the secant, E_max, then L on a grid of
/// currents. A current that the record does not reach is NaN.
namespace ramp_output {
enum Index { kL0, kSat, kSecant = kSat + 3, kEnergy = kSecant + 3, kGrid };
inline constexpr int kGridPoints = 101;
inline constexpr int kCount = kGrid + kGridPoints;
}  // namespace ramp_output

/// Errors that act on a curve, in this order: voltage gain, current gain, winding resistance, skew, shunt inductance, current
/// probe corner, time base, zero of the voltage.
struct RampInputs {
  std::vector<InputError> errors;
  bool resistance_from_closure = false;
};
RampInputs ramp_inputs(const DrivenRecord& record, const RampLayout& layout, const RampResistance& resistance);

struct RampCurve {
  RollOffFit fit;                        // the family taken
  std::string family;                    // in words: "soft powder", "generalised knee", ...
  std::string runner_up;
  double flux_origin_sigma = 0;          // of the flux at the start, as it was known beforehand
  double edge_lead_s = 0;                // the current is ahead of the voltage by so much more than stated (0: not seen)
  double edge_lead_u_s = 0;
  double low_a = 0, high_a = 0;          // currents that the rise holds
  double reference_a = 0;                // of L_0; 0 when the rise begins at no current
  std::vector<double> grid_a;            // kGridPoints currents
  std::array<double, 3> sure_a{};        // up to here the inductance has not dropped by 10, 20, 30 %, noise allowed for
  Eigen::VectorXd values;                // kCount outputs
  Eigen::MatrixXd covariance;            // of the outputs, from the fit
  Eigen::MatrixXd sensitivity;           // outputs x inputs
  Eigen::VectorXd spread;                // half-width that the choice of the curve leaves open
  double early_slope = 0, late_slope = 0;         // di/dt, A/s
  double early_v = 0, late_v = 0;                 // over the coil
  double early_inner_v = 0, late_inner_v = 0;     // less R i: what drives the flux
  double late_inductance_ratio = 1;               // of L at the end over L_0

  RollOff curve() const { return fit.curve; }
};

/// Fits the rise of one pulse. too_few_samples or not_converged.
Result<RampCurve> curve_of(const RampLayout& layout, const RampPulse& pulse, const PulseIntegrals& integrals,
                           const RampInputs& inputs, const DrivenRecord& record);

}  // namespace coilassay
