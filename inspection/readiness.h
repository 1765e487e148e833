// Whether the bench is fit to judge: calibration dates and the check standard. Times are passed in.
#pragma once

#include <chrono>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/finding.h"
#include "base/utc_time.h"
#include "inspection/part_sheet.h"

namespace coilassay {

/// One calibration_overdue for every item whose date has passed on that day, most overdue first; the figure is the days in
/// seconds. Items that state no date raise nothing.
std::vector<Finding> overdue_calibrations(std::span<const EquipmentItem> equipment, std::chrono::year_month_day today);

struct CheckReading {
  UtcTime time;
  double value = 0;
};

/// The control chart of a check standard: individual readings against centre +- 3 s.
struct CheckChart {
  double centre = 0, sigma = 0, low = 0, high = 0;
  bool established = false;            // false: fewer readings than the baseline needs, nothing can be said yet
  std::vector<CheckReading> readings;
  std::vector<bool> out;               // for each reading
};
CheckChart check_chart(const CheckStandard& standard, std::vector<CheckReading> readings);

enum class CheckState { good, out, overdue, never, not_established };
std::string_view name(CheckState state);
struct CheckStatus {
  CheckState state = CheckState::never;
  bool may_inspect = false;                // what the sheet's `refuse` makes of it
  std::optional<UtcTime> last_good;        // units measured since then are in doubt when it is out
  std::string why;
  std::string trend;                       // a run rule that the newest reading completes within the limits; else empty
};
CheckStatus check_status(const CheckStandard& standard, const CheckChart& chart, UtcTime now);

}  // namespace coilassay
