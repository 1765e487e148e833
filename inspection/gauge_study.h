// How much of the spread of readings is the gauge's: the crossed study by analysis of variance (docs/formulas.md#gauge-study).
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/finding.h"
#include "base/result.h"
#include "fitting/analysis_of_variance.h"

namespace coilassay {

struct GaugeReading {
  std::string part, operator_name, trial;
  double value = 0;
};

struct GaugeOptions {
  std::optional<double> tolerance;        // max - min, in the unit of the readings
  double pooling_probability = 0.25;      // an interaction less significant than this is pooled with the readings within
  std::uint64_t draws = 20000;            // of the intervals
  std::uint64_t seed = 1;
};

/// A standard deviation with its 95 % interval and its share of the total variance.
struct GaugeComponent {
  std::string name;                       // "repeatability", "operator", "interaction", "reproducibility", "gauge", "part", "total"
  double sigma = 0, low = 0, high = 0;
  double share = 0;
};

struct WithInterval {
  double value = 0, low = 0, high = 0;
};

struct GaugeStudy {
  std::vector<std::string> parts, operators, trials;   // sorted as they first appear
  std::vector<double> values;             // [(part * operators + operator) * trials + trial]
  TwoWayAnalysis table;
  bool pooled = false;
  std::optional<VarianceLine> pooled_within;
  std::vector<GaugeComponent> components;
  WithInterval grr_of_study;              // gauge/total, a ratio
  std::optional<WithInterval> grr_of_tolerance;  // 6 gauge/tolerance
  WithInterval categories;                // sqrt(2) part/gauge, not cut
  std::uint64_t ndc = 0;                  // cut to a whole number
  std::string judgement;                  // "good", "conditional", "poor"
  std::vector<std::string> why;           // sentences behind the judgement

  const GaugeComponent& component(std::string_view name) const;
};

/// Needs two parts and two trials, every part read by every operator in every trial once. too_few_samples, or damaged (a
/// reading missing, twice or not finite) with the part, operator and trial in the finding.
Result<GaugeStudy> study_gauge(std::span<const GaugeReading> readings, const GaugeOptions& options);

}  // namespace coilassay
