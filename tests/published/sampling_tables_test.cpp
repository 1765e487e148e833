// Sampling plans against the published tables: all cells of MIL-STD-105E, the k values of MIL-STD-414 with their operating
// characteristic.
//
// data/sampling/single_plans_105E.csv, code_letters_105E.csv: MIL-STD-105E (10 May 1989, public domain) Tables I, II-A, II-B,
// II-C, READ in R package AQLSchemes 1.7-2 (arrows resolved there) and rebuilt from the diagonal rule. variables_k_414.csv:
// MIL-STD-414 (1957, public domain) Table B-1, part READ, part from memory (column k_tag), VERIFIED by the non-central t;
// code_letters_Z1_9.csv: ANSI/ASQ Z1.9 Table A-2, READ there.
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <map>
#include <sstream>
#include <string>
#include <vector>

#include "inspection/lot_statistics.h"
#include "inspection/sampling.h"
#include "inspection/sampling_tables.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

/// Rows of a table by the names of their columns.
std::vector<std::map<std::string, std::string>> rows_of(const std::string& name) {
  std::ifstream file(test::project_file("tests/published/data/sampling/" + name));
  const auto cells = [](const std::string& line) {
    std::vector<std::string> out;
    std::stringstream stream(line);
    for (std::string cell; std::getline(stream, cell, ',');) out.push_back(cell);
    return out;
  };
  std::string line;
  std::getline(file, line);
  const std::vector<std::string> names = cells(line);
  std::vector<std::map<std::string, std::string>> rows;
  while (std::getline(file, line)) {
    const std::vector<std::string> row = cells(line);
    std::map<std::string, std::string> by_name;
    for (std::size_t i = 0; i < row.size() && i < names.size(); ++i) by_name[names[i]] = row[i];
    rows.push_back(by_name);
  }
  return rows;
}

Severity105 severity_of(const std::string& word) {
  return word == "tightened" ? Severity105::tightened : word == "reduced" ? Severity105::reduced : Severity105::normal;
}

TEST(SamplingTables, EveryCellOfTheMasterTablesWithItsArrowResolved) {
  const auto rows = rows_of("single_plans_105E.csv");
  ASSERT_EQ(rows.size(), 768u);
  for (const auto& row : rows) {
    const std::string where = row.at("severity") + " " + row.at("code_letter") + " " + row.at("AQL_percent");
    const auto plan = attribute_plan(severity_of(row.at("severity")), row.at("code_letter")[0], std::stod(row.at("AQL_percent")));
    ASSERT_TRUE(plan) << where;
    EXPECT_EQ(plan->letter, row.at("plan_letter")[0]) << where;
    EXPECT_EQ(plan->n, std::stoull(row.at("n"))) << where;
    EXPECT_EQ(plan->accept, std::stoull(row.at("Ac"))) << where;
    EXPECT_EQ(plan->reject, std::stoull(row.at("Re"))) << where;
    EXPECT_NEAR(binomial_at_most(plan->reject - 1, plan->n, std::stod(row.at("AQL_percent")) / 100), std::stod(row.at("Pa_at_AQL_binomial")), 6e-5)
        << where;
  }
}

TEST(SamplingTables, TightenedInspectionIsNeverEasierThanNormal) {
  for (const char letter : std::string("ABCDEFGHJKLMNPQR")) {
    for (const double aql : attribute_aqls()) {
      const auto normal = attribute_plan(Severity105::normal, letter, aql), tightened = attribute_plan(Severity105::tightened, letter, aql);
      const double p = aql / 100;
      EXPECT_LE(binomial_at_most(tightened->accept, tightened->n, p), binomial_at_most(normal->accept, normal->n, p) + 1e-12) << letter << aql;
    }
  }
}

TEST(SamplingTables, EveryCodeLetter) {
  const auto rows = rows_of("code_letters_105E.csv");
  ASSERT_EQ(rows.size(), 15u);
  for (const auto& row : rows) {
    for (const char* level : {"S-1", "S-2", "S-3", "S-4", "I", "II", "III"}) {
      EXPECT_EQ(attribute_letter(std::stoull(row.at("lot_min")), level), row.at(level)[0]);
      const std::string most = row.at("lot_max");
      EXPECT_EQ(attribute_letter(most.empty() ? 100000000 : std::stoull(most), level), row.at(level)[0]);
    }
  }
  for (const auto& row : rows_of("code_letters_Z1_9.csv")) {
    for (const char* level : {"S-3", "S-4", "I", "II", "III"}) {
      EXPECT_EQ(variables_letter(std::stoull(row.at("lot_min")), level), row.at(level)[0]);
    }
  }
  EXPECT_FALSE(attribute_letter(100, "IV"));
  EXPECT_FALSE(variables_letter(100, "S-1"));
}

// MIL-STD-105E Table X-J-1 (from memory, VERIFIED): letter J, n 80, AQL 1.0, Ac 2.
TEST(SamplingTables, OperatingCharacteristicOfLetterJ) {
  const auto plan = attribute_plan(Severity105::normal, 'J', 1.0);
  ASSERT_EQ(plan->n, 80u);
  ASSERT_EQ(plan->accept, 2u);
  const double percent[] = {0.550, 1.03, 1.38, 2.16, 3.33, 4.84, 6.52, 7.66, 10.1};
  const double accepted[] = {0.99, 0.95, 0.90, 0.75, 0.50, 0.25, 0.10, 0.05, 0.01};
  for (std::size_t i = 0; i < 9; ++i) EXPECT_NEAR(binomial_at_most(2, 80, percent[i] / 100), accepted[i], 0.003) << percent[i];
}

// Scheme of letter L, AQL 1.5 (READ, vignette of AQLSchemes after Stephens and Larson 1967, VERIFIED).
TEST(SamplingTables, TheSchemeOfNormalAndTightenedTogether) {
  const auto normal = attribute_plan(Severity105::normal, 'L', 1.5), tightened = attribute_plan(Severity105::tightened, 'L', 1.5);
  for (const auto& [p, expected] : {std::pair{0.019296, 0.95}, {0.045884, 0.10}}) {
    const double n = binomial_at_most(normal->accept, normal->n, p), t = binomial_at_most(tightened->accept, tightened->n, p);
    const double a = (2 - std::pow(n, 4)) / ((1 - n) * (1 - std::pow(n, 4))), b = (1 - std::pow(t, 5)) / ((1 - t) * std::pow(t, 5));
    EXPECT_NEAR((a * n + b * t) / (a + b), expected, 6e-4);   // printed to two digits
  }
}

TEST(SamplingTables, EveryAcceptabilityConstantWithItsOperatingCharacteristic) {
  const auto rows = rows_of("variables_k_414.csv");
  ASSERT_EQ(rows.size(), 195u);
  std::size_t compared = 0;
  for (const auto& row : rows) {
    const std::string letter = row.at("letter_Z1_9"), where = row.at("n") + " " + row.at("AQL_percent");
    const double aql = std::stod(row.at("AQL_percent")), k = std::stod(row.at("k"));
    const auto n = std::stoull(row.at("n"));
    EXPECT_NEAR(variables_acceptance(n, k, aql / 100), std::stod(row.at("Pa_at_AQL_noncentral_t")), 6e-5) << where;
    if (!row.at("M_percent_READ").empty()) {   // form 2: M belongs to k, to the digits both are printed with
      EXPECT_NEAR(100 * estimated_fraction_beyond(std::stod(row.at("k_from_M_computed")), n), std::stod(row.at("M_percent_READ")), 0.006) << where;
    }
    if (letter.empty() || (letter == "J" && n != 35) || (letter == "P" && n != 200)) continue;
    const auto plan = variables_plan(letter[0], aql, false);
    if (plan->n != n) continue;   // sizes that only the older document has
    EXPECT_EQ(plan->k, k) << where;
    ++compared;
  }
  EXPECT_GT(compared, 160u);
}

TEST(SamplingTables, TightenedVariablesReadTheNextSmallerAql) {
  EXPECT_EQ(variables_plan('F', 1.0, true)->k, variables_plan('F', 0.65, false)->k);
  EXPECT_FALSE(variables_plan('K', 0.04, true));
  // The cell of letter B at AQL 1.0 is an arrow down.
  EXPECT_EQ(variables_plan('B', 1.0, false)->letter, 'C');
  EXPECT_EQ(variables_plan('B', 1.0, false)->n, 4u);
}

}  // namespace
}  // namespace coilassay
