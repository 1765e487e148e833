// The report of a lot as a file.
#pragma once

#include <string>

#include "app/runs/context.h"
#include "base/result.h"
#include "report/lot_record.h"

namespace coilassay {

/// Writes the page, or a PDF when the name ends so. cannot_write or missing_helper.
Result<void> write_lot_report(const LotRecord& lot, const std::string& path, const RunContext& context);

}  // namespace coilassay
