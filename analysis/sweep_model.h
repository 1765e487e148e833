// The circuit of a sweep, how well it fits, and what each error of the bench does to it. Internal to this room.
#pragma once

#include <Eigen/Core>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/sweep_data.h"
#include "fitting/kramers_kronig.h"

namespace coilassay {

struct SweepModel {
  CircuitFit fit;
  SweepErrors alike = SweepErrors::ratio;       // in which form the errors of the points are alike
  std::string runner_up;                        // "R L C, skin (criterion 12.3 higher)"; empty: none
  std::vector<std::size_t> outliers;            // of the data's points, left out of the fit
  std::optional<KramersKronig> causality;       // absent: too few points, or no phase
  CircuitData points;                           // as fitted, with the errors that were found
  double residual_rms = 0;                      // of ln Z, or of S
  double noise = 1;                             // what differs between neighbouring residuals, over the errors of the points
  double correlation = 0;                       // of the residuals of neighbouring points
  double inflation = 1;                         // of the covariance, for residuals that hang together
  bool misfit = false;                          // they do so beyond chance
  std::vector<CircuitCandidate> tried;          // at first
  bool jointly = false;                         // the circuit was fitted together with the errors below
  std::vector<std::complex<double>> cleaned;    // then: the points with the most likely errors taken out
  struct Drift {                                // what the circuit becomes on parts of the span
    std::vector<CircuitFit> parts;
  } drift;                                      // only with misfit
  struct Hidden {
    CircuitParameter loss;
    Circuit circuit;                            // with that loss as large as the data would let pass unseen
  };
  std::vector<Hidden> hidden;                   // losses the circuit does not have
  struct Alternative {
    double weight;                              // share of the probability among the circuits tried, by the criterion
    Circuit circuit;
    std::vector<CircuitParameter> order;
    Eigen::MatrixXd covariance;                 // by the noise and by the errors of the bench
  };
  std::vector<Alternative> alternatives;        // circuits the data do not clearly refuse
  std::vector<ImpedanceErrorTerm> errors;       // common ones, the frequency's among them
  Eigen::MatrixXd shifts;                       // of the parameters (rows) by one standard uncertainty of each error (columns)

  std::size_t parameters() const { return fit.order.size(); }
  /// The circuit of one draw: errors of the bench in standard uncertainties, then the parameters as fitted.
  Circuit draw(std::span<const double> x) const;
};

/// Fits and judges. no_signal and not_converged as choose_circuit; these are for the measurement to explain.
Result<SweepModel> fit_sweep(const SweepData& data, const SweepRequest& request);

/// A round frequency (1, 2, 5 times a power of ten) near the geometric mean of the span: the AC law's coefficient refers to it.
double round_reference_hz(double low_hz, double high_hz);

/// How the errors of the points compare, from differences of neighbouring residuals: a misfit, smooth over frequency, leaves
/// them alone. Standard deviations for ln |Z| and angle, in units of the fit's own.
struct NoiseProfile {
  std::vector<double> size, angle;   // per point
  bool uneven = false;               // beyond chance
  double all = 0;                    // of all points and both parts together
};
NoiseProfile noise_profile(const CircuitFit& fit);

/// Change of the fitted parameters when dz is added to the impedances, to first order.
Eigen::VectorXd parameter_shift(const SweepModel& model, std::span<const std::complex<double>> dz_ohm);

}  // namespace coilassay
