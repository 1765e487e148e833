// A lot of 500 ring-downs of 20 000 samples: reading, measuring and judging all units beside reading and digesting their
// files alone, both two units at a time. The verdicts are checked before anything is timed; ledger and report are timed
// apart. Not part of any verdict: exit 1 only for a wrong answer.
//
// usage: inspect_benchmark [UNITS [SAMPLES]]   (default 500 20000; needs 30 bytes of disk for each sample)
#include <algorithm>
#include <chrono>
#include <cstdio>
#include <cstdlib>
#include <ctime>
#include <filesystem>
#include <fstream>
#include <string>
#include <vector>

#include "app/runs/inspect_run.h"
#include "app/runs/lot_outputs.h"
#include "app/runs/simulate_run.h"
#include "base/parallel.h"

namespace {

using namespace coilassay;
namespace fs = std::filesystem;

double seconds_now() {
  return std::chrono::duration<double>(std::chrono::steady_clock::now().time_since_epoch()).count();
}

struct Timed {
  double clock = 1e9, busy = 1e9;
};

template <class Work>
void time_into(Timed& best, const Work& work) {
  const double began = seconds_now();
  const std::clock_t busy = std::clock();
  work();
  best.clock = std::min(best.clock, seconds_now() - began);
  best.busy = std::min(best.busy, static_cast<double>(std::clock() - busy) / CLOCKS_PER_SEC);
}

RunContext writing() {
  RunContext context;
  context.threads = 2;
  context.write = [](const std::string& path, const std::string& contents) -> Result<void> {
    std::ofstream(path, std::ios::binary) << contents;
    return {};
  };
  return context;
}

std::vector<std::string> make_lot(const fs::path& folder, std::size_t units, std::size_t samples) {
  fs::create_directories(folder / "lot");
  std::ofstream(folder / "bench.toml") << "[voltage]\ninput_capacitance = \"13 pF ± 2 pF\"\ninput_resistance = \"10 Mohm\"\n"
                                          "[[capacitor]]\nvalue = \"10 nF ± 0.2 %\"\ndissipation_factor = \"0.0003\"\n";
  std::ofstream(folder / "part.toml") << "[part]\nname = \"drum-47\"\n[[limit]]\nquantity = \"L_s\"\nnominal = \"47 uH ± 20 %\"\n"
                                         "test = \"ringdown\"\n[[limit]]\nquantity = \"R_s\"\nmax = \"1 ohm\"\ntest = \"ringdown\"\n"
                                         "[test.ringdown]\nbench = \"bench.toml\"\n";
  std::vector<std::string> files;
  for (std::size_t i = 0; i < units; ++i) {
    files.push_back((folder / "lot" / (std::to_string(1000 + i) + ".ringdown.csv")).string());
  }
  for_each_index(units, 2, [&](std::size_t i) {
    SimulateRingDownJob job;
    job.capture_file = files[i];
    job.bench.samples = samples;
    job.bench.seed = i + 1;
    job.bench.noise_v = 2e-3;
    job.bench.bits = 12;
    job.bench.inductance_h = 47e-6 * (1 + 1e-4 * static_cast<double>(i % 100));
    if (!run_simulate_ring_down(job, writing())) std::abort();
  });
  return files;
}

}  // namespace

int main(int argc, char** argv) {
  const std::size_t units = argc > 1 ? static_cast<std::size_t>(std::atoll(argv[1])) : 500;
  const std::size_t samples = argc > 2 ? static_cast<std::size_t>(std::atoll(argv[2])) : 20000;
  const fs::path folder = fs::temp_directory_path() / ("inspect_benchmark_" + std::to_string(std::rand()));
  const std::vector<std::string> files = make_lot(folder, units, samples);
  const RunContext context = writing();
  InspectJob job;
  job.sheet = (folder / "part.toml").string();
  job.folder = (folder / "lot").string();

  auto lot = run_inspect(job, context, {});
  bool right = lot && lot->decision.decision == LotResult::accept && lot->units.size() == units;
  for (std::size_t i = 0; right && i < units; ++i) {
    const LimitVerdict& l = lot->units[i].verdict.limits[0];
    const double truth = 47e-6 * (1 + 1e-4 * static_cast<double>(i % 100));
    right = l.value && l.u && std::abs(*l.value - truth) < 4 * *l.u;
  }
  if (!right) {
    std::printf("WRONG ANSWER\n");
    fs::remove_all(folder);
    return 1;
  }
  Timed reading, inspecting, recording, report;
  for (int round = 0; round < 3; ++round) {
    time_into(reading, [&] {
      for_each_index(files.size(), 2, [&](std::size_t i) {
        ReadOptions options;
        options.threads = 1;
        if (!read_recording(files[i], options)) std::abort();
      });
    });
    time_into(inspecting, [&] { lot = run_inspect(job, context, {}); });
    InspectJob with_ledger = job;
    with_ledger.ledger = (folder / ("ledger-" + std::to_string(round))).string();
    time_into(recording, [&] { lot = run_inspect(with_ledger, context, {}); });
  }
  time_into(report, [&] {
    if (!write_lot_report(*lot, (folder / "lot.html").string(), context)) std::abort();
  });
  fs::remove_all(folder);
  std::printf("%zu units of %zu samples: reading and digesting %.2f s (busy %.2f s), with measuring and judging %.2f s (busy %.2f s): %.2f, "
              "%.2f times (goal 3: %s); with the ledger %.2f s; report %.2f s\n",
              units, samples, reading.clock, reading.busy, inspecting.clock, inspecting.busy, inspecting.clock / reading.clock,
              inspecting.busy / reading.busy, std::min(inspecting.clock / reading.clock, inspecting.busy / reading.busy) <= 3 ? "kept" : "missed",
              recording.clock, report.clock);
  return 0;
}
