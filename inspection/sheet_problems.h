// What in a part sheet cannot work, although every key of it is legal.
#pragma once

#include <vector>

#include "inspection/sheet_check.h"

namespace coilassay {

/// In the order of the sheet; sampling is looked at by check_sheet().
std::vector<SheetProblem> sheet_problems(const PartSheet& sheet);

}  // namespace coilassay
