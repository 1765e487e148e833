#include "analysis/coupling.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>

#include "analysis/coupling_advice.h"
#include "analysis/coupling_matrix.h"
#include "tests/support/coupled_bench.h"

namespace coilassay::test {
namespace {

using enum CouplingItem;
using testing::HasSubstr;

CouplingInput stated(CouplingItem item, double value, double ratio, std::optional<double> frequency = std::nullopt) {
  return {item, CouplingValue{StatedValue::rectangular(value, ratio * std::fabs(value), is_ratio(item) ? Unit::one : Unit::henry), frequency}};
}

Measurement measured(const CouplingRequest& request) {
  const auto m = measure_coupling(request);
  EXPECT_TRUE(m) << (m ? "" : m.error().finding);
  return m.value_or(Measurement{});
}

CouplingRequest request_of(std::vector<CouplingInput> inputs) {
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.inputs = std::move(inputs);
  return request;
}

const InputCheck* input(const Measurement& m, std::string_view item) {
  for (const InputCheck& each : m.inputs) {
    if (each.item == item) return &each;
  }
  return nullptr;
}

TEST(Coupling, EveryMethodFindsTheSameWindings) {
  for (const NamedMethod& method : coupling_methods()) {
    std::vector<CouplingInput> inputs;
    for (const CouplingItem item : method.items) inputs.push_back(stated(item, ideal_value(item, 100e-6, 400e-6, 0.6), 0.01));
    const Measurement m = measured(request_of(std::move(inputs)));
    ASSERT_NE(m.find("k"), nullptr) << method.name;
    EXPECT_NEAR(m.find("k")->quantity.value, 0.6, 1e-7) << method.name;
    if (const Estimate* l1 = m.find("L_1")) {
      EXPECT_NEAR(l1->quantity.value, 100e-6, 1e-11) << method.name;
    }
    if (const Estimate* mutual = m.find("M")) {
      EXPECT_NEAR(mutual->quantity.value, 120e-6, 1e-11) << method.name;
    }
    if (const Estimate* n = m.find("n")) {
      EXPECT_NEAR(n->quantity.value, 0.5, 1e-7) << method.name;
    }
  }
}

// k = sqrt(1 - Ls/Lo): a relative error e of each makes u(k) = sqrt(2) e (1 - k^2)/(2k), and the law of two rectangles.
TEST(Coupling, OpenAndShortHaveTheUncertaintyOfTheirFormula) {
  const Measurement m = measured(request_of({stated(primary_open, 100e-6, 0.01), stated(primary_short, 19e-6, 0.01)}));
  const Estimate* k = m.find("k");
  ASSERT_NE(k, nullptr);
  const double u = std::sqrt(2.0) * 0.01 / std::sqrt(3.0) * 0.19 / (2 * 0.9);
  EXPECT_NEAR(k->quantity.standard_uncertainty, u, 0.002 * u);
  // 95 % of a triangle of half-base 2a lie within 2a (1 - sqrt(0.05)): 1.902 standard uncertainties.
  EXPECT_NEAR(k->half_width() / u, 1.902, 0.02);
  EXPECT_EQ(m.find("M"), nullptr);   // L_2 is not known
  EXPECT_NE(m.find("L_leak_1"), nullptr);
}

TEST(Coupling, OneRatioIsKOverNAndBothAreKAndN) {
  const Measurement one = measured(request_of({stated(ratio_forward, 1.8, 0.01)}));
  ASSERT_NE(one.find("k_over_n"), nullptr);
  EXPECT_NEAR(one.find("k_over_n")->quantity.value, 1.8, 1e-9);
  EXPECT_EQ(one.find("k"), nullptr);
  EXPECT_TRUE(one.has_finding("too_few_inputs"));
  const Measurement other = measured(request_of({stated(ratio_reverse, 0.45, 0.01)}));
  EXPECT_NEAR(other.find("k_times_n")->quantity.value, 0.45, 1e-9);
  const Measurement both = measured(request_of({stated(ratio_forward, 1.8, 0.01), stated(ratio_reverse, 0.45, 0.01)}));
  EXPECT_NEAR(both.find("k")->quantity.value, 0.9, 1e-9);
  EXPECT_NEAR(both.find("n")->quantity.value, 0.5, 1e-9);
  EXPECT_EQ(both.find("k_over_n"), nullptr);
}

TEST(Coupling, WhatOnlyALimitIsKnownOfStandsInTheBounds) {
  const Measurement loose = measured(request_of({stated(primary_open, 100e-6, 0.01), stated(primary_short, 99e-6, 0.01)}));
  EXPECT_EQ(loose.find("k"), nullptr);
  ASSERT_EQ(loose.bounds.front().symbol, "k");
  ASSERT_TRUE(loose.bounds.front().at_most);
  EXPECT_FALSE(loose.bounds.front().at_least);
  EXPECT_GT(*loose.bounds.front().at_most, 0.1);
  EXPECT_LT(*loose.bounds.front().at_most, 0.2);
  const Measurement close = measured(request_of({stated(primary_open, 100e-6, 0.01), stated(secondary_open, 400e-6, 0.01),
                                                 stated(aiding, 899e-6, 0.01), stated(opposing, 101e-6, 0.01)}));
  EXPECT_EQ(close.find("k"), nullptr);
  ASSERT_TRUE(close.bounds.front().at_least);
  EXPECT_GT(*close.bounds.front().at_least, 0.98);
}

TEST(Coupling, DotsGiveTheSign) {
  CouplingRequest request = request_of({stated(primary_open, 100e-6, 0.01), stated(primary_short, 19e-6, 0.01), stated(secondary_open, 400e-6, 0.01)});
  EXPECT_TRUE(measured(request).has_finding("sign_unknown"));
  request.dots = Dots::opposite;
  const Measurement m = measured(request);
  EXPECT_FALSE(m.has_finding("sign_unknown"));
  ASSERT_NE(m.find("k"), nullptr);
  EXPECT_NEAR(m.find("k")->quantity.value, -0.9, 1e-6);
  EXPECT_LT(m.find("k")->high, -0.89);
  EXPECT_GT(m.find("k")->low, -0.91);
  EXPECT_NEAR(m.find("M")->quantity.value, -180e-6, 1e-9);
}

TEST(Coupling, EquivalentCircuitsAndTheirCorrelationsFollow) {
  const Measurement m = measured(request_of({stated(primary_open, 100e-6, 0.01), stated(primary_short, 19e-6, 0.01), stated(secondary_open, 400e-6, 0.01)}));
  ASSERT_EQ(m.equivalents.size(), 2u);
  const Equivalent& t = m.equivalents[0];
  EXPECT_NEAR(t.elements[0].quantity.value, -80e-6, 1e-10);
  EXPECT_NEAR(t.elements[1].quantity.value, 220e-6, 1e-10);
  EXPECT_NEAR(t.elements[2].quantity.value, 180e-6, 1e-10);
  const Equivalent& cantilever = m.equivalents[1];
  EXPECT_NEAR(cantilever.elements[0].quantity.value, 19e-6, 1e-11);
  EXPECT_NEAR(cantilever.elements[1].quantity.value, 81e-6, 1e-10);
  EXPECT_NEAR(cantilever.elements[2].quantity.value, 0.45, 1e-7);
  EXPECT_NEAR(t.correlation[0][1], t.correlation[1][0], 1e-12);
  EXPECT_EQ(t.correlation[2][2], 1);
  // L_a = L_1 - M: its variance follows from those of L_1 and M and their correlation.
  double r = 0;
  for (const auto& c : m.correlations) r = c.a == "L_1" && c.b == "M" ? c.value : r;
  const double u1 = m.find("L_1")->quantity.standard_uncertainty, um = m.find("M")->quantity.standard_uncertainty;
  EXPECT_NEAR(t.elements[0].quantity.standard_uncertainty, std::sqrt(u1 * u1 + um * um - 2 * r * u1 * um), 1e-3 * u1);
}

TEST(Coupling, AnErrorThatAllShareLeavesKAlone) {
  CouplingRequest request = request_of({stated(primary_open, 100e-6, 0.001), stated(primary_short, 19e-6, 0.001), stated(secondary_open, 400e-6, 0.001)});
  const Measurement alone = measured(request);
  request.common_accuracy = 0.02;
  const Measurement shared = measured(request);
  EXPECT_NEAR(shared.find("k")->half_width(), alone.find("k")->half_width(), 0.01 * alone.find("k")->half_width());
  EXPECT_NEAR(shared.find("n")->half_width(), alone.find("n")->half_width(), 0.01 * alone.find("n")->half_width());
  EXPECT_GT(shared.find("L_1")->half_width(), 10 * alone.find("L_1")->half_width());
}

// Lsc at wL2 = 10 R2 reads a leakage at k = 0.98 too large by 24 % (needs by algebra: 0.9604/101/0.0396).
TEST(Coupling, TakesTheResistanceOfTheShortedWindingOut) {
  synthetic::CoupledWindings w;
  w.windings = {{100e-6, 0, 0, 0}, {400e-6, 1, 0, 0}};
  w.coupling = {0.98};
  const double f = 10 / (2 * 3.141592653589793 * 400e-6);
  const double reads = synthetic::exact_impedance(w, synthetic::Connection::primary_short, f).imag() / (2 * 3.141592653589793 * f);
  EXPECT_NEAR(reads / (100e-6 * 0.0396), 1.24, 0.005);
  CouplingRequest request = request_of({stated(primary_open, 100e-6, 0.001, f), stated(secondary_open, 400e-6, 0.001, f), stated(primary_short, reads, 0.001, f)});
  request.winding_resistance_1 = StatedValue::exact(0, Unit::ohm);
  request.winding_resistance_2 = StatedValue::rectangular(1, 0.01, Unit::ohm);
  const Measurement m = measured(request);
  ASSERT_NE(m.find("L_leak_1"), nullptr);
  EXPECT_NEAR(m.find("L_leak_1")->quantity.value, 3.96e-6, 1e-9);
  EXPECT_TRUE(holds(m, "k", 0.98));
  EXPECT_TRUE(m.has_finding("imperfect_short"));
  // Left unsaid it would have been wrong.
  request.winding_resistance_2.reset();
  request.winding_resistance_1.reset();
  EXPECT_FALSE(holds(measured(request), "k", 0.98));
}

TEST(Coupling, TakesTheLinkOut) {
  synthetic::CoupledWindings w;
  w.windings = {{2e-6, 0, 0, 0}, {2e-6, 0, 0, 0}};
  w.coupling = {0.95};
  w.link_h = 50e-9;
  const double f = 1e6, reads = synthetic::exact_impedance(w, synthetic::Connection::primary_short, f).imag() / (2 * 3.141592653589793 * f);
  CouplingRequest request = request_of({stated(primary_open, 2e-6, 0.001, f), stated(secondary_open, 2e-6, 0.001, f), stated(primary_short, reads, 0.001, f)});
  request.link_inductance = StatedValue::rectangular(50e-9, 2e-9, Unit::henry);
  EXPECT_TRUE(holds(measured(request), "k", 0.95));
  request.link_inductance = StatedValue::exact(0, Unit::henry);
  EXPECT_FALSE(holds(measured(request), "k", 0.95));
}

TEST(Coupling, ExtrapolatesToLowFrequencyWhereTheOpenWindingResonates) {
  using enum synthetic::Connection;
  synthetic::CoupledWindings w;
  w.windings = {{24e-6, 0.1, 0, 200e-12}, {60e-6, 0.3, 0, 90e-12}};
  w.coupling = {0.72};
  w.noise_ratio = 1e-3;
  w.points = 31;
  w.first_hz = 1e5;
  w.last_hz = 1.5e6;
  const Measurement m = measured(swept(w, {primary_open, primary_short, secondary_open}));
  EXPECT_TRUE(m.has_finding("winding_capacitance"));
  EXPECT_NEAR(m.find("L_1")->quantity.value, 24e-6, 3 * m.find("L_1")->quantity.standard_uncertainty);
  EXPECT_NEAR(m.find("k")->quantity.value, 0.72, 3 * m.find("k")->quantity.standard_uncertainty);
  EXPECT_NEAR(m.model->parameters.at("C_1").value, 200e-12, 4 * m.model->parameters.at("C_1").standard_uncertainty);
  // At a frequency: what the terminals show there.
  CouplingRequest request = swept(w, {primary_open, primary_short, secondary_open});
  request.at_hz = {1e6, 3e5};
  const Measurement at = measured(request);
  ASSERT_EQ(at.points.size(), 2u);
  const double apparent = synthetic::exact_impedance(w, synthetic::Connection::primary_open, 1e6).imag() / (2 * 3.141592653589793e6);
  EXPECT_NEAR(at.find("L_1")->quantity.value, apparent, 3 * at.find("L_1")->quantity.standard_uncertainty);
  EXPECT_GT(apparent, 1.1 * 24e-6);
}

TEST(Coupling, ValuesAtThreeFrequenciesShowTheCapacitance) {
  synthetic::CoupledWindings w;
  w.windings = {{100e-6, 0, 0, 100e-12}, {100e-6, 0, 0, 0}};
  std::vector<CouplingInput> inputs;
  for (const double f : {100e3, 300e3, 600e3}) {
    inputs.push_back(stated(primary_open, synthetic::exact_impedance(w, synthetic::Connection::primary_open, f).imag() / (2 * 3.141592653589793 * f), 0.002, f));
  }
  const Measurement m = measured(request_of(inputs));
  EXPECT_TRUE(holds(m, "L_1", 100e-6));
  inputs.pop_back();
  EXPECT_TRUE(measured(request_of(inputs)).has_finding("winding_capacitance"));   // two are too few, and that is said
}

TEST(Coupling, APortFileGivesAllWithItsSign) {
  synthetic::CoupledWindings w;
  w.windings = {{24e-6, 0.1, 0.02, 0}, {60e-6, 0.3, 0.05, 0}};
  w.coupling = {-0.72};
  w.noise_ratio = 1e-3;
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.ports = *synthetic::simulate_ports(w);
  const Measurement m = measured(request);
  EXPECT_TRUE(holds(m, "k", -0.72));
  EXPECT_TRUE(holds(m, "L_2", 60e-6));
  EXPECT_FALSE(m.has_finding("sign_unknown"));
  EXPECT_FALSE(m.has_finding("model_misfit"));
}

TEST(Coupling, ResidualsAreInUnitsOfEachInputsUncertainty) {
  const Measurement m = measured(request_of({stated(primary_open, 100e-6, 0.001), stated(secondary_open, 400e-6, 0.001), stated(aiding, 740e-6, 0.001),
                                             stated(opposing, 260e-6, 0.001), stated(primary_short, 64e-6 * 1.02, 0.001)}));
  ASSERT_NE(input(m, "primary_short"), nullptr);
  EXPECT_GT(std::fabs(input(m, "primary_short")->residual_u), 3);
  EXPECT_TRUE(m.has_finding("inputs_disagree"));
  for (const Finding& f : m.findings) {
    if (f.code == "inputs_disagree") {
      EXPECT_THAT(f.message, HasSubstr("without the primary shorted"));
    }
  }
  // The interval is widened so that it still reaches what was right.
  EXPECT_GT(m.find("k")->high, 0.599);
}

TEST(Coupling, MatricesOfThreeWindings) {
  synthetic::CoupledWindings w;
  w.windings = {{24e-6, 0.1, 0, 20e-12}, {60e-6, 0.3, 0, 0}, {10e-6, 0.1, 0, 0}};
  w.coupling = {0.7, -0.3, 0.2};
  w.noise_ratio = 1e-3;
  CouplingRequest request;
  request.propagation.exact_bench = true;
  request.ports = *synthetic::simulate_ports(w);
  request.pair = {0, 2};
  const Measurement m = measured(request);
  ASSERT_TRUE(m.matrices);
  EXPECT_TRUE(m.matrices->positive_definite);
  for (const auto& [i, j, truth] : {std::tuple{0, 1, 0.7 * std::sqrt(24e-6 * 60e-6)}, std::tuple{0, 2, -0.3 * std::sqrt(24e-6 * 10e-6)}, std::tuple{2, 2, 10e-6}}) {
    const auto a = static_cast<std::size_t>(i), b = static_cast<std::size_t>(j);
    EXPECT_NEAR(m.matrices->inductance_h[a][b], truth, 2 * m.matrices->U_h[a][b]) << i << j;
    EXPECT_LT(m.matrices->U_h[a][b], 0.01 * std::fabs(truth));
  }
  EXPECT_TRUE(holds(m, "k", -0.3));
  EXPECT_TRUE(holds(m, "L_2", 10e-6));
}

TEST(Coupling, TheBreakerOfAnImpossibleMatrixIsNamed) {
  // Windings 1 and 2 near 3, and 1-2 with the wrong sign.
  const CouplingMatrixJudgement judged = judge_coupling_matrix({{1, -0.5, 0.8, 0}, {-0.5, 1, 0.8, 0.1}, {0.8, 0.8, 1, 0.1}, {0, 0.1, 0.1, 1}});
  EXPECT_LT(judged.smallest_eigenvalue, 0);
  ASSERT_TRUE(judged.breaker);
  // Of three windings c is possible between a b -+ sqrt((1 - a^2)(1 - b^2)).
  const CouplingMatrixJudgement three = judge_coupling_matrix({{1, -0.5, 0.8}, {-0.5, 1, 0.8}, {0.8, 0.8, 1}});
  ASSERT_TRUE(three.breaker);
  // 1-2 would have to go from -0.5 to 0.28, either of the others only from 0.8 to 0.12 above -0.4.
  const double from_others = 0.8 * -0.5 + std::sqrt((1 - 0.64) * (1 - 0.25));
  EXPECT_NEAR(three.nearest, from_others, 1e-6);
  EXPECT_FALSE(judge_coupling_matrix({{1, 0.5}, {0.5, 1}}).breaker);
}

TEST(CouplingAdvice, SaysWhichMethodSuitsWhichCoupling) {
  CouplingAdviceRequest request{.l1_h = 100e-6, .l2_h = 400e-6, .k = 0.1, .accuracy = 0.01, .ratio_accuracy = 0.01, .wanted = 0.1};
  const auto loose = advise_coupling(request);
  ASSERT_TRUE(loose);
  EXPECT_EQ(loose->best, "ratios");
  EXPECT_TRUE(loose->methods[0].at_low);   // open and short can give a limit only
  EXPECT_EQ(loose->methods[0].reaches, false);
  EXPECT_EQ(loose->sufficient.front(), "ratios");
  request.k = 0.98;
  const auto close = advise_coupling(request);
  ASSERT_TRUE(close);
  EXPECT_THAT(close->best, HasSubstr("open_short"));
  // sqrt(2) e (1 - k^2)/(2k) with e = 0.01/sqrt(3).
  EXPECT_NEAR(close->methods[0].u, std::sqrt(2.0) * 0.01 / std::sqrt(3.0) * (1 - 0.98 * 0.98) / (2 * 0.98), 2e-7);
  EXPECT_LE(close->methods.back().u, close->methods[0].u);
  request.k = 1.2;
  EXPECT_FALSE(advise_coupling(request));
}

// A sample of tests/proof/coupling_coverage: 8 cells of 12 trials; 95 % of 96 less four standard deviations.
TEST(Coupling, IntervalsCoverAsOftenAsTheySay) {
  for (const NamedMethod& method : coupling_methods()) {
    int covered = 0, tried = 0;
    for (const double k : {0.01, 0.1, 0.5, 0.98}) {
      for (const double noise : {0.0005, 0.01}) {
        Random random(17, static_cast<std::uint64_t>(1e4 * k + 1e6 * noise));
        for (int i = 0; i < 12; ++i) {
          const auto m = measure_coupling(drawn_values(method.items, 1e-4, 3e-4, k, noise, random));
          covered += m && holds(*m, "k", k) ? 1 : 0;
          ++tried;
        }
      }
    }
    EXPECT_GT(covered, 0.95 * tried - 4 * std::sqrt(0.0475 * tried)) << method.name;
  }
}

}  // namespace
}  // namespace coilassay::test
