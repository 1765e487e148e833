#include <fcntl.h>
#include <gmock/gmock.h>
#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <map>
#include <nlohmann/json.hpp>
#include <sstream>

#include "acquire/sweep_writer.h"
#include "acquire/synthetic/coil_sweep.h"
#include "app/commands/arguments.h"
#include "app/commands/command_list.h"
#include "app/runs/captures.h"
#include "app/runs/outputs.h"
#include "app/runs/ring_down_run.h"
#include "app/runs/simulate_run.h"
#include "base/digest.h"
#include "ledger/ledger.h"
#include "tests/app/fake_console.h"
#include "tests/report/schema_check.h"
#include "tests/support/instrument_bench.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

/// A context whose files are kept in memory.
struct FakeContext {
  FakeContext() {
    context.write = [this](const std::string& path, const std::string& contents) -> Result<void> {
      if (path == refused) return failure(Problem::cannot_write, path, "no room", "make some");
      files[path] = contents;
      return {};
    };
  }
  std::map<std::string, std::string> files;
  std::string refused;
  RunContext context;
};

StatedValue farad(double value) {
  return StatedValue::exact(value, Unit::farad);
}

std::string simulated(const SimulateRingDownJob& job) {
  FakeContext fake;
  EXPECT_TRUE(run_simulate_ring_down(job, fake.context));
  return fake.files.begin()->second;
}

std::string ring_csv() {
  SimulateRingDownJob job;
  job.capture_file = "ring.csv";
  job.bench.noise_v = 2e-3;
  job.bench.samples = 4000;
  return simulated(job);
}

TEST(BenchOfAJob, TakesStatedValuesBeforeThoseOfTheSheet) {
  const TemporaryFolder folder;
  RingDownJob job;
  job.bench_sheet =
      folder.file("bench.toml",
                  "[voltage]\ncolumn = \"CH1\"\ninput_capacitance = \"13 pF\"\ninput_resistance = \"10 Mohm\"\n"
                  "[timebase]\ntolerance = \"25 ppm\"\n"
                  "[[capacitor]]\nvalue = \"10 nF ± 1 %\"\ndissipation_factor = \"0.0005\"\n");
  auto bench = bench_of(job);
  ASSERT_TRUE(bench) << bench.error().place << bench.error().finding;
  ASSERT_EQ(bench->capacitors.size(), 1u);
  EXPECT_EQ(bench->capacitors[0].value.value, 10e-9);
  EXPECT_EQ(bench->voltage.input_capacitance->value, 13e-12);

  job.stated.voltage.input_capacitance = farad(8e-12);
  job.stated.capacitors = {{.value = farad(22e-9), .dissipation_factor = std::nullopt}};
  bench = bench_of(job);
  ASSERT_TRUE(bench);
  EXPECT_EQ(bench->voltage.input_capacitance->value, 8e-12);
  EXPECT_EQ(bench->voltage.input_resistance->value, 10e6) << "what was not stated stays";
  EXPECT_EQ(bench->voltage.column, "CH1");
  ASSERT_EQ(bench->capacitors.size(), 1u);
  EXPECT_EQ(bench->capacitors[0].value.value, 22e-9);
  EXPECT_FALSE(bench->capacitors[0].dissipation_factor) << "another capacitor has a loss of its own";
}

TEST(BenchOfAJob, GivesDissipationToOneCapacitorOrToEach) {
  RingDownJob job;
  const auto factor = [](double value) { return StatedValue::exact(value, Unit::one); };
  job.dissipation_factors = {factor(1e-3)};
  EXPECT_EQ(bench_of(job).error().place, "--capacitor-dissipation");

  for (const double c : {1e-9, 2e-9, 3e-9}) {
    job.stated.capacitors.push_back({.value = farad(c), .dissipation_factor = std::nullopt});
  }
  auto bench = bench_of(job);
  ASSERT_TRUE(bench);
  EXPECT_EQ(bench->capacitors[2].dissipation_factor->value, 1e-3);

  job.dissipation_factors = {factor(1e-3), factor(2e-3)};
  EXPECT_THAT(bench_of(job).error().finding, HasSubstr("2 dissipation factors and 3 capacitors"));
  job.dissipation_factors.push_back(factor(3e-3));
  bench = bench_of(job);
  ASSERT_TRUE(bench);
  EXPECT_EQ(bench->capacitors[1].dissipation_factor->value, 2e-3);
}

TEST(Captures, RefuseStandardInputTwice) {
  const auto read =
      read_captures({.files = {"-", "a.csv", "-"}, .segment = std::nullopt, .reading = {}, .test = "ringdown"}, {});
  ASSERT_FALSE(read);
  EXPECT_EQ(read.error().problem, Problem::usage);
  EXPECT_THAT(read.error().finding, HasSubstr("only once"));
}

TEST(Captures, SendASweepToItsOwnCommand) {
  std::vector<std::string> notes;
  const auto chosen =
      chosen_capture(Sweep{}, "z.s1p", {.files = {}, .segment = {}, .reading = {}, .test = "ringdown"}, notes);
  ASSERT_FALSE(chosen);
  EXPECT_EQ(chosen.error().place, "z.s1p");
  EXPECT_THAT(chosen.error().finding, HasSubstr("ringdown needs a waveform over time"));
  EXPECT_THAT(chosen.error().remedy, HasSubstr("coilassay sweep"));
}

TEST(Captures, NameTheSegmentsThereAreWhenOneIsNot) {
  const TemporaryFolder folder;
  const std::string file = folder.file("ring.csv", ring_csv());
  CaptureRequest request{.files = {file}, .segment = "7", .reading = {}, .test = "ringdown"};
  const auto read = read_captures(request, {});
  ASSERT_FALSE(read);
  EXPECT_EQ(read.error().place, "--segment");
  EXPECT_THAT(read.error().finding, HasSubstr("holds one record"));
  request.segment = "1";
  EXPECT_TRUE(read_captures(request, {}));
}

TEST(SimulateRun, WritesTheSameBytesForTheSameSeed) {
  SimulateRingDownJob job;
  job.capture_file = "a.csv";
  job.bench.noise_v = 1e-3;
  job.bench.samples = 500;
  const std::string first = simulated(job);
  EXPECT_EQ(simulated(job), first);
  job.bench.seed = 2;
  EXPECT_NE(simulated(job), first);
}

TEST(SimulateRun, TellsTheTruthInItsDocument) {
  SimulateRingDownJob job;
  job.capture_file = "a.csv";
  job.truth_file = "a.json";
  job.bench.inductance_h = 22e-6;
  job.bench.resistance_ohm = 0.5;
  job.bench.probe_capacitance_f = 0;
  job.bench.probe_resistance_ohm = 1e12;
  job.bench.samples = 500;
  job.bench.seed = 9007199254740993u;  // no double holds it
  FakeContext fake;
  ASSERT_TRUE(run_simulate_ring_down(job, fake.context));
  const std::string text = fake.files.at("a.json");
  EXPECT_EQ(schema_trouble(text, "truth"), "");
  const auto document = nlohmann::json::parse(text);
  EXPECT_EQ(document.at("seed"), 9007199254740993u);
  EXPECT_EQ(document.at("capture").at("sha256"), sha256_of(fake.files.at("a.csv")));
  for (const RingDownParameter& each : ring_down_parameters()) {
    std::string key(each.name);
    if (each.unit != Unit::one) key += "_" + std::string(symbol(each.unit));
    EXPECT_TRUE(document.at("parameters").contains(key)) << key;
  }
  EXPECT_EQ(document.at("parameters").at("inductance_H"), 22e-6);
  EXPECT_GT(document.at("parameters").at("interval_s"), 0);
  // 22 uH across 10 nF: f_0 = 1/(2 pi sqrt(LC)) = 339.319 kHz (COMPUTED).
  EXPECT_NEAR(document.at("truth").at("f_0").get<double>(), 339319, 2);
  EXPECT_NEAR(document.at("truth").at("L_s").get<double>(), 22e-6, 1e-9);
}

TEST(Outputs, WriteTheReportEvenWhenTheFigureCannotBeStored) {
  Measurement measurement;
  measurement.test = "ringdown";
  FakeContext fake;
  fake.context.now = *parse_utc_time("2026-03-04T10:22:00Z");
  const auto drawn = write_outputs(measurement, {.figure = "a.svg", .report = "a.html"}, fake.context);
  ASSERT_TRUE(drawn);
  EXPECT_FALSE(*drawn) << "there is nothing to draw";
  EXPECT_FALSE(fake.files.contains("a.svg"));
  EXPECT_THAT(fake.files.at("a.html"), HasSubstr("2026-03-04"));

  fake.refused = "a.html";
  EXPECT_EQ(write_outputs(measurement, {.figure = std::nullopt, .report = "a.html"}, fake.context).error().finding,
            "no room");
}

TEST(RingDownRun, MeasuresASimulatedCoil) {
  const TemporaryFolder folder;
  RingDownJob job;
  job.files = {folder.file("ring.csv", ring_csv())};
  job.stated.capacitors = {{.value = farad(10e-9), .dissipation_factor = std::nullopt}};
  job.stated.voltage.input_capacitance = farad(13e-12);
  const auto measured = run_ring_down(job, {});
  ASSERT_TRUE(measured) << measured.error().finding;
  const Estimate* inductance = measured->find("L_s");
  ASSERT_NE(inductance, nullptr);
  EXPECT_LE(inductance->low, 47e-6);
  EXPECT_GE(inductance->high, 47e-6);
}

TEST(RingDownRun, DoesNotPassOverAColumnThatShouldBeSubtracted) {
  const TemporaryFolder folder;
  RingDownJob job;
  job.files = {folder.file("ring.csv", ring_csv())};
  job.bench_sheet = folder.file("bench.toml", "[voltage]\ncolumn = \"CH1\"\nlow_column = \"CH2\"\n");
  const auto measured = run_ring_down(job, {});
  ASSERT_FALSE(measured);
  EXPECT_EQ(measured.error().problem, Problem::missing_column);
  EXPECT_THAT(measured.error().finding, HasSubstr("CH2"));
}

/// Two records in one file: the time starts again.
std::string two_records() {
  std::ostringstream text;
  text << "time [s],CH1 [V]\n";
  for (const double cycles_per_sample : {0.02, 0.03}) {
    for (int i = 0; i < 2000; ++i) {
      text << i << "e-6," << 2 * std::exp(-i / 300.0) * std::sin(6.283185307179586 * cycles_per_sample * i) << '\n';
    }
  }
  return text.str();
}

TEST(RingDownRun, MeasuresTheFirstOfSeveralRecordsAndSaysSo) {
  const TemporaryFolder folder;
  RingDownJob job;
  job.files = {folder.file("two.csv", two_records())};
  const auto first = run_ring_down(job, {});
  ASSERT_TRUE(first) << first.error().finding;
  EXPECT_NEAR(first->find("f_0")->quantity.value, 20e3, 20);
  EXPECT_THAT(first->advice, testing::Contains(HasSubstr("holds 2 records")));
  job.segment = "2";
  const auto second = run_ring_down(job, {});
  ASSERT_TRUE(second) << second.error().finding;
  EXPECT_NEAR(second->find("f_0")->quantity.value, 30e3, 30);
  EXPECT_THAT(second->advice, testing::Not(testing::Contains(HasSubstr("records"))));
  job.segment = "3";
  EXPECT_THAT(run_ring_down(job, {}).error().finding, HasSubstr("holds 2 records, none of them is '3'"));
}

TEST(RingDownCommand, EndsWithThreeWhenThereIsNothingToMeasure) {
  const TemporaryFolder folder;
  std::string flat = "time [s],CH1 [V]\n";
  for (int i = 0; i < 500; ++i) flat += std::to_string(i) + "e-6,0.5\n";
  const std::string file = folder.file("flat.csv", flat);
  EXPECT_EQ(run({"ringdown", file}).code, 3);
  const Ended json = run({"ringdown", file, "--json"});
  EXPECT_EQ(json.code, 3);
  EXPECT_EQ(schema_trouble(json.out, "result"), "");
  EXPECT_EQ(json.error, "");
}

// An option that is declared but never looked at would be one that does nothing.
std::string sweep_csv() {
  std::ostringstream text;
  write_sweep_csv(text, synthetic::simulate_coil_sweep({.noise_ratio = 1e-3})->sweep, SweepColumns::impedance);
  return text.str();
}

TEST(Commands, LookAtEveryOptionTheyDeclare) {
  const TemporaryFolder folder;
  const std::string ring = folder.file("ring.csv", ring_csv());
  synthetic::StandInSetup setup;
  setup.profile = parsed_profile(meter_profile_text("localhost:1"));
  const ServedStandIn meter(setup);
  const std::string profile = folder.file("meter.toml", meter_profile_text(meter.address()));
  ASSERT_TRUE(Ledger::open({.path = folder / "a.ledger", .mode = LedgerMode::create}));
  const std::string lot = folder / "lot";
  std::filesystem::create_directory(lot);
  folder.file("lot/01.ringdown.csv", ring_csv());
  const std::string part = folder.file("part.toml", "[part]\nname = \"any\"\n[[limit]]\nquantity = \"f_0\"\nmin = \"1 Hz\"\n");
  const std::map<std::string_view, std::vector<std::string>> lines = {
      {"ledger verify", {folder / "a.ledger"}},
      {"ledger export", {folder / "a.ledger", "-o", folder / "a.json"}},
      {"ringdown", {ring, "--capacitor", "10nF"}},
      {"simulate ringdown", {"-o", folder / "new.csv"}},
      {"acquire", {profile, "-o", folder / "run.csv", "--count", "1"}},
      {"coupling", {"--primary-open", "100uH±1%", "--primary-short", "19uH±1%"}},
      {"simulate coupled", {"-o", folder / "pair.s2p"}},
      {"simulate sweep", {"-o", folder / "new-sweep.csv"}},
      {"sweep", {folder.file("coil.csv", sweep_csv())}},
      {"gauge", {folder.file("gauge.csv", "part,operator,trial,value\n1,a,1,1\n1,a,2,2\n2,a,1,5\n2,a,2,7\n")}},
      {"simulate burst", {"-o", folder / "new-burst.csv"}},
      {"fixture",
       {"clips", "--short-inductance", "0", "-o", folder / "clips.toml", "--open",
        folder.file("open.csv", "frequency [Hz],Re(Z) [ohm],Im(Z) [ohm]\n1e3,0,-1e8\n1e4,0,-1e7\n"), "--short",
        folder.file("short.csv", "frequency [Hz],Re(Z) [ohm],Im(Z) [ohm]\n1e3,0.02,1e-4\n1e4,0.02,1e-3\n")}},
      {"inspect", {part, lot}},
  };
  for (const auto& [name, words] : lines) {
    const Command* command = find_command(name);
    ASSERT_NE(command, nullptr);
    const auto arguments = read_arguments(*command, words);
    ASSERT_TRUE(arguments);
    FakeConsole fake;
    EXPECT_EQ(command->run(*arguments, fake.console), ExitCode::done) << fake.error.str();
    // Looked at before any command runs.
    EXPECT_THAT(arguments->never_asked(), testing::ElementsAre("--color")) << name;
  }
  // A station reads standard input to its end; without a unit its lot is undecided.
  const int before = dup(STDIN_FILENO), nothing = open("/dev/null", O_RDONLY | O_CLOEXEC);
  dup2(nothing, STDIN_FILENO);
  const std::string judged = folder.file("judged.toml", "[part]\nname = \"drum-47\"\n[[limit]]\nquantity = \"L_s\"\nmin = \"1 uH\"\n");
  const Command& station = *find_command("station");
  const auto arguments = read_arguments(station, {judged, "--instrument", profile, "--lot", "1", "--ledger", folder / "d.ledger"});
  FakeConsole fake;
  EXPECT_EQ(station.run(*arguments, fake.console), ExitCode::undecided) << fake.error.str();
  EXPECT_THAT(arguments->never_asked(), testing::ElementsAre("--color"));
  dup2(before, STDIN_FILENO);
  close(before);
  close(nothing);
}

TEST(RingDownCommand, ShowsTheMeasurementAlthoughAFileCouldNotBeWritten) {
  const TemporaryFolder folder;
  const std::string ring = folder.file("ring.csv", ring_csv());
  const Ended text = run({"ringdown", ring, "--capacitor", "10nF±1%", "--report", "/no/such/folder/a.html"});
  EXPECT_EQ(text.code, 2);
  EXPECT_THAT(text.out, HasSubstr("L_s"));
  EXPECT_THAT(text.error, HasSubstr("/no/such/folder"));

  const Ended json = run({"ringdown", ring, "--capacitor", "10nF±1%", "--report", "/no/such/folder/a.html", "--json"});
  EXPECT_EQ(json.code, 2);
  EXPECT_EQ(schema_trouble(json.out, "error"), "");
  EXPECT_THAT(json.error, HasSubstr("L_s"));
}

}  // namespace
}  // namespace coilassay::test
