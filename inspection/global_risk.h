// What a decision rule does to a whole process: consumer's and producer's risk (JCGM 106, 9.5).
#pragma once

#include <functional>
#include <optional>

namespace coilassay {

struct GlobalRisks {
  double nonconforming = 0;   // share of the process outside the limits
  double consumer = 0;        // nonconforming and accepted
  double producer = 0;        // conforming and not accepted
};

/// Quadrature over the process law: density(x) between `from` and `to` (all of it that matters), read with a normal error of
/// `u`, accepted between the acceptance limits. Limits that are absent do not bound.
GlobalRisks global_risks(const std::function<double(double)>& density, double from, double to, double u, std::optional<double> min,
                         std::optional<double> max, std::optional<double> accept_min, std::optional<double> accept_max);

}  // namespace coilassay
