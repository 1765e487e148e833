// Figures and pages of a measurement.
#pragma once

#include <optional>
#include <string>

#include "analysis/measurement.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct OutputRequest {
  std::optional<std::string> figure;  // FILE.svg
  std::optional<std::string> report;  // FILE.html or FILE.pdf
};

/// usage for an ending that is not known; before anything is measured.
Result<void> check_outputs(const OutputRequest& request);

/// Draws and writes what was asked for. A measurement that has nothing to draw leaves the figure out and says so by
/// `false`. cannot_write or missing_helper: the first trouble; the other document is written all the same.
Result<bool> write_outputs(const Measurement& measurement, const OutputRequest& request, const RunContext& context);

}  // namespace coilassay
