// Readings of a gauge study: from a table, and from the names of captures.
#pragma once

#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "base/result.h"
#include "base/unit.h"
#include "inspection/gauge_study.h"

namespace coilassay {

/// A table with the columns part, operator, trial and value, in any order, separated by comma, semicolon or tab. The
/// heading of the value may name a unit, "value [uH]"; a cell may have one of its own. missing_column, damaged or wrong_unit with
/// the line.
Result<std::vector<GaugeReading>> parse_gauge_table(std::string_view text, const std::string& name, Unit unit);

/// One capture of a study: <part>.<operator>.<trial>.<test>.<ext>; a part may have points in it.
struct GaugeCapture {
  std::string part, operator_name, trial, test, path;
};
struct GaugeFolder {
  std::vector<GaugeCapture> captures;   // by name, numbers in their own order
  std::vector<std::string> strays;
};
/// Names only; no capture is opened. unreadable for a folder that is not there or holds no capture.
Result<GaugeFolder> read_gauge_folder(const std::string& path, std::span<const std::string> tests);

}  // namespace coilassay
