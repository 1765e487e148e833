// The [test.NAME] sections of a part sheet.
#pragma once

#include <string>

#include "inspection/part_sheet.h"
#include "inspection/sheet_section.h"

namespace coilassay {

/// One section; only the keys of its kind are known, all others are refused later as unknown. Paths are resolved against
/// the sheet.
TestPlan read_test_plan(SheetSection& section, const std::string& test_name, const std::string& sheet_path);

}  // namespace coilassay
