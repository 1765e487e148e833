// Switching rules of MIL-STD-105E, 4.7, and the end of ISO 2859-1.
#include <gtest/gtest.h>

#include <string>

#include "inspection/sampling.h"

namespace coilassay {
namespace {

Sampling attributes(bool reduced = false) {
  Sampling sampling;
  sampling.scheme = SamplingScheme::attributes;
  sampling.reduced_allowed = reduced;
  return sampling;
}

/// Lots as they come, each inspected with the severity the rules ask for: a accepted, r rejected, u undecided, b between.
Severity105 after(const std::string& lots, const Sampling& sampling = attributes()) {
  std::vector<LotHistory> history;
  for (const char c : lots) {
    LotHistory lot;
    lot.severity = next_severity(sampling, history).severity;
    lot.decision = c == 'a' || c == 'b' ? LotResult::accept : c == 'r' ? LotResult::reject : LotResult::undecided;
    lot.between_accept_and_reject = c == 'b';
    history.push_back(lot);
  }
  return next_severity(sampling, history).severity;
}

TEST(Switching, TwoOfFiveLotsRejectedBringTightenedInspection) {
  using enum Severity105;
  EXPECT_EQ(after(""), normal);
  EXPECT_EQ(after("r"), normal);
  EXPECT_EQ(after("rr"), tightened);
  EXPECT_EQ(after("raaar"), tightened);
  EXPECT_EQ(after("raaaar"), normal) << "the first one is out of the five";
  EXPECT_EQ(after("raaaara"), normal);
}

TEST(Switching, FiveAcceptedInARowBringNormalInspectionBack) {
  using enum Severity105;
  EXPECT_EQ(after("rraaaa"), tightened);
  EXPECT_EQ(after("rraaaaa"), normal);
  EXPECT_EQ(after("rraaraa"), tightened);
  EXPECT_EQ(after("rraaaaar"), normal) << "counting begins anew";
  EXPECT_EQ(after("rraauaaa"), tightened) << "an undecided lot ends the row";
}

TEST(Switching, FiveRejectedInAllOnTightenedEndIt) {
  using enum Severity105;
  EXPECT_EQ(after("rrrrrr"), tightened);
  EXPECT_EQ(after("rrrrrrr"), discontinued);
  EXPECT_EQ(after("rrrararaar"), tightened);
  EXPECT_EQ(after("rrrararaarr"), discontinued);
  EXPECT_EQ(after("rrrrrrraaaaaaaa"), discontinued);
}

TEST(Switching, ReducedInspectionComesOnlyWhereTheSheetAllowsIt) {
  using enum Severity105;
  EXPECT_EQ(after("aaaaaaaaaaaa"), normal);
  EXPECT_EQ(after("aaaaaaaaa", attributes(true)), normal);
  EXPECT_EQ(after("aaaaaaaaaa", attributes(true)), reduced);
  EXPECT_EQ(after("aaaaaaaaaaa", attributes(true)), reduced);
  EXPECT_EQ(after("aaaaaaaaaab", attributes(true)), normal);
  EXPECT_EQ(after("aaaaaaaaaar", attributes(true)), normal);
}

TEST(Switching, BeginsAnewWhereInspectionWasResumed) {
  Sampling sampling = attributes();
  sampling.severity = Severity105::tightened;
  std::vector<LotHistory> history;
  const UtcTime day = std::chrono::sys_days(std::chrono::year(2026) / 5 / 1);
  for (int i = 0; i < 5; ++i) history.push_back({day, LotResult::reject, Severity105::tightened, false});
  EXPECT_EQ(next_severity(sampling, history).severity, Severity105::discontinued);
  sampling.resumed = day + std::chrono::hours(24);
  EXPECT_EQ(next_severity(sampling, history).severity, Severity105::tightened);
  EXPECT_FALSE(next_severity(sampling, history).why.empty());
}

}  // namespace
}  // namespace coilassay
