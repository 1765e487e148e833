// Sheets and measurements made up for the tests of the room.
#pragma once

#include <gtest/gtest.h>

#include <string>

#include "analysis/symbols.h"
#include "inspection/verdict.h"

namespace coilassay::test {

/// A normal estimate with its 95 % interval.
inline Estimate estimate(const std::string& symbol, double value, double u) {
  Estimate e;
  e.symbol = symbol;
  e.quantity = {value, u, find_symbol(symbol)->unit};
  e.k = 1.959963984540054;
  e.low = value - e.k * u;
  e.high = value + e.k * u;
  return e;
}

inline TestedUnit tested(const std::string& test, std::vector<Estimate> estimates) {
  TestedUnit unit;
  unit.test = unit.measurement.test = test;
  unit.measurement.estimates = std::move(estimates);
  return unit;
}

inline PartSheet sheet_of(const std::string& text) {
  auto sheet = parse_part_sheet(text, "part.toml");
  EXPECT_TRUE(sheet) << sheet.error().place << ": " << sheet.error().finding;
  return sheet ? *sheet : PartSheet{};
}

/// One limit on L_s between 40 and 60 uH, by the rule.
inline PartSheet simple_sheet(const std::string& rule, const std::string& limits = "min = \"40 uH\"\nmax = \"60 uH\"",
                              const std::string& more = "") {
  return sheet_of("[part]\nname = \"drum\"\n[[limit]]\nquantity = \"L_s\"\n" + limits + "\n[decision]\nrule = \"" + rule + "\"\n" + more);
}

inline Verdict verdict_of(const PartSheet& sheet, double value, double u) {
  return judge_unit(sheet, "1", 1, std::vector{tested("ringdown", {estimate("L_s", value, u)})}).verdict;
}

}  // namespace coilassay::test
