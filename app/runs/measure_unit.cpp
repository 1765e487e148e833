#include "app/runs/measure_unit.h"

#include <algorithm>
#include <array>
#include <filesystem>

#include "app/runs/coupling_run.h"
#include "app/runs/ramp_run.h"
#include "app/runs/resistance_run.h"
#include "app/runs/ring_down_run.h"
#include "app/runs/sine_run.h"
#include "app/runs/sweep_run.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

/// Jobs share these members, whatever else they have.
template <class Job>
Job job_of(const UnitTest& test) {
  Job job;
  job.segment = test.segment;
  job.bench_sheet = test.bench_sheet;
  job.stated = test.stated;
  job.propagation = test.propagation;
  job.traces = test.traces;
  return job;
}

template <class Job>
Job job_of_files(const UnitTest& test) {
  Job job = job_of<Job>(test);
  job.files = test.files;
  return job;
}

template <class Job>
Job windowed(Job job, const UnitTest& test) {
  job.from_s = test.from_s;
  job.to_s = test.to_s;
  return job;
}

Result<Measurement> measure_coupled(const UnitTest& test, const RunContext& context) {
  auto job = windowed(job_of<CouplingJob>(test), test);
  for (const std::string& file : test.files) {
    if (const auto item = coupling_item_of(file)) {
      job.items.push_back({*item, file});
    } else if (test.files.size() == 1) {
      job.ports_file = file;
    } else {
      return failure(Problem::usage, file, "its name does not say which measurement of the windings it is",
                     "name it as in SERIAL.coupling.primary_open.csv");
    }
  }
  job.at_hz = test.at_hz;
  if (test.dots) job.dots = *test.dots == "same" ? Dots::same : Dots::opposite;
  job.link_inductance = test.link_inductance;
  job.link_resistance = test.link_resistance;
  if (test.winding_resistances.size() == 2) {
    job.winding_resistance = {test.winding_resistances[0], test.winding_resistances[1]};
  }
  return run_coupling(job, context);
}

struct Kind {
  std::string_view name;
  std::size_t most_files;
  Result<Measurement> (*measure)(const UnitTest&, const RunContext&);
};

constexpr std::size_t kMany = 1000;

const std::array kKinds = {
    Kind{"ringdown", kMany,
         [](const UnitTest& test, const RunContext& context) {
           auto job = windowed(job_of_files<RingDownJob>(test), test);
           job.dissipation_factors = test.dissipation_factors;
           return run_ring_down(job, context);
         }},
    Kind{"ramp", 1,
         [](const UnitTest& test, const RunContext& context) {
           auto job = windowed(job_of<RampJob>(test), test);
           job.file = test.files.front();
           return run_ramp(job, context);
         }},
    Kind{"sine", kMany,
         [](const UnitTest& test, const RunContext& context) {
           auto job = windowed(job_of_files<SineJob>(test), test);
           job.biases = test.biases;
           return run_sine(job, context);
         }},
    Kind{"sweep", kMany,
         [](const UnitTest& test, const RunContext& context) {
           auto job = windowed(job_of_files<SweepJob>(test), test);
           job.at_hz = test.at_hz;
           job.preparation = test.preparation;
           return run_sweep(job, context);
         }},
    Kind{"coupling", kMany, measure_coupled},
    Kind{"resistance", kMany,
         [](const UnitTest& test, const RunContext& context) {
           auto job = job_of_files<ResistanceJob>(test);
           job.material = test.material;
           job.temperature_coefficient = test.temperature_coefficient;
           return run_resistance(job, context);
         }},
};

}  // namespace

std::optional<CouplingItem> coupling_item_of(const std::string& path) {
  using enum CouplingItem;
  std::string file = "." + std::filesystem::path(path).filename().string();
  std::replace(file.begin(), file.end(), '-', '_');  // "primary-open" is as good
  for (const CouplingItem item : {primary_open, primary_short, secondary_open, secondary_short, aiding, opposing, ratio_forward,
                                  ratio_reverse}) {
    if (file.find("." + std::string(name(item)) + ".") != std::string::npos) return item;
  }
  return std::nullopt;
}

const std::vector<std::string_view>& unit_test_kinds() {
  static const std::vector<std::string_view> names = [] {
    std::vector<std::string_view> all;
    for (const Kind& kind : kKinds) all.push_back(kind.name);
    return all;
  }();
  return names;
}

Result<Measurement> measure_unit(const UnitTest& test, const RunContext& context) {
  const auto kind = std::find_if(kKinds.begin(), kKinds.end(), [&](const Kind& k) { return k.name == test.kind; });
  const std::string place = test.files.empty() ? "test" : test.files.front();
  if (kind == kKinds.end()) {
    const std::string_view hint = nearest(test.kind, unit_test_kinds());
    return failure(Problem::usage, place, "there is no test '" + shown(test.kind, 60) + "'",
                   hint.empty() ? "the tests are named like the measuring commands: ringdown, ramp, sine, sweep, coupling, resistance"
                                : "did you mean " + std::string(hint) + "?");
  }
  if (test.files.empty()) {
    return failure(Problem::usage, place, "there is no capture for the test " + test.kind, "give the file of the unit");
  }
  if (test.files.size() > kind->most_files) {
    return failure(Problem::usage, place,
                   std::to_string(test.files.size()) + " captures were given for the test " + test.kind +
                       ", which takes one",
                   "keep one of them, or say in the part sheet how often the test is repeated");
  }
  return kind->measure(test, context);
}

}  // namespace coilassay
