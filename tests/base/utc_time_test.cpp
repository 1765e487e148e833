#include "base/utc_time.h"

#include <gtest/gtest.h>

namespace coilassay {
namespace {

using namespace std::chrono_literals;
using std::chrono::March;
using std::chrono::sys_days;

TEST(UtcTime, IsWrittenAndReadBack) {
  const UtcTime time = sys_days{2026y / March / 4d} + 10h + 22min + 5s;
  EXPECT_EQ(to_text(time), "2026-03-04T10:22:05Z");
  EXPECT_EQ(parse_utc_time("2026-03-04T10:22:05Z"), time);
  EXPECT_EQ(to_text(UtcTime{}), "1970-01-01T00:00:00Z");
  EXPECT_EQ(to_text(UtcTime{-1s}), "1969-12-31T23:59:59Z");
}

TEST(UtcTime, RefusesEverythingElse) {
  for (const std::string_view bad :
       {"", "2026-03-04", "2026-03-04T10:22:05", "2026-03-04 10:22:05Z", "2026-03-04T10:22:05+01:00",
        "2026-02-29T10:22:05Z", "2026-03-04T24:00:00Z", "2026-03-04T10:60:00Z", "2026-03-04T10:22:60Z",
        "2026-03-04T10:22:5 Z", "2026-03-04T1a:22:05Z", "2026-03-04T10:22:05ZZ"}) {
    EXPECT_EQ(parse_utc_time(bad), std::nullopt) << bad;
  }
}

TEST(Date, IsWrittenAndReadBack) {
  EXPECT_EQ(to_text(2026y / March / 4d), "2026-03-04");
  EXPECT_EQ(parse_date("2026-03-04"), 2026y / March / 4d);
  EXPECT_TRUE(parse_date("2028-02-29"));
  for (const std::string_view bad : {"", "2026-3-4", "2026-02-29", "2026-13-01", "2026-00-01", "2026-01-00", "04.03.2026",
                                     "-026-03-04", "2026-03-04 "}) {
    EXPECT_EQ(parse_date(bad), std::nullopt) << bad;
  }
}

}  // namespace
}  // namespace coilassay
