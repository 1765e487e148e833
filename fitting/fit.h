// What every fit returns: all of its story, also when it went badly.
#pragma once

#include <Eigen/Core>
#include <string_view>
#include <vector>

namespace coilassay {

enum class FitStop { converged, max_iterations, failed, rank_deficient };

std::string_view name(FitStop stop);

struct Fit {
  Eigen::VectorXd parameters;
  Eigen::MatrixXd covariance;          // empty when it does not exist
  double residual_rms = std::nan("");
  double reduced_chi_square = std::nan("");
  int iterations = 0;
  FitStop stop = FitStop::failed;
  std::vector<bool> at_bound;

  /// Converged, full rank, no parameter at its bound, everything finite.
  bool usable() const;
  double standard_uncertainty(int parameter) const;
  double correlation(int a, int b) const;
};

}  // namespace coilassay
