// One door to every way of measuring.
#include "app/runs/measure_unit.h"

#include <gmock/gmock.h>

#include <complex>
#include <numbers>
#include <sstream>

#include "app/runs/ring_down_run.h"
#include "app/runs/simulate_ramp_run.h"
#include "app/runs/simulate_resistance_run.h"
#include "app/runs/simulate_run.h"
#include "app/runs/simulate_sine_run.h"
#include "app/runs/simulate_sweep_run.h"
#include "base/parallel.h"
#include "report/result_json.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

/// Writes what a simulation makes into a folder.
RunContext writing_into(const TemporaryFolder& folder) {
  RunContext context;
  context.write = [&folder](const std::string& path, const std::string& contents) -> Result<void> {
    folder.file(path, contents);
    return {};
  };
  return context;
}

std::string ring(const TemporaryFolder& folder, const std::string& name, std::uint64_t seed) {
  SimulateRingDownJob job;
  job.capture_file = name;
  job.bench.noise_v = 2e-3;
  job.bench.samples = 3000;
  job.bench.seed = seed;
  EXPECT_TRUE(run_simulate_ring_down(job, writing_into(folder)));
  return folder / name;
}

UnitTest ring_test(const std::string& file) {
  UnitTest test;
  test.kind = "ringdown";
  test.files = {file};
  test.stated.capacitors = {{.value = StatedValue::rectangular(10e-9, 1e-10, Unit::farad), .dissipation_factor = {}}};
  return test;
}

TEST(MeasureUnit, SaysTheSameAsTheCommandOfThatName) {
  const TemporaryFolder folder;
  const UnitTest test = ring_test(ring(folder, "a.csv", 1));
  const auto through_the_door = measure_unit(test, {});
  ASSERT_TRUE(through_the_door) << through_the_door.error().finding;
  RingDownJob job;
  job.files = test.files;
  job.stated = test.stated;
  const auto direct = run_ring_down(job, {});
  ASSERT_TRUE(direct);
  EXPECT_EQ(to_json(*through_the_door, "p"), to_json(*direct, "p"));
  EXPECT_NE(through_the_door->find("L_s"), nullptr);
}

TEST(MeasureUnit, KnowsRampSineSweepAndResistance) {
  const TemporaryFolder folder;
  const RunContext context = writing_into(folder);
  SimulateRampJob ramp;
  ramp.capture_file = "r.csv";
  ASSERT_TRUE(run_simulate_ramp(ramp, context));
  SimulateSineJob sine;
  sine.capture_file = "s.csv";
  ASSERT_TRUE(run_simulate_sine(sine, context));
  SimulateResistanceJob resistance;
  resistance.capture_file = "d.csv";
  ASSERT_TRUE(run_simulate_resistance(resistance, context));
  SimulateSweepJob sweep;
  sweep.sweep_file = "z.csv";
  ASSERT_TRUE(run_simulate_sweep(sweep, context));
  for (const auto& [kind, file, leading] : {std::tuple{"ramp", "r.csv", "L_0"}, {"sine", "s.csv", "Z"},
                                            {"sweep", "z.csv", "L"}, {"resistance", "d.csv", "R_dc"}}) {
    UnitTest test;
    test.kind = kind;
    test.files = {folder / file};
    test.at_hz = {100e3};
    const auto measured = measure_unit(test, {});
    ASSERT_TRUE(measured) << kind << ": " << measured.error().finding;
    EXPECT_EQ(measured->test, kind);
    EXPECT_NE(measured->find(leading), nullptr) << kind;
  }
}

TEST(MeasureUnit, TakesASweepFromTheSeriesConnectionWhenTheSheetSaysSo) {
  const TemporaryFolder folder;
  // A two-port file of a part in series between 50 ohm ports: S21 = 2 Z0/(2 Z0 + Z), here for Z = 1 + j 2 pi f 100 uH.
  std::string file = "# Hz S RI R 50\n";
  for (double f = 1e4; f < 2e6; f *= 1.2) {
    const std::complex<double> z(1, 2 * std::numbers::pi * f * 100e-6);
    const std::complex<double> through = 100.0 / (100.0 + z), back = z / (100.0 + z);
    std::ostringstream row;
    row.precision(15);
    row << f << ' ' << back.real() << ' ' << back.imag() << ' ' << through.real() << ' ' << through.imag() << ' ' << through.real() << ' '
        << through.imag() << ' ' << back.real() << ' ' << back.imag() << '\n';
    file += row.str();
  }
  UnitTest test;
  test.kind = "sweep";
  test.files = {folder.file("part.s2p", file)};
  test.preparation.connection = Connection::series;
  const auto measured = measure_unit(test, {});
  ASSERT_TRUE(measured) << measured.error().finding;
  const Estimate* inductance = measured->find("L");
  ASSERT_NE(inductance, nullptr);
  EXPECT_NEAR(inductance->quantity.value, 100e-6, 1e-6);
}

TEST(MeasureUnit, GivesTheSameDigitsWhenUnitsAreMeasuredAtOnce) {
  const TemporaryFolder folder;
  std::vector<UnitTest> units;
  for (std::uint64_t i = 0; i < 6; ++i) units.push_back(ring_test(ring(folder, std::to_string(i) + ".csv", i + 1)));
  const auto all = [&](unsigned threads, unsigned inside) {
    std::vector<std::string> results(units.size());
    for_each_index(units.size(), threads, [&](std::size_t i) {
      RunContext context;
      context.threads = inside;
      const auto measured = measure_unit(units[i], context);
      results[i] = measured ? to_json(*measured, "p") : measured.error().finding;
    });
    return results;
  };
  const auto one_by_one = all(1, 1);
  EXPECT_EQ(all(3, 1), one_by_one);
  EXPECT_EQ(all(2, 2), one_by_one);
  EXPECT_NE(one_by_one[0], one_by_one[1]);
}

TEST(MeasureUnit, RefusesWhatItCannotDo) {
  UnitTest test;
  test.kind = "rmap";
  test.files = {"0017.rmap.csv"};
  EXPECT_THAT(measure_unit(test, {}).error().remedy, HasSubstr("ramp"));
  test.kind = "ramp";
  test.files = {"a.csv", "b.csv"};
  EXPECT_THAT(measure_unit(test, {}).error().finding, HasSubstr("2 captures"));
  test.files = {};
  EXPECT_EQ(measure_unit(test, {}).error().problem, Problem::usage);
  test.files = {"missing.csv"};
  EXPECT_EQ(measure_unit(test, {}).error().problem, Problem::unreadable);
}

}  // namespace
}  // namespace coilassay::test
