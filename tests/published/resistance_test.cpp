// Straight lines, the temperature law of copper and the rule for a temperature rise, against published figures.
#include <gtest/gtest.h>

#include <array>
#include <fstream>
#include <string>
#include <vector>

#include "analysis/resistance.h"
#include "fitting/straight_line.h"
#include "tests/support/paths.h"

namespace coilassay::test {
namespace {

// NIST StRD, linear regression, Norris: certified values; read, public domain (data/nist_strd/README.md).
TEST(PublishedLine, Norris) {
  std::ifstream file(project_file("tests/published/data/nist_strd/Norris.csv"));
  std::string row;
  std::vector<double> x, y;
  std::getline(file, row);
  while (std::getline(file, row)) {
    const std::size_t comma = row.find(',');
    y.push_back(std::stod(row.substr(0, comma)));
    x.push_back(std::stod(row.substr(comma + 1)));
  }
  ASSERT_EQ(x.size(), 36u);
  const StraightLine line = fit_straight_line(x, y);
  EXPECT_NEAR(line.intercept, -0.262323073774029, 1e-12);
  EXPECT_NEAR(line.u_intercept, 0.232818234301152, 1e-12);
  EXPECT_NEAR(line.slope, 1.00211681802045, 1e-13);
  EXPECT_NEAR(line.u_slope, 0.429796848199937e-3, 1e-15);
  EXPECT_NEAR(line.residual_deviation, 0.884796396144373, 1e-12);
  EXPECT_EQ(line.dof, 34);
}

// JCGM 100:2008, H.3, Table H.6, calibration of a thermometer: data read, results from memory and computed; compared to the
// digits printed there.
TEST(PublishedLine, ThermometerOfGumH3) {
  const std::array t{21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010, 26.511};
  const std::array b{-0.171, -0.169, -0.166, -0.159, -0.164, -0.165, -0.156, -0.157, -0.159, -0.161, -0.160};
  std::vector<double> above;
  for (const double each : t) above.push_back(each - 20);
  const StraightLine line = fit_straight_line(above, b);
  EXPECT_NEAR(line.intercept, -0.1712, 0.00005);
  EXPECT_NEAR(line.u_intercept, 0.0029, 0.00005);
  EXPECT_NEAR(line.slope, 0.00218, 0.000005);
  EXPECT_NEAR(line.u_slope, 0.00067, 0.000005);
  EXPECT_NEAR(line.correlation, -0.930, 0.0005);
  EXPECT_NEAR(line.residual_deviation, 0.0035, 0.00005);
  EXPECT_NEAR(line.at(10), -0.1494, 0.00005);
  EXPECT_NEAR(line.standard_uncertainty_at(10), 0.0041, 0.00005);
}

/// Readings of both polarities at 1 A that make exactly this resistance.
Capture readings_of_ohm(double ohm) {
  Capture capture;
  capture.source.name = "rise.csv";
  capture.channels.resize(2);
  capture.channels[0] = {.name = "V", .unit = Unit::volt, .unit_stated = true, .samples = {ohm, -ohm, ohm, -ohm}};
  capture.channels[1] = {.name = "I", .unit = Unit::ampere, .unit_stated = true, .samples = {1, -1, 1, -1}};
  return capture;
}

double rise_with(const WindingMetal& metal, double constant) {
  ResistanceRequest request;
  request.propagation.exact_bench = true;
  request.metal = metal;
  request.metal.rise_constant = constant;
  request.cold = ColdWinding{StatedValue::exact(10, Unit::ohm), StatedValue::exact(20, Unit::degree_celsius)};
  request.bench.temperature = StatedValue::exact(20, Unit::degree_celsius);
  const auto result = measure_resistance({readings_of_ohm(11.965)}, request);
  if (!result || result->find("T_rise") == nullptr) return std::nan("");
  EXPECT_NEAR(result->find("T_winding")->quantity.value, result->find("T_rise")->quantity.value + 20, 1e-9);
  return result->find("T_rise")->quantity.value;
}

// Rise = (R2 - R1)/R1 (k + t1) - (t2 - t1): formula and constants from memory (IEC 60335-1 and IEC 61558-1: 234.5; IEC
// 60034-1 and IEC 60076: 235), the case computed: 10 ohm at 20 degC, 11.965 ohm hot, air at 20 degC.
TEST(PublishedRise, OfACopperWindingWithEitherConstant) {
  EXPECT_NEAR(rise_with(copper(), kRiseConstantAppliances), 50.00925, 1e-5);
  EXPECT_NEAR(rise_with(copper(), kRiseConstantMachines), 50.10750, 1e-5);
}

// IEC 60028:1925: 0.00393/K at 20 degC; seen from the temperature of no resistance, 1/0.00393 - 20 = 234.45 K (computed).
TEST(PublishedCopper, CoefficientAndRiseConstantAreOneLaw) {
  EXPECT_DOUBLE_EQ(copper().coefficient.value, 0.00393);
  EXPECT_NEAR(metal_of(copper().coefficient).rise_constant, 234.45, 0.005);
  EXPECT_EQ(copper().rise_constant, 234.5);
  EXPECT_EQ(aluminium().rise_constant, 225);
}

// Needs no standard: by that law copper changes by 14.4 % from 23 to 60 degC.
TEST(PublishedCopper, WarmedFrom23To60DegreesGains14Percent) {
  ResistanceRequest request;
  request.propagation.exact_bench = true;
  request.bench.temperature = StatedValue::exact(60, Unit::degree_celsius);
  const double r_23 = 0.35 * (1 + 0.00393 * 3), r_60 = 0.35 * (1 + 0.00393 * 40);
  EXPECT_NEAR(r_60 / r_23, 1.1437, 1e-4);
  const auto result = measure_resistance({readings_of_ohm(r_60)}, request);
  ASSERT_TRUE(result);
  EXPECT_NEAR(result->find("R_dc_20")->quantity.value, 0.35, 1e-6);
}

}  // namespace
}  // namespace coilassay::test
