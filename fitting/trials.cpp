// Propagation of distributions by trials (JCGM 101, clause 7), in fixed shares with a random stream each.
#include <Eigen/Eigenvalues>
#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <cstdint>
#include <limits>
#include <memory>
#include <vector>

#include "base/parallel.h"
#include "base/random.h"
#include "fitting/propagation.h"

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

/// What a share of the trials of one output knows by the time it has drawn them.
struct Running {
  double sum = 0, least = std::numeric_limits<double>::infinity(), greatest = -std::numeric_limits<double>::infinity();
  void add(double v) {
    sum += v;
    if (v < least) least = v;
    if (v > greatest) greatest = v;
  }
  void add(const Running& later) {
    sum += later.sum;
    if (later.least < least) least = later.least;
    if (later.greatest > greatest) greatest = later.greatest;
  }
};

/// The smallest and the largest `count` values, each sorted.
struct Tails {
  std::vector<double> low, high;
};

/// Values in equal bins between the least and the greatest: the tails are found by counting, and only they are sorted, bin by
/// bin. The pass that fills the bins also takes the second moment about the mean.
class Binned {
 public:
  Binned(std::span<const double> values, const Running& all, double mean) : values_(values), bin_(values.size()) {
    // Halved, so that a range wider than the largest double does not overflow.
    const double from = all.least / 2, half_width = all.greatest / 2 - all.least / 2;
    // A range that hardly differs from nothing has no scale: everything in one bin then, and sorted.
    const double per_bin = half_width > 0 ? kBins / half_width : 0;
    const double scale = std::isfinite(per_bin) ? per_bin : 0;
    for (std::size_t i = 0; i < values.size(); ++i) {
      const double v = values[i];
      const double away = v - mean;
      deviations += away;
      squares += away * away;
      const auto place = static_cast<std::uint32_t>((v / 2 - from) * scale);
      bin_[i] = static_cast<std::uint16_t>(std::min(place, kBins - 1));
      ++counts_[bin_[i]];
    }
  }

  double deviations = 0, squares = 0;

  Tails tails(std::size_t count) const {
    std::uint32_t low_bin = 0, high_bin = kBins - 1;
    std::size_t low_count = counts_[low_bin], high_count = counts_[high_bin];
    while (low_count < count) low_count += counts_[++low_bin];
    while (high_count < count) high_count += counts_[--high_bin];

    Tails tails{std::vector<double>(low_count), std::vector<double>(high_count)};
    std::array<std::size_t, kBins> low_next{}, high_next{};
    for (std::size_t b = 1; b <= low_bin; ++b) low_next[b] = low_next[b - 1] + counts_[b - 1];
    for (std::size_t b = high_bin + 1; b < kBins; ++b) high_next[b] = high_next[b - 1] + counts_[b - 1];
    for (std::size_t i = 0; i < values_.size(); ++i) {
      const std::uint16_t b = bin_[i];
      if (b <= low_bin) tails.low[low_next[b]++] = values_[i];
      if (b >= high_bin) tails.high[high_next[b]++] = values_[i];
    }
    // After the placing, next[b] is where bin b ends.
    for (std::size_t b = 0, begin = 0; b <= low_bin; begin = low_next[b++]) sort_between(tails.low, begin, low_next[b]);
    for (std::size_t b = high_bin, begin = 0; b < kBins; begin = high_next[b++]) sort_between(tails.high, begin, high_next[b]);
    tails.low.resize(count);
    tails.high.erase(tails.high.begin(), tails.high.end() - static_cast<std::ptrdiff_t>(count));
    return tails;
  }

 private:
  static constexpr std::uint32_t kBins = 8192;

  static void sort_between(std::vector<double>& values, std::size_t begin, std::size_t end) {
    std::sort(values.begin() + static_cast<std::ptrdiff_t>(begin), values.begin() + static_cast<std::ptrdiff_t>(end));
  }

  std::span<const double> values_;
  std::vector<std::uint16_t> bin_;
  std::array<std::size_t, kBins> counts_{};
};

TrialResult summary_of(std::span<const double> values, const Running& all, double confidence) {
  if (values.size() < 2) return {kNan, kNan, kNan, kNan, kNan, kNan};
  TrialResult result;
  const double n = static_cast<double>(values.size());
  const double mean = all.sum / n;
  const Binned binned(values, all, mean);
  // The sum of deviations corrects the rounding of the mean itself.
  result.mean = mean + binned.deviations / n;
  result.standard_uncertainty =
      std::sqrt(std::max(0.0, binned.squares - binned.deviations * binned.deviations / n) / (n - 1));

  // JCGM 101, 7.7: q values inside, the interval runs from the r-th to the (r+q)-th sorted value, r = 1 ... M - q.
  const std::size_t m = values.size();
  const std::size_t q = std::clamp<std::size_t>(static_cast<std::size_t>(std::lround(confidence * n)), 1, m - 1);
  const std::size_t choices = m - q;
  const Tails tails = binned.tails(choices);
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
  // Row by row and plain: for a handful of inputs a matrix product's call costs more than its sums.
  std::vector<double> roots, means;
  for (Eigen::Index i = 0; i < group.mean.size(); ++i) {
    means.push_back(group.mean[i]);
    for (Eigen::Index j = 0; j < group.mean.size(); ++j) roots.push_back(root(i, j));
  }

  // One row of all trials per output; a share writes to its own part and tells how many of its trials are good.
  // Left as the memory comes: each worker is the first to touch its part.
  std::vector<std::unique_ptr<double[]>> rows(output_count);
  for (auto& row : rows) row = std::make_unique_for_overwrite<double[]>(trials);
  std::vector<std::array<Running, kShares>> running(output_count);
  std::array<std::size_t, kShares> good{};
  const auto begin_of = [&](std::size_t share) { return trials * share / kShares; };
  for_each_index(kShares, threads, [&](std::size_t share) {
    Random random(seed, share);
    std::vector<double> inputs(independent.size() + group_size), outputs(output_count);
    std::vector<Running> sums(output_count);
    std::vector<double> z(group_size);
    std::size_t at = begin_of(share);
    for (std::size_t trial = begin_of(share); trial < begin_of(share + 1); ++trial) {
      for (std::size_t i = 0; i < independent.size(); ++i) inputs[i] = independent[i].value + draw(random, independent[i].law);
      for (double& component : z) component = random.normal();
      for (std::size_t i = 0; i < group_size; ++i) {
        double moved = 0;
        for (std::size_t j = 0; j < group_size; ++j) moved += roots[i * group_size + j] * z[j];
        inputs[independent.size() + i] = moved + means[i];
      }
      std::fill(outputs.begin(), outputs.end(), kNan);
      f(inputs, outputs);
      if (!std::all_of(outputs.begin(), outputs.end(), [](double v) { return std::isfinite(v); })) continue;
      for (std::size_t k = 0; k < output_count; ++k) {
        rows[k][at] = outputs[k];
        sums[k].add(outputs[k]);
      }
      ++at;
    }
    good[share] = at - begin_of(share);
    for (std::size_t k = 0; k < output_count; ++k) running[k][share] = sums[k];
  });

  TrialReport report;
  report.trials = trials;
  report.outputs.resize(output_count);
  std::size_t kept = 0;
  for (const std::size_t n : good) kept += n;
  report.failed = trials - kept;
  for_each_index(output_count, threads, [&](std::size_t k) {
    double* const row = rows[k].get();
    double* to = row;
    for (std::size_t share = 0; share < kShares; ++share) {   // close the gaps that failed trials left
      const double* const from = row + begin_of(share);
      to = to == from ? to + good[share] : std::copy(from, from + good[share], to);
    }
    Running all;
    for (const Running& share : running[k]) all.add(share);
    report.outputs[k] = summary_of({row, kept}, all, confidence);
  });
  return report;
}

}  // namespace coilassay
