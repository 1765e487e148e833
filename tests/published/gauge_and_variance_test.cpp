// Analysis of variance against certified data sets, and the crossed gauge study everybody publishes.
//
// SiRstv, AtmWtAg: NIST/ITL Statistical Reference Datasets, one-way analysis of variance (public domain), READ in the public
// copy of repository scipy/scipy, commit 3dbf660a919b, VERIFIED. Gauge study: AIAG Measurement Systems Analysis, 4th edition,
// 10 parts, 3 appraisers, 3 trials (READ, four public test suites agree; VERIFIED by computing).
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <map>
#include <sstream>

#include "fitting/analysis_of_variance.h"
#include "inspection/gauge_study.h"
#include "tests/support/paths.h"

namespace coilassay {
namespace {

std::vector<std::vector<double>> groups_of(const std::string& name) {
  std::ifstream file(test::project_file("tests/published/data/nist_strd/" + name));
  std::map<int, std::vector<double>> groups;
  std::string line;
  std::getline(file, line);
  while (std::getline(file, line)) {
    const std::size_t comma = line.find(',');
    groups[std::stoi(line.substr(0, comma))].push_back(std::stod(line.substr(comma + 1)));
  }
  std::vector<std::vector<double>> out;
  for (auto& [treatment, values] : groups) out.push_back(values);
  return out;
}

/// Digits that agree.
double digits(double value, double certified) { return -std::log10(std::fabs(value - certified) / std::fabs(certified) + 1e-16); }

TEST(AnalysisOfVariance, SiliconResistivityToTwelveDigits) {
  const OneWayAnalysis table = analyse_one_way(groups_of("SiRstv.csv"));
  EXPECT_EQ(table.between.dof, 4);
  EXPECT_EQ(table.within.dof, 20);
  EXPECT_GT(digits(table.between.sum_of_squares, 5.11462616000000E-02), 12);
  EXPECT_GT(digits(table.within.sum_of_squares, 2.16636560000000E-01), 12);
  EXPECT_GT(digits(table.between.f, 1.18046237440255E+00), 12);
  EXPECT_GT(digits(table.between.sum_of_squares / table.total_sum_of_squares, 1.90999039051129E-01), 12);
}

// Values with seven leading digits in common: nine digits are what double precision leaves.
TEST(AnalysisOfVariance, AtomicWeightOfSilverToNineDigits) {
  const OneWayAnalysis table = analyse_one_way(groups_of("AtmWtAg.csv"));
  EXPECT_EQ(table.between.dof, 1);
  EXPECT_EQ(table.within.dof, 46);
  EXPECT_GT(digits(table.between.sum_of_squares, 3.63834187500000E-09), 9);
  EXPECT_GT(digits(table.within.sum_of_squares, 1.04951729166667E-08), 9);
  EXPECT_GT(digits(table.between.f, 1.59467335677930E+01), 9);
}

GaugeStudy published_study(double pooling) {
  std::ifstream file(test::project_file("tests/published/data/gauge/gauge_rr_crossed.csv"));
  std::string line;
  std::getline(file, line);
  EXPECT_EQ(line, "part,operator,trial,value");
  std::vector<GaugeReading> readings;
  while (std::getline(file, line)) {
    std::stringstream cells(line);
    GaugeReading reading;
    std::string value;
    std::getline(cells, reading.part, ',');
    std::getline(cells, reading.operator_name, ',');
    std::getline(cells, reading.trial, ',');
    std::getline(cells, value, ',');
    reading.value = std::stod(value);
    readings.push_back(reading);
  }
  EXPECT_EQ(readings.size(), 90u);
  GaugeOptions options;
  options.pooling_probability = pooling;
  const auto study = study_gauge(readings, options);
  EXPECT_TRUE(study) << study.error().finding;
  return *study;
}

TEST(GaugeStudyPublished, TheTableAndItsTests) {
  const TwoWayAnalysis table = published_study(0.25).table;
  EXPECT_EQ(table.first.dof, 9);
  EXPECT_EQ(table.second.dof, 2);
  EXPECT_EQ(table.interaction.dof, 18);
  EXPECT_EQ(table.within.dof, 60);
  EXPECT_NEAR(table.first.sum_of_squares, 88.3619, 5e-5);
  EXPECT_NEAR(table.second.sum_of_squares, 3.1673, 5e-5);
  EXPECT_NEAR(table.interaction.sum_of_squares, 0.3590, 5e-5);
  EXPECT_NEAR(table.within.sum_of_squares, 2.7589, 5e-5);
  EXPECT_NEAR(table.total_sum_of_squares, 94.6471, 5e-5);
  EXPECT_NEAR(table.first.f, 492.291, 5e-4);
  EXPECT_NEAR(table.second.f, 79.406, 5e-4);
  EXPECT_NEAR(table.interaction.f, 0.434, 5e-4);
  EXPECT_NEAR(table.interaction.p, 0.974, 5e-4);
}

TEST(GaugeStudyPublished, ComponentsWithTheInteractionPooled) {
  const GaugeStudy study = published_study(0.25);
  ASSERT_TRUE(study.pooled);
  EXPECT_EQ(study.pooled_within->dof, 78);
  EXPECT_NEAR(study.pooled_within->mean_square, 0.03997, 5e-6);
  struct Row {
    const char* name;
    double sigma, contribution, study_variation;
  };
  for (const Row& row : {Row{"repeatability", 0.199933, 3.39, 18.42}, Row{"reproducibility", 0.226838, 4.37, 20.90},
                         Row{"gauge", 0.302373, 7.76, 27.86}, Row{"part", 1.042327, 92.24, 96.04}}) {
    const GaugeComponent& c = study.component(row.name);
    EXPECT_NEAR(c.sigma, row.sigma, 2e-6) << row.name;   // "gauge" is printed from rounded variances
    EXPECT_NEAR(100 * c.share, row.contribution, 0.006) << row.name;
    EXPECT_NEAR(100 * std::sqrt(c.share), row.study_variation, 0.006) << row.name;
    EXPECT_LT(c.low, c.sigma);
    EXPECT_GT(c.high, c.sigma);
  }
  EXPECT_NEAR(study.component("total").sigma, 1.085, 0.0005);
  EXPECT_NEAR(study.categories.value, 4.861, 0.015) << "published with 1.41 for the square root of two";
  EXPECT_EQ(study.ndc, 4u);
}

TEST(GaugeStudyPublished, WithoutPoolingTheReadingsWithinStandAlone) {
  const GaugeStudy study = published_study(1);
  EXPECT_FALSE(study.pooled);
  EXPECT_NEAR(study.component("repeatability").sigma, 0.214435, 6e-7);
}

}  // namespace
}  // namespace coilassay
