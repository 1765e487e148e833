// Claims about fit_damped_sine and fit_two_damped_sines on records drawn at random (one seed, about half a minute):
//
//   bound      variance at most 1.05 times the Cramer-Rao bound, pooled over Q 0.7 to 1000 and 20 to 60 dB
//   (unquantised,
//              7200 records), 95 % intervals cover 93 to 97 %
//   failures   none in 6000 records from Q 0.35 to 1000, 20 to 60 dB
//   rounding   8 to 12 bits and 6: no cell of (Q, SNR, bits) covers less than 88 % where noise is at least half a step,
//              records with noise under 0.3 steps cover at least 93 %, with phase, offset and amplitude drawn per
//              record and with one fixed signal per cell
//   two modes  amplitude ratio 0.5, from one decay rate apart, 20 to 60 dB: no failure, variance within 1.3 of the
//   bound
//
// Exit 1 when a limit is missed. Argument: records per cell in per cent of the full size (default 100).
#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <vector>

#include "base/parallel.h"
#include "base/random.h"
#include "fitting/damped_sine.h"
#include "tests/fitting/ringing.h"
#include "tests/proof/slack.h"

namespace {

using namespace coilassay;
using test::Ringing;

constexpr unsigned kThreads = 2;

int percent = 100;
bool all_kept = true;
Slack slack;

std::size_t of_full(std::size_t records) {
  return std::max<std::size_t>(1, records * static_cast<std::size_t>(percent) / 100);
}

void claim(bool kept, const char* what, double figure, double limit) {
  std::printf("%s  %s: %.4g (limit %.4g)\n", kept ? "kept  " : "MISSED", what, figure, limit);
  all_kept = all_kept && kept;
}

/// Errors of one parameter against the bound and against the stated uncertainty.
struct Errors {
  double over_bound = 0, square = 0, stated = 0;
  std::size_t covered = 0, count = 0;
  void add(double error, double u, double bound) {
    over_bound += error * error / (bound * bound);
    square += error * error;
    stated += u * u;
    covered += std::abs(error) < 1.96 * u ? 1U : 0U;
    ++count;
  }
  void add(const Errors& o) {
    over_bound += o.over_bound;
    square += o.square;
    stated += o.stated;
    covered += o.covered;
    count += o.count;
  }
  double ratio() const { return over_bound / static_cast<double>(count); }
  double honesty() const { return std::sqrt(stated / square); }
  double coverage() const { return 100 * static_cast<double>(covered) / static_cast<double>(count); }
};

/// 93 to 97 %, as far as so few records can tell.
bool within(const Errors& e) {
  const double give = 100 * slack.share(static_cast<double>(e.count));
  return e.coverage() >= 93 - give && e.coverage() <= 97 + give;
}

struct Record {
  bool fitted = false;
  double error[2] = {}, u[2] = {}, bound[2] = {};  // of a and of the natural frequency
};

double frequency_variance(const DampedSine& m, const Eigen::MatrixXd& covariance) {
  const double w = m.natural_omega();
  const Eigen::Vector2d slope(m.a / w, 1 / (2 * w));
  return slope.dot(covariance.topLeftCorner<2, 2>() * slope);
}

Record fit_record(const Ringing& ringing, const std::vector<double>& y, double step) {
  Record record;
  const auto fit = fit_damped_sine(y, {.resolution = step});
  if (!fit || !fit->fit.usable()) return record;
  record.fitted = true;
  record.error[0] = fit->model.a - ringing.a;
  record.error[1] = fit->model.natural_omega() - ringing.omega0;
  record.u[0] = fit->fit.standard_uncertainty(0);
  record.u[1] = std::sqrt(frequency_variance(fit->model, fit->fit.covariance));
  return record;
}

/// Bound of a and of the natural frequency, by the full information matrix of the samples.
void fill_bound(const Ringing& ringing, Record& record) {
  const DampedSine m = ringing.truth();
  Eigen::Matrix<double, 5, 5> information = Eigen::Matrix<double, 5, 5>::Zero();
  std::vector<double> c(ringing.samples), s(ringing.samples);
  evaluate({m.a, m.q, 1, 0, 0}, 0, c);
  evaluate({m.a, m.q, 0, 1, 0}, 0, s);
  for (std::size_t i = 0; i < ringing.samples; ++i) {
    const double n = static_cast<double>(i);
    const double x = m.q * n * n;
    const double ds = std::abs(x) < 0.01 ? -std::exp(-m.a * n) * n * n * n / 6 * (1 - x / 10 + x * x / 280)
                                         : (n * c[i] - s[i]) / (2 * m.q);
    Eigen::Matrix<double, 5, 1> slope;
    slope << -n * (m.p * c[i] + m.s * s[i]), -m.p * n * s[i] / 2 + m.s * ds, c[i], s[i], 1;
    information.selfadjointView<Eigen::Lower>().rankUpdate(slope);
  }
  const Eigen::Matrix<double, 5, 5> full = information.selfadjointView<Eigen::Lower>();
  const Eigen::Matrix<double, 5, 1> scale = full.diagonal().cwiseSqrt().cwiseInverse();
  const Eigen::MatrixXd scaled = scale.asDiagonal() * full * scale.asDiagonal();
  const Eigen::MatrixXd inverse =
      scale.asDiagonal() * scaled.ldlt().solve(Eigen::MatrixXd::Identity(5, 5)) * scale.asDiagonal();
  record.bound[0] = ringing.sigma * std::sqrt(inverse(0, 0));
  record.bound[1] = ringing.sigma * std::sqrt(frequency_variance(m, inverse));
}

void prove_bound() {
  std::printf("bound: variance over Cramer-Rao, u over scatter, coverage of 95 %% intervals\n");
  std::printf("%7s %5s | %7s %7s | %6s %6s | %6s %6s | failed\n", "Q", "dB", "v/C a", "v/C w", "u/s a", "u/s w",
              "cov a", "cov w");
  Errors pooled[2];
  std::size_t failed = 0;
  for (const double quality : {0.7, 1.0, 3.0, 10.0, 100.0, 1000.0}) {
    for (const double snr : {20.0, 40.0, 60.0}) {
      std::vector<Record> records(of_full(400));
      for_each_index(records.size(), kThreads, [&](std::size_t i) {
        Random random(i, static_cast<std::uint64_t>(quality * 1000 + snr));
        Ringing ringing = Ringing::of(quality, snr, 10000);
        ringing.phase = random.uniform(0, 6.283185307);
        records[i] = fit_record(ringing, ringing.record(random.bits()), std::nan(""));
        fill_bound(ringing, records[i]);
      });
      Errors cell[2];
      std::size_t lost = 0;
      for (const Record& r : records) {
        lost += r.fitted ? 0U : 1U;
        for (int p = 0; p < 2 && r.fitted; ++p) cell[p].add(r.error[p], r.u[p], r.bound[p]);
      }
      std::printf("%7g %5g | %7.3f %7.3f | %6.2f %6.2f | %6.1f %6.1f | %zu\n", quality, snr, cell[0].ratio(),
                  cell[1].ratio(), cell[0].honesty(), cell[1].honesty(), cell[0].coverage(), cell[1].coverage(), lost);
      for (int p = 0; p < 2; ++p) pooled[p].add(cell[p]);
      failed += lost;
    }
  }
  claim(pooled[0].ratio() <= 1.05 + slack.variance(static_cast<double>(pooled[0].count)), "variance of a over the bound, pooled", pooled[0].ratio(), 1.05);
  claim(pooled[1].ratio() <= 1.05 + slack.variance(static_cast<double>(pooled[1].count)), "variance of the frequency over the bound, pooled", pooled[1].ratio(), 1.05);
  for (const Errors& e : pooled) {
    claim(within(e), "coverage, pooled (93 to 97)", e.coverage(), 95);
  }
  claim(failed == 0, "failed fits", static_cast<double>(failed), 0);
}

void prove_no_failures() {
  const std::size_t count = of_full(6000);
  std::vector<Record> records(count);
  std::vector<double> quality(count);
  for_each_index(count, kThreads, [&](std::size_t i) {
    Random random(i, 4242);
    quality[i] = std::exp(random.uniform(std::log(0.35), std::log(1000.0)));
    Ringing ringing = Ringing::of(quality[i], random.uniform(20, 60), 10000);
    ringing.phase = random.uniform(0, 6.283185307);
    records[i] = fit_record(ringing, ringing.record(random.bits()), std::nan(""));
    fill_bound(ringing, records[i]);
  });
  std::size_t failed = 0;
  Errors low[2];
  for (std::size_t i = 0; i < count; ++i) {
    if (!records[i].fitted) {
      ++failed;
      std::printf("  failed: record %zu, Q %.3f\n", i, quality[i]);
    }
    for (int p = 0; p < 2 && records[i].fitted && quality[i] < 0.7; ++p) {
      low[p].add(records[i].error[p], records[i].u[p], records[i].bound[p]);
    }
  }
  std::printf(
      "\nfailures: Q 0.35 to 1000, 20 to 60 dB; below Q 0.7 (%zu records): v/C a %.3f w %.3f, coverage %.1f %.1f\n",
      low[0].count, low[0].ratio(), low[1].ratio(), low[0].coverage(), low[1].coverage());
  claim(failed == 0, "failed fits of 6000", static_cast<double>(failed), 0);
}

void prove_rounding(bool fixed_signal) {
  std::printf("\nrounding, %s\n",
              fixed_signal ? "one fixed signal per cell" : "phase, offset and amplitude drawn per record");
  std::printf("%4s %5s %7s %7s | %6s %6s | %6s %6s | failed\n", "bits", "dB", "Q", "steps", "u/s a", "u/s w", "cov a",
              "cov w");
  Errors undithered, dithered;
  double worst = 100;
  std::size_t failed = 0;
  for (const int bits : {6, 8, 10, 12}) {
    for (const double snr : {20.0, 40.0, 60.0}) {
      for (const double quality : {0.7, 1.0, 3.0, 10.0, 100.0, 1000.0}) {
        const double step = 2.5 / std::pow(2, bits);
        std::vector<Record> records(of_full(200));
        const double noise = Ringing::of(quality, snr, 10000).sigma / step;
        for_each_index(records.size(), kThreads, [&](std::size_t i) {
          Random random(i, static_cast<std::uint64_t>(quality * 1000 + snr * 7 + bits));
          Ringing ringing = Ringing::of(quality, snr, 10000);
          if (!fixed_signal) {
            ringing.phase = random.uniform(0, 6.283185307);
            ringing.offset = 0.03 + step * random.uniform(-0.5, 0.5);
          }
          std::vector<double> y = ringing.record(random.bits());
          const double gain = fixed_signal ? 1 : random.uniform(0.9, 1);
          for (double& v : y) v *= gain;
          records[i] = fit_record(ringing, test::rounded(std::move(y), step), step);
        });
        Errors cell[2];
        std::size_t lost = 0;
        for (const Record& r : records) {
          lost += r.fitted ? 0U : 1U;
          for (int p = 0; p < 2 && r.fitted; ++p) cell[p].add(r.error[p], r.u[p], 1);
        }
        failed += lost;
        std::printf("%4d %5g %7g %7.3f | %6.2f %6.2f | %6.1f %6.1f | %zu\n", bits, snr, quality, noise,
                    cell[0].honesty(), cell[1].honesty(), cell[0].coverage(), cell[1].coverage(), lost);
        for (const Errors& e : cell) {
          if (noise >= 0.5) worst = std::min(worst, e.coverage());
          (noise >= 0.5 ? dithered : undithered).add(e);
        }
      }
    }
  }
  claim(worst >= 88 || !slack.judges_cells(), "worst cell with noise of at least half a step, coverage", worst, 88);
  claim(within(dithered), "coverage with dither, pooled (93 to 97)",
        dithered.coverage(), 95);
  claim(undithered.coverage() >= 93 - 100 * slack.share(static_cast<double>(undithered.count)), "coverage with noise under 0.3 steps, pooled", undithered.coverage(), 93);
  claim(failed == 0, "failed fits", static_cast<double>(failed), 0);
}

/// Cramer-Rao bound of (a1, q1, a2, q2) for two modes with known noise.
Eigen::Vector4d bound_of_two(const DampedSine& first, const DampedSine& second, std::size_t samples, double sigma) {
  Eigen::MatrixXd information = Eigen::MatrixXd::Zero(9, 9);
  for (std::size_t i = 0; i < samples; ++i) {
    const double n = static_cast<double>(i);
    Eigen::Matrix<double, 9, 1> slope;
    int at = 0;
    for (const DampedSine* m : {&first, &second}) {
      const double w = std::sqrt(m->q), e = std::exp(-m->a * n), c = e * std::cos(w * n), s = e * std::sin(w * n) / w;
      slope.segment<4>(at) << -n * (m->p * c + m->s * s), -m->p * n * s / 2 + m->s * (n * c - s) / (2 * m->q), c, s;
      at += 4;
    }
    slope[8] = 1;
    information += slope * slope.transpose();
  }
  const Eigen::VectorXd scale = information.diagonal().cwiseSqrt().cwiseInverse();
  const Eigen::MatrixXd scaled = scale.asDiagonal() * information * scale.asDiagonal();
  const Eigen::MatrixXd inverse = scaled.ldlt().solve(Eigen::MatrixXd::Identity(9, 9));
  const Eigen::VectorXd bound = sigma * scale.cwiseProduct(inverse.diagonal().cwiseSqrt());
  return {bound[0], bound[1], bound[4], bound[5]};
}

void prove_two_modes() {
  std::printf("\ntwo modes, amplitude ratio 0.5, spacing in decay rates\n");
  std::printf("%7s %8s %5s | %7s %7s | %6s | failed\n", "Q", "spacing", "dB", "v/C a1", "v/C a2", "cov");
  Errors pooled;
  std::size_t failed = 0;
  for (const double quality : {30.0, 200.0}) {
    for (const double spacing : {1.0, 2.0, 4.0, 8.0, 32.0}) {
      for (const double snr : {20.0, 40.0, 60.0}) {
        if (spacing > quality) continue;
        std::vector<Record> records(of_full(60));
        for_each_index(records.size(), kThreads, [&](std::size_t i) {
          Random random(i, static_cast<std::uint64_t>(quality * 1000 + spacing * 100 + snr));
          const std::size_t samples = 10000;
          const Ringing ringing = Ringing::of(quality, snr, samples);
          const double a = ringing.a, w1 = std::sqrt(ringing.q()), w2 = w1 + spacing * a;
          const double phase1 = random.uniform(0, 6.283185307), phase2 = random.uniform(0, 6.283185307);
          const DampedSine first{a, w1 * w1, std::cos(phase1), -std::sin(phase1) * w1, 0.03};
          const DampedSine second{a, w2 * w2, 0.5 * std::cos(phase2), -0.5 * std::sin(phase2) * w2, 0};
          std::vector<double> y(samples);
          for (std::size_t n = 0; n < samples; ++n) {
            const double t = static_cast<double>(n);
            y[n] = std::exp(-a * t) * (std::cos(w1 * t + phase1) + 0.5 * std::cos(w2 * t + phase2)) + 0.03 +
                   ringing.sigma * random.normal();
          }
          const Eigen::Vector4d bound = bound_of_two(first, second, samples, ringing.sigma);
          Record& record = records[i];
          const auto fit = fit_two_damped_sines(y);
          if (!fit || !fit->fit.usable()) return;
          // The smaller may come out larger at 20 dB and one decay rate apart: the modes are told by frequency.
          const int lower = fit->fit.parameters[1] < fit->fit.parameters[5] ? 0 : 4;
          record.error[0] = fit->fit.parameters[lower] - a;
          record.error[1] = fit->fit.parameters[4 - lower] - a;
          record.u[0] = fit->fit.standard_uncertainty(lower);
          record.u[1] = fit->fit.standard_uncertainty(4 - lower);
          record.bound[0] = bound[0];
          record.bound[1] = bound[2];
          // Eight bounds off is another solution, not an error.
          record.fitted = std::abs(record.error[0]) < 8 * bound[0] && std::abs(record.error[1]) < 8 * bound[2];
        });
        Errors cell[2], both;
        std::size_t lost = 0;
        for (const Record& r : records) {
          lost += r.fitted ? 0U : 1U;
          for (int p = 0; p < 2 && r.fitted; ++p) cell[p].add(r.error[p], r.u[p], r.bound[p]);
        }
        both.add(cell[0]);
        both.add(cell[1]);
        pooled.add(both);
        failed += lost;
        std::printf("%7g %8g %5g | %7.2f %7.2f | %6.1f | %zu\n", quality, spacing, snr, cell[0].ratio(),
                    cell[1].ratio(), both.coverage(), lost);
      }
    }
  }
  claim(failed == 0, "failed fits of two modes", static_cast<double>(failed), 0);
  claim(pooled.ratio() <= 1.3 + slack.variance(static_cast<double>(pooled.count)), "variance of the decay rates over the bound, pooled", pooled.ratio(), 1.3);
}

}  // namespace

int main(int argc, char** argv) {
  if (argc > 1) percent = std::max(1, std::atoi(argv[1]));
  slack.full = percent >= 100;
  prove_bound();
  prove_no_failures();
  prove_rounding(false);
  prove_rounding(true);
  prove_two_modes();
  std::printf("\n%s\n", all_kept ? "all limits kept" : "a limit was missed");
  return all_kept ? 0 : 1;
}
