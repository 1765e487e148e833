#include "app/runs/unit_tests.h"

#include <algorithm>
#include <filesystem>

#include "base/outside_text.h"

namespace coilassay {

namespace {

bool named(const std::vector<std::string>& names, std::string_view name) {
  return std::find(names.begin(), names.end(), name) != names.end();
}

/// Whether a limit, or the check standard, may be judged from a test.
bool needed(const PartSheet& sheet, const TestPlan& plan) {
  const auto uses = [&plan](const Limit& limit) {
    return limit_uses(limit, plan) && test_gives(plan.kind, limit.quantity);
  };
  if (std::any_of(sheet.limits.begin(), sheet.limits.end(), uses)) return true;
  if (!sheet.check_standard) return false;
  Limit check;
  check.quantity = sheet.check_standard->quantity;
  check.test = sheet.check_standard->test;
  return uses(check);
}

Result<PreparedTest> prepared(const PartSheet& sheet, const TestPlan& plan) {
  PreparedTest test{plan, {}, {}, std::nullopt, frequencies_needed(sheet, plan)};
  if (!plan.bench) return test;
  const Result<BenchSetup> bench = read_bench_sheet(*plan.bench);
  if (!bench) return failure(bench);
  const Result<std::string> digest = digest_of_file(*plan.bench);
  if (!digest) return failure(digest);
  test.bench_sha256 = *digest;
  test.equipment = bench->equipment;
  test.room_temperature = plan.temperature ? plan.temperature : bench->temperature;
  return test;
}

/// A measurement that says why there is none.
Measurement refused(const std::string& kind, const std::vector<std::string>& files, const Error& error) {
  Measurement measurement;
  measurement.test = kind;
  for (const std::string& file : files) {
    SourceRecord record;
    record.source.name = file;
    const Result<std::string> digest = digest_of_file(file);
    if (!digest) continue;  // the finding names it
    record.source.sha256 = *digest;
    measurement.sources.push_back(std::move(record));
  }
  const std::string place = std::filesystem::path(error.place).filename().string();
  std::string message = error.finding;
  if (!place.empty() && message.find(place) == std::string::npos) message = place + ": " + message;
  if (!error.remedy.empty()) message += "; " + error.remedy;
  measurement.findings.push_back({"capture_refused", Severity::refusal, message, files.empty() ? "" : files.front(),
                                  static_cast<double>(files.size()), Unit::one});
  return measurement;
}

TestRun run_of(const PreparedTest& test, Measurement measurement) {
  return {test.plan.name, test.plan.kind, test.plan.bench, test.bench_sha256, std::move(measurement)};
}

}  // namespace

std::vector<std::string> capture_tests(const PartSheet& sheet) {
  std::vector<std::string> names;
  for (const TestPlan& plan : sheet.tests) names.push_back(plan.name);
  for (const std::string_view kind : unit_test_kinds()) {
    if (!named(names, kind)) names.emplace_back(kind);
  }
  return names;
}

Result<std::vector<PreparedTest>> prepare_tests(const PartSheet& sheet) {
  std::vector<PreparedTest> tests;
  std::vector<TestPlan> plans = sheet.tests;
  std::vector<std::string> kinds;
  for (const TestPlan& plan : sheet.tests) {
    kinds.push_back(plan.kind);
    kinds.push_back(plan.name);
  }
  for (const std::string_view kind : unit_test_kinds()) {
    // A section for this kind says how it is done; a bare file of the kind would be a second way.
    if (named(kinds, kind)) continue;
    TestPlan bare;
    bare.name = kind;
    bare.kind = kind;
    plans.push_back(std::move(bare));
  }
  for (const TestPlan& plan : plans) {
    if (plan.kind == "reading" || !needed(sheet, plan)) continue;
    Result<PreparedTest> test = prepared(sheet, plan);
    if (!test) return failure(test);
    tests.push_back(std::move(*test));
  }
  return tests;
}

UnitTest unit_test(const TestPlan& plan, const std::vector<double>& at_hz, std::vector<std::string> files) {
  UnitTest test;
  test.kind = plan.kind;
  test.files = std::move(files);
  test.segment = plan.segment;
  test.bench_sheet = plan.bench;
  test.from_s = plan.from_s;
  test.to_s = plan.to_s;
  test.at_hz = at_hz;
  test.dissipation_factors = plan.dissipation_factors;
  for (const Connection each : {Connection::reflect, Connection::series, Connection::shunt}) {
    if (plan.connection == name(each)) test.preparation.connection = each;
  }
  test.preparation.port = plan.port;
  test.preparation.from_waveform = plan.from_waveform;
  test.dots = plan.dots;
  test.link_inductance = plan.link_inductance;
  test.link_resistance = plan.link_resistance;
  test.winding_resistances = plan.winding_resistances;
  test.material = plan.material;
  test.temperature_coefficient = plan.temperature_coefficient;
  BenchSetup& stated = test.stated;
  stated.level = plan.level;
  stated.temperature = plan.temperature;
  // One bias holds for every capture; a list is of one table, a capture each.
  if (plan.biases.size() == 1) stated.bias = plan.biases.front();
  else test.biases = plan.biases;
  for (const StatedValue& value : plan.capacitors) stated.capacitors.push_back({value, std::nullopt});
  stated.voltage.input_capacitance = plan.probe_capacitance;
  stated.voltage.input_resistance = plan.probe_resistance;
  stated.across_resistance = plan.across_resistance;
  stated.across_capacitance = plan.across_capacitance;
  stated.winding_resistance = plan.dcr;
  stated.current.shunt = plan.shunt;
  stated.current.skew = plan.skew;
  stated.fixture_set = plan.fixture;
  return test;
}

std::vector<TestRun> run_tests(const std::vector<PreparedTest>& tests, const LotUnit& unit, bool traces,
                               const RunContext& context) {
  std::vector<TestRun> runs;
  for (const PreparedTest& test : tests) {
    const UnitCaptures* captures = unit.find(test.plan.name);
    if (captures == nullptr) continue;
    if (captures->trouble) {
      runs.push_back(run_of(test, refused(test.plan.kind, captures->files, *captures->trouble)));
      continue;
    }
    // Windings are measured together from whatever was captured of them; the names say what each capture is.
    const bool items = test.plan.kind == "coupling" && test.plan.repeats == 1 && coupling_item_of(captures->files.front());
    const std::size_t together = items ? captures->files.size() : test.plan.joint_captures();
    const std::size_t wanted = together * test.plan.repeats;
    if (captures->files.size() != wanted) {
      const Error error{Problem::usage, "",
                        std::to_string(captures->files.size()) +
                            (captures->files.size() == 1 ? " capture is" : " captures are") + " there for the test " +
                            test.plan.name + ", and the sheet asks for " + std::to_string(wanted),
                        ""};
      runs.push_back(run_of(test, refused(test.plan.kind, captures->files, error)));
      continue;
    }
    for (std::size_t i = 0; i < wanted; i += together) {
      const auto first = captures->files.begin() + static_cast<std::ptrdiff_t>(i);
      std::vector<std::string> files(first, first + static_cast<std::ptrdiff_t>(together));
      UnitTest job = unit_test(test.plan, test.at_hz, files);
      job.traces = traces;
      Result<Measurement> measured = measure_unit(job, context);
      runs.push_back(run_of(test, measured ? std::move(*measured) : refused(test.plan.kind, files, measured.error())));
    }
  }
  return runs;
}

std::vector<TestedUnit> tested(const std::vector<TestRun>& runs) {
  std::vector<TestedUnit> all;
  for (const TestRun& run : runs) all.push_back({run.test, run.measurement});
  return all;
}

}  // namespace coilassay
