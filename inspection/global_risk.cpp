#include "inspection/global_risk.h"

#include <algorithm>
#include <boost/math/quadrature/gauss.hpp>
#include <cmath>
#include <vector>

#include "fitting/statistics.h"

namespace coilassay {

GlobalRisks global_risks(const std::function<double(double)>& density, double from, double to, double u, std::optional<double> min,
                         std::optional<double> max, std::optional<double> accept_min, std::optional<double> accept_max) {
  const auto accepted = [&](double x) {
    const double up = accept_max ? normal_cdf((*accept_max - x) / u) : 1, down = accept_min ? normal_cdf((*accept_min - x) / u) : 0;
    return std::max(up - down, 0.0);
  };
  const auto conforms = [&](double x) { return (!min || x >= *min) && (!max || x <= *max); };
  // Panels no wider than the error, with the limits among their ends: each integrand is smooth inside.
  std::vector<double> ends{from, to};
  for (const auto& limit : {min, max}) {
    if (limit && *limit > from && *limit < to) ends.push_back(*limit);
  }
  std::sort(ends.begin(), ends.end());
  GlobalRisks risks;
  for (std::size_t i = 1; i < ends.size(); ++i) {
    const double width = ends[i] - ends[i - 1];
    const int panels = std::clamp(static_cast<int>(std::ceil(2 * width / u)), 20, 20000);
    for (int p = 0; p < panels; ++p) {
      const double a = ends[i - 1] + width * p / panels, b = ends[i - 1] + width * (p + 1) / panels;
      const bool good = conforms((a + b) / 2);
      const auto integral = [&](const auto& f) { return boost::math::quadrature::gauss<double, 15>::integrate(f, a, b); };
      if (!good) {
        risks.nonconforming += integral([&](double x) { return density(x); });
        risks.consumer += integral([&](double x) { return density(x) * accepted(x); });
      } else {
        risks.producer += integral([&](double x) { return density(x) * (1 - accepted(x)); });
      }
    }
  }
  return risks;
}

}  // namespace coilassay
