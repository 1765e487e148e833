// Propagation of distributions by trials (JCGM 101, clause 7), in fixed shares with a random stream each.
#include <Eigen/Eigenvalues>
#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <limits>

#include "base/parallel.h"
#include "base/random.h"
#include "fitting/propagation.h"
#include "fitting/statistics.h"

namespace coilassay {
namespace {

constexpr double kNan = std::numeric_limits<double>::quiet_NaN();
constexpr std::size_t kShares = 64;  // fixed: the result must not depend on the number of threads

double draw(Random& random, const ErrorLaw& law) {
  const double u = law.standard_uncertainty;
  switch (law.kind) {
    case ErrorLaw::Kind::normal: return u * random.normal();
    case ErrorLaw::Kind::rectangular: return u * std::sqrt(3.0) * random.uniform(-1, 1);
    case ErrorLaw::Kind::triangular: return u * std::sqrt(6.0) * (random.uniform() - random.uniform());
    case ErrorLaw::Kind::student_t: return u * random.student_t(law.dof);
  }
  return kNan;
}

/// A root of the covariance: root * root^T. By eigenvalues, so that a semi-definite one (inputs that are not independent
/// at all) works; what rounding made negative is taken as zero.
Eigen::MatrixXd root_of(const Eigen::MatrixXd& covariance) {
  if (covariance.size() == 0) return covariance;
  if (!covariance.allFinite()) return Eigen::MatrixXd::Constant(covariance.rows(), covariance.cols(), kNan);
  // Scaled to correlations first: henries beside ohms differ by more digits than a double has.
  Eigen::VectorXd scale = covariance.diagonal().cwiseMax(0).cwiseSqrt();
  const Eigen::VectorXd inverse = scale.unaryExpr([](double s) { return s > 0 ? 1 / s : 0; });
  const Eigen::MatrixXd correlation = inverse.asDiagonal() * covariance * inverse.asDiagonal();
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(correlation);
  return scale.asDiagonal() * solver.eigenvectors() * solver.eigenvalues().cwiseMax(0).cwiseSqrt().asDiagonal();
}

/// The smallest and the largest `count` values, each sorted, with a histogram instead of a full sort: only values in the
/// bins of the tails are gathered and sorted.
struct Tails {
  std::vector<double> low, high;
};

Tails tails_of(std::span<const double> values, std::size_t count) {
  constexpr std::size_t kBins = 4096;
  const auto [least, greatest] = std::minmax_element(values.begin(), values.end());
  // Halved, so that a range wider than the largest double does not overflow.
  const double from = *least / 2, half_width = *greatest / 2 - *least / 2;
  const auto bin_of = [&](double v) {
    if (!(half_width > 0)) return std::size_t{0};
    const double place = (v / 2 - from) / half_width * kBins;
    return std::min(static_cast<std::size_t>(place), kBins - 1);
  };
  std::array<std::size_t, kBins> bins{};
  for (const double v : values) ++bins[bin_of(v)];
  std::size_t low_bin = 0, high_bin = kBins - 1;
  for (std::size_t n = bins[low_bin]; n < count; n += bins[low_bin]) ++low_bin;
  for (std::size_t n = bins[high_bin]; n < count; n += bins[high_bin]) --high_bin;

  Tails tails;
  for (const double v : values) {
    const std::size_t bin = bin_of(v);
    if (bin <= low_bin) tails.low.push_back(v);
    if (bin >= high_bin) tails.high.push_back(v);
  }
  std::sort(tails.low.begin(), tails.low.end());
  std::sort(tails.high.begin(), tails.high.end());
  tails.low.resize(count);
  tails.high.erase(tails.high.begin(), tails.high.end() - static_cast<std::ptrdiff_t>(count));
  return tails;
}

TrialResult summary_of(std::span<const double> values, double confidence) {
  if (values.size() < 2) return {kNan, kNan, kNan, kNan, kNan, kNan};
  TrialResult result;
  const double n = static_cast<double>(values.size());
  const Summary summary = summarise(values);
  result.mean = summary.mean;
  result.standard_uncertainty = summary.standard_deviation;

  // JCGM 101, 7.7: q values inside, the interval runs from the r-th to the (r+q)-th sorted value, r = 1 ... M - q.
  const std::size_t m = values.size();
  const std::size_t q = std::clamp<std::size_t>(static_cast<std::size_t>(std::lround(confidence * n)), 1, m - 1);
  const std::size_t choices = m - q;
  const Tails tails = tails_of(values, choices);
  const std::size_t symmetric = (choices + 1) / 2 - 1;
  result.low = tails.low[symmetric];
  result.high = tails.high[symmetric];
  std::size_t shortest = 0;
  for (std::size_t r = 1; r < choices; ++r) {
    if (tails.high[r] - tails.low[r] < tails.high[shortest] - tails.low[shortest]) shortest = r;
  }
  result.shortest_low = tails.low[shortest];
  result.shortest_high = tails.high[shortest];
  return result;
}

}  // namespace

TrialReport propagate_by_trials(std::span<const TrialInput> independent, const CorrelatedGroup& group,
                                std::size_t output_count,
                                const std::function<void(std::span<const double>, std::span<double>)>& f,
                                std::uint64_t trials, std::uint64_t seed, unsigned threads, double confidence) {
  assert(group.covariance.rows() == group.mean.size() && group.covariance.cols() == group.mean.size());
  assert(confidence > 0 && confidence < 1);
  const Eigen::MatrixXd root = root_of(group.covariance);
  const auto group_size = static_cast<std::size_t>(group.mean.size());

  // One row of all trials per output; a share writes to its own part and tells how many of its trials are good.
  std::vector<std::vector<double>> rows(output_count, std::vector<double>(trials));
  std::array<std::size_t, kShares> good{};
  const auto begin_of = [&](std::size_t share) { return trials * share / kShares; };
  for_each_index(kShares, threads, [&](std::size_t share) {
    Random random(seed, share);
    std::vector<double> inputs(independent.size() + group_size), outputs(output_count);
    Eigen::VectorXd z(group.mean.size());
    std::size_t at = begin_of(share);
    for (std::size_t trial = begin_of(share); trial < begin_of(share + 1); ++trial) {
      for (std::size_t i = 0; i < independent.size(); ++i) inputs[i] = independent[i].value + draw(random, independent[i].law);
      if (group_size > 0) {
        for (double& component : z) component = random.normal();
        Eigen::Map<Eigen::VectorXd>(inputs.data() + independent.size(), group.mean.size()).noalias() = root * z;
        for (std::size_t i = 0; i < group_size; ++i) inputs[independent.size() + i] += group.mean[static_cast<Eigen::Index>(i)];
      }
      std::fill(outputs.begin(), outputs.end(), kNan);
      f(inputs, outputs);
      if (!std::all_of(outputs.begin(), outputs.end(), [](double v) { return std::isfinite(v); })) continue;
      for (std::size_t k = 0; k < output_count; ++k) rows[k][at] = outputs[k];
      ++at;
    }
    good[share] = at - begin_of(share);
  });

  TrialReport report;
  report.trials = trials;
  report.outputs.resize(output_count);
  std::size_t kept = 0;
  for (const std::size_t n : good) kept += n;
  report.failed = trials - kept;
  for_each_index(output_count, threads, [&](std::size_t k) {
    std::vector<double>& row = rows[k];
    if (report.failed > 0) {  // close the gaps
      auto to = row.begin();
      for (std::size_t share = 0; share < kShares; ++share) {
        const auto from = row.begin() + static_cast<std::ptrdiff_t>(begin_of(share));
        to = std::copy(from, from + static_cast<std::ptrdiff_t>(good[share]), to);
      }
      row.resize(kept);
    }
    report.outputs[k] = summary_of(row, confidence);
  });
  return report;
}

}  // namespace coilassay
