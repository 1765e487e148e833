// The tests of a part sheet on the captures of one unit.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "app/runs/context.h"
#include "app/runs/lot_folder.h"
#include "app/runs/measure_unit.h"
#include "app/runs/unit_entry.h"
#include "base/result.h"
#include "inspection/part_sheet.h"

namespace coilassay {

/// A test of the sheet, ready to be run.
struct PreparedTest {
  TestPlan plan;
  std::string bench_sha256;
  std::vector<EquipmentItem> equipment;         // of its bench sheet
  std::optional<StatedValue> room_temperature;  // likewise
  std::vector<double> at_hz;
};

/// Tests that the limits or the check standard can be judged from: sections of the sheet, and kinds of test without a
/// section where a limit leaves its test open or names the kind. Bench sheets are read once, so that a mistake in one is
/// told before anything is measured.
Result<std::vector<PreparedTest>> prepare_tests(const PartSheet& sheet);

/// Every name a capture may have: those of the sections and all kinds of test.
std::vector<std::string> capture_tests(const PartSheet& sheet);

/// What the plan says as a job for measure_unit().
UnitTest unit_test(const TestPlan& plan, const std::vector<double>& at_hz, std::vector<std::string> files);

/// Runs the tests on what there is of the unit, one after another. A capture that cannot be used becomes a measurement
/// whose finding `capture_refused` says why: the lot goes on. Tests without a capture are left out.
std::vector<TestRun> run_tests(const std::vector<PreparedTest>& tests, const LotUnit& unit, bool traces,
                               const RunContext& context);

/// The same as the room of inspection wants it.
std::vector<TestedUnit> tested(const std::vector<TestRun>& runs);

}  // namespace coilassay
