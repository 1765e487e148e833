#include "base/utc_time.h"

#include <fmt/format.h>

#include <charconv>

namespace coilassay {
namespace {

using std::chrono::days;
using std::chrono::floor;
using std::chrono::year_month_day;

/// Exactly `length` digits at `at`; nothing else, no sign.
std::optional<unsigned> digits(std::string_view text, std::size_t at, std::size_t length) {
  unsigned number = 0;
  for (std::size_t i = at; i < at + length; ++i) {
    if (i >= text.size() || text[i] < '0' || text[i] > '9') return std::nullopt;
    number = number * 10 + static_cast<unsigned>(text[i] - '0');
  }
  return number;
}

}  // namespace

std::string to_text(year_month_day date) {
  return fmt::format("{:04}-{:02}-{:02}", static_cast<int>(date.year()), static_cast<unsigned>(date.month()),
                     static_cast<unsigned>(date.day()));
}

std::string to_text(UtcTime time) {
  const auto day = floor<days>(time);
  const std::chrono::hh_mm_ss clock{time - day};
  return fmt::format("{}T{:02}:{:02}:{:02}Z", to_text(year_month_day{day}), clock.hours().count(),
                     clock.minutes().count(), clock.seconds().count());
}

std::optional<year_month_day> parse_date(std::string_view text) {
  if (text.size() != 10 || text[4] != '-' || text[7] != '-') return std::nullopt;
  const auto year = digits(text, 0, 4), month = digits(text, 5, 2), day = digits(text, 8, 2);
  if (!year || !month || !day) return std::nullopt;
  const year_month_day date{std::chrono::year{static_cast<int>(*year)}, std::chrono::month{*month},
                            std::chrono::day{*day}};
  if (!date.ok()) return std::nullopt;
  return date;
}

std::optional<UtcTime> parse_utc_time(std::string_view text) {
  if (text.size() != 20 || text[10] != 'T' || text[13] != ':' || text[16] != ':' || text[19] != 'Z') return std::nullopt;
  const auto date = parse_date(text.substr(0, 10));
  const auto hour = digits(text, 11, 2), minute = digits(text, 14, 2), second = digits(text, 17, 2);
  if (!date || !hour || !minute || !second || *hour > 23 || *minute > 59 || *second > 59) return std::nullopt;
  return UtcTime{std::chrono::sys_days{*date}} + std::chrono::hours{*hour} + std::chrono::minutes{*minute} +
         std::chrono::seconds{*second};
}

}  // namespace coilassay
