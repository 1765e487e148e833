#include "fitting/spectrum.h"

#include <fftw3.h>

#include <algorithm>
#include <cassert>
#include <map>
#include <memory>
#include <mutex>

namespace coilassay {
namespace {

struct PlanDeleter {
  void operator()(fftw_plan plan) const { fftw_destroy_plan(plan); }
};
using Plan = std::unique_ptr<std::remove_pointer_t<fftw_plan>, PlanDeleter>;

// FFTW's planner is not thread-safe; executing a plan on other arrays is. ESTIMATE never times anything, so the same
// length gives the same operations every time, and UNALIGNED allows ordinary vectors.
Plan make_plan(int n) {
  std::vector<double> in(static_cast<std::size_t>(n));
  std::vector<std::complex<double>> out(static_cast<std::size_t>(n / 2 + 1));
  Plan plan(fftw_plan_dft_r2c_1d(n, in.data(), reinterpret_cast<fftw_complex*>(out.data()),
                                 FFTW_ESTIMATE | FFTW_UNALIGNED | FFTW_PRESERVE_INPUT));
  assert(plan && "FFTW plans every length");
  return plan;
}

std::mutex& planner() {
  static std::mutex mutex;
  return mutex;
}

// Plans of powers of two are kept: the same few lengths come again for every record.
fftw_plan kept_plan(int n) {
  static std::map<int, Plan> plans;
  const std::lock_guard lock(planner());
  Plan& plan = plans[n];
  if (!plan) plan = make_plan(n);
  return plan.get();
}

}  // namespace

std::vector<std::complex<double>> fourier(std::span<const double> samples) {
  assert(!samples.empty());
  const std::size_t n = samples.size();
  std::vector<std::complex<double>> bins(n / 2 + 1);
  // r2c with PRESERVE_INPUT leaves the input alone, but FFTW's interface is not const.
  double* in = const_cast<double*>(samples.data());
  auto* out = reinterpret_cast<fftw_complex*>(bins.data());
  if ((n & (n - 1)) == 0) {
    fftw_execute_dft_r2c(kept_plan(static_cast<int>(n)), in, out);
  } else {
    Plan plan = [n] {
      const std::lock_guard lock(planner());
      return make_plan(static_cast<int>(n));
    }();
    fftw_execute_dft_r2c(plan.get(), in, out);
    const std::lock_guard lock(planner());
    plan.reset();
  }
  return bins;
}

struct RepeatedFourier::State {
  struct Free {
    void operator()(double* p) const { fftw_free(p); }
    void operator()(fftw_complex* p) const { fftw_free(p); }
  };
  std::size_t samples = 0;
  std::unique_ptr<double, Free> in;
  std::unique_ptr<fftw_complex, Free> out;
  Plan plan;
};

RepeatedFourier::RepeatedFourier(std::size_t samples) : state_(std::make_unique<State>()) {
  assert(samples > 0);
  state_->samples = samples;
  state_->in.reset(fftw_alloc_real(samples));
  state_->out.reset(fftw_alloc_complex(samples / 2 + 1));
  const std::lock_guard lock(planner());
  state_->plan.reset(fftw_plan_dft_r2c_1d(static_cast<int>(samples), state_->in.get(), state_->out.get(),
                                          FFTW_ESTIMATE | FFTW_DESTROY_INPUT));
  assert(state_->plan && "FFTW plans every length");
}

RepeatedFourier::~RepeatedFourier() {
  const std::lock_guard lock(planner());
  state_->plan.reset();
}

std::span<double> RepeatedFourier::input() { return {state_->in.get(), state_->samples}; }

std::span<const std::complex<double>> RepeatedFourier::run() {
  fftw_execute(state_->plan.get());
  return {reinterpret_cast<const std::complex<double>*>(state_->out.get()), state_->samples / 2 + 1};
}

std::vector<double> power_spectrum(std::span<const double> samples) {
  double mean = 0;
  for (const double v : samples) mean += v;
  mean /= static_cast<double>(samples.size());
  std::vector<double> centred(samples.begin(), samples.end());
  for (double& v : centred) v -= mean;
  const auto bins = fourier(centred);
  std::vector<double> power(bins.size());
  std::transform(bins.begin(), bins.end(), power.begin(), [](const std::complex<double>& x) { return std::norm(x); });
  return power;
}

}  // namespace coilassay
