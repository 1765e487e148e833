// Speed of welch_spectra against what a practitioner writes with SciPy (broadband_peer.py), segments of 4096. Both answers
// are checked against the truth before anything is timed; runs are interleaved, and ratios of one session are printed, by
// the clock and by processor time. Exit 1 only for a wrong answer.
//
// usage (in the source folder): broadband_benchmark [SAMPLES...]   (default 10000 1000000 10000000)
#include <algorithm>
#include <chrono>
#include <cmath>
#include <complex>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <numbers>
#include <string>
#include <vector>

#include "base/random.h"
#include "fitting/transfer_estimate.h"

namespace {

using namespace coilassay;

/// Noise as current; voltage of a resistance and of the step from sample to sample, 20 (i[n] - i[n-1]) + i[n], with noise.
struct Record {
  std::vector<double> i, v;
};

std::complex<double> truth_at(double cycles_per_sample) {
  return 1.0 + 20.0 * (1.0 - std::polar(1.0, -2 * std::numbers::pi * cycles_per_sample));
}

Record record_of(std::size_t samples) {
  Record r;
  Random random(1);
  double before = 0;
  for (std::size_t n = 0; n < samples; ++n) {
    const double now = random.normal();
    r.i.push_back(now);
    r.v.push_back(now + 20 * (now - before) + random.normal());
    before = now;
  }
  return r;
}

double seconds_now() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

/// False when an answer is wrong.
bool compare(std::size_t samples) {
  constexpr std::size_t kSegment = 4096;
  const Record r = record_of(samples);
  const std::string file =
      (std::filesystem::temp_directory_path() / ("broadband_benchmark_" + std::to_string(samples) + ".f64")).string();
  {
    std::ofstream out(file, std::ios::binary);
    for (const auto* y : {&r.i, &r.v}) {
      out.write(reinterpret_cast<const char*>(y->data()), static_cast<std::streamsize>(y->size() * sizeof(double)));
    }
  }
  const std::size_t bin = kSegment / 10;
  const std::complex<double> truth = truth_at(static_cast<double>(bin) / kSegment);
  const TransferSpectra checked = welch_spectra(r.i, r.v, kSegment);
  const double error = random_error_of(checked.coherence(bin), checked.averages());
  if (!(std::abs(checked.h1(bin) / truth - 1.0) < 8 * error + 0.02)) {
    std::printf("%9zu  WRONG ANSWER\n", samples);
    return false;
  }
  double ours = 1e9, peer = 1e9, peer_busy = 1e9, used = 0;
  for (int round = 0; round < 5; ++round) {
    for (int k = 0; k < (samples < 100000 ? 30 : 3); ++k) {
      const double began = seconds_now();
      const TransferSpectra s = welch_spectra(r.i, r.v, kSegment);
      for (std::size_t b = 1; b < kSegment / 2; ++b) used += random_error_of(s.coherence(b), s.averages()) * std::abs(s.h1(b));
      ours = std::min(ours, seconds_now() - began);
    }
    std::FILE* pipe = ::popen(("/usr/bin/python3 tests/benchmarks/broadband_peer.py " + file + " 4096").c_str(), "r");
    double clock = 0, busy = 0, z = 0, u = 0;
    const int read = pipe == nullptr ? 0 : std::fscanf(pipe, "%lf %lf %lf %lf", &clock, &busy, &z, &u);
    if (pipe != nullptr) ::pclose(pipe);
    if (read != 4 || !(std::fabs(z / std::abs(truth) - 1) < 8 * u + 0.02)) {
      std::printf("%9zu  the peer did not run, or its answer is wrong\n", samples);
      return false;
    }
    peer = std::min(peer, clock);
    peer_busy = std::min(peer_busy, busy);
  }
  std::filesystem::remove(file);
  std::printf("%9zu  ours %9.3f ms (%5.1f ns/sample)   peer %9.3f ms   ratio %5.1f by the clock, %5.1f of the processor%s\n", samples,
              ours * 1e3, ours / static_cast<double>(samples) * 1e9, peer * 1e3, peer / ours, peer_busy / ours,
              used > 0 ? "" : " ?");
  return true;
}

}  // namespace

int main(int count, char** words) {
  std::vector<std::size_t> sizes;
  for (int k = 1; k < count; ++k) sizes.push_back(static_cast<std::size_t>(std::strtoull(words[k], nullptr, 10)));
  if (sizes.empty()) sizes = {10000, 1000000, 10000000};
  bool right = true;
  for (const std::size_t samples : sizes) right = compare(samples) && right;
  return right ? 0 : 1;
}
