// Times are UTC in files; the clock itself enters at app only.
#pragma once

#include <chrono>
#include <optional>
#include <string>
#include <string_view>

namespace coilassay {

using UtcTime = std::chrono::sys_seconds;

std::string to_text(UtcTime time);                     // "2026-03-04T10:22:00Z"
std::optional<UtcTime> parse_utc_time(std::string_view text);
std::string to_text(std::chrono::year_month_day date);  // "2026-03-04"
std::optional<std::chrono::year_month_day> parse_date(std::string_view text);

}  // namespace coilassay
