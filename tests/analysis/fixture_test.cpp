// Fixtures put around parts, and taken out again with honest errors.
#include "analysis/fixture.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numbers>

#include "analysis/fixture_checks.h"
#include "base/random.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using namespace std::chrono_literals;
constexpr double kTwoPi = 2 * std::numbers::pi;

/// Leads of 18 nH and 30 mohm, strays of 1.2 pF; the standards as they really are.
struct Bench {
  double lead_h = 18e-9, lead_ohm = 0.03, stray_f = 1.2e-12;
  double short_h = 0.4e-9, short_ohm = 1e-3, open_f = 0, load_ohm = 100, load_h = 1e-9;
  double noise = 0;
  std::uint64_t seed = 1;

  Complex around(double f, Complex part_siemens) const {
    const double w = kTwoPi * f;
    return Complex(lead_ohm, w * lead_h) + 1.0 / (Complex(0, w * stray_f) + part_siemens);
  }
};

std::vector<double> decades(double from, double to, std::size_t count) {
  std::vector<double> f;
  for (std::size_t i = 0; i < count; ++i) f.push_back(from * std::pow(to / from, static_cast<double>(i) / static_cast<double>(count - 1)));
  return f;
}

template <class Admittance>
Sweep measured(const Bench& b, const std::vector<double>& frequency, std::uint64_t stream, const Admittance& of) {
  Sweep s;
  s.source = {"made.csv", "00", 0, ""};
  s.as_read = "Z";
  Random random(b.seed, stream);
  for (const double f : frequency) {
    s.frequency_hz.push_back(f);
    s.z_ohm.push_back({b.around(f, of(kTwoPi * f)) * (1.0 + b.noise * Complex(random.normal(), random.normal()))});
    s.bad.push_back(false);
  }
  return s;
}

StandardSweeps standards(const Bench& b, const std::vector<double>& frequency) {
  StandardSweeps s;
  s.open = measured(b, frequency, 1, [&](double w) { return Complex(0, w * b.open_f); });
  s.short_circuit = measured(b, frequency, 2, [&](double w) { return 1.0 / Complex(b.short_ohm, w * b.short_h); });
  s.load = measured(b, frequency, 3, [&](double w) { return 1.0 / Complex(b.load_ohm, w * b.load_h); });
  return s;
}

/// 2.2 uH, 0.2 ohm, 3 pF.
Complex part(double w) { return 1.0 / Complex(0.2, w * 2.2e-6) + Complex(0, w * 3e-12); }

FixtureSet described() {
  FixtureSet set;
  set.name = "tweezers";
  set.made = 2026y / 12 / 1;
  set.expires = 2027y / 3 / 1;
  set.short_inductance = StatedValue::exact(0.4e-9, Unit::henry);
  set.short_resistance = StatedValue::exact(1e-3, Unit::ohm);
  set.load_value = StatedValue::exact(100, Unit::ohm);
  set.load_inductance = StatedValue::exact(1e-9, Unit::henry);
  return set;
}

CorrectedSweep corrected(Sweep sweep, const FixtureSet& set, const PropagationOptions& options = {},
                         std::chrono::year_month_day today = 2026y / 12 / 24) {
  auto c = without_fixture({std::move(sweep), {}}, set, Connection::reflect, 1, today, options);
  EXPECT_TRUE(c) << (c ? "" : c.error().finding);
  return c ? std::move(*c) : CorrectedSweep{};
}

FixtureSet made(const StandardSweeps& s, const FixtureSet& as) {
  const auto set = make_fixture_set(s, as);
  EXPECT_TRUE(set) << (set ? "" : set.error().finding);
  return set ? *set : FixtureSet{};
}

double worst_error(const CorrectedSweep& c) {
  double worst = 0;
  for (std::size_t i = 0; i < c.sweep.frequency_hz.size(); ++i) {
    worst = std::fmax(worst, std::abs(c.sweep.z_ohm[i][0] * part(kTwoPi * c.sweep.frequency_hz[i]) - 1.0));
  }
  return worst;
}

TEST(Fixture, IsTakenOutWithAndWithoutALoadAlsoBetweenItsFrequencies) {
  const Bench b;
  const auto grid = decades(1e3, 30e6, 151), between = decades(1.1e3, 29e6, 77);
  for (const bool with_load : {false, true}) {
    StandardSweeps s = standards(b, grid);
    if (!with_load) s.load.reset();
    FixtureSet as = described();
    if (!with_load) as.load_value.reset();
    const FixtureSet set = made(s, as);
    EXPECT_LT(worst_error(corrected(measured(b, grid, 9, part), set)), 1e-9);
    // 37 points a decade: the resonance of leads and strays lies far above, so little bends between them.
    EXPECT_LT(worst_error(corrected(measured(b, between, 9, part), set)), 1e-7);
  }
}

TEST(Fixture, WhatIsNotKnownOfTheStandardsIsAnErrorOfAllPointsTogether) {
  // Every standard off by one standard uncertainty of what was stated, one after another: the term is the change it makes.
  const auto grid = decades(10e3, 10e6, 31);
  struct Case {
    const char* source;
    double Bench::*what;
    double by;
  };
  for (const Case& each : {Case{"short inductance", &Bench::short_h, 0.1e-9}, Case{"short resistance", &Bench::short_ohm, 1e-3},
                           Case{"open capacitance", &Bench::open_f, 10e-15}, Case{"load standard", &Bench::load_ohm, 0.1},
                           Case{"load inductance", &Bench::load_h, 0.5e-9}}) {
    FixtureSet as = described();
    as.short_inductance = StatedValue::normal(0.4e-9, 0.1e-9, Unit::henry);
    as.short_resistance = StatedValue::normal(1e-3, 1e-3, Unit::ohm);
    as.open_capacitance = StatedValue::normal(0, 10e-15, Unit::farad);
    as.load_value = StatedValue::normal(100, 0.1, Unit::ohm);
    as.load_inductance = StatedValue::normal(1e-9, 0.5e-9, Unit::henry);
    Bench off;
    off.*each.what += each.by;
    const CorrectedSweep c = corrected(measured(off, grid, 9, part), made(standards(off, grid), as));
    const auto term = std::find_if(c.knowledge.errors.begin(), c.knowledge.errors.end(),
                                   [&](const ImpedanceErrorTerm& t) { return t.source == each.source; });
    ASSERT_NE(term, c.knowledge.errors.end()) << each.source;
    EXPECT_TRUE(term->common);
    for (std::size_t i = 0; i < grid.size(); ++i) {
      const Complex error = 1.0 / part(kTwoPi * grid[i]) - c.sweep.z_ohm[i][0];
      EXPECT_LT(std::abs(term->dz_ohm[i] - error), 0.03 * std::abs(error) + 1e-9) << each.source << " " << grid[i];
    }
  }
}

TEST(Fixture, DefaultsStandInWhereNothingWasStatedAndNotOnAnExactBench) {
  const auto grid = decades(10e3, 10e6, 31);
  FixtureSet as;
  as.short_inductance = StatedValue::unstated(0, Unit::henry);
  StandardSweeps s = standards({}, grid);
  s.load.reset();
  const FixtureSet set = made(s, as);
  const auto sources = [](const CorrectedSweep& c) {
    std::vector<std::string> names;
    for (const ImpedanceErrorTerm& t : c.knowledge.errors) names.push_back(t.source);
    return names;
  };
  EXPECT_THAT(sources(corrected(measured({}, grid, 9, part), set)),
              testing::IsSupersetOf({"short inductance", "short resistance", "open capacitance"}));
  EXPECT_THAT(sources(corrected(measured({}, grid, 9, part), set, {.exact_bench = true})),
              testing::Not(testing::Contains("short inductance")));
}

TEST(Fixture, ErrorsThatWereThereAreCarriedThrough) {
  const Bench b;
  const auto grid = decades(10e3, 20e6, 31);
  Sweep sweep = measured(b, grid, 9, part);
  SweepKnowledge known;
  known.u_ratio.assign(grid.size(), 1e-3);
  ImpedanceErrorTerm gain{"gain", {ErrorLaw::Kind::normal, 1, 0}, 'B', true, "stated", {}};
  for (std::size_t i = 0; i < grid.size(); ++i) gain.dz_ohm.push_back(0.01 * sweep.z_ohm[i][0]);
  known.errors.push_back(gain);
  const FixtureSet set = made(standards(b, grid), described());
  Sweep moved = sweep;
  for (auto& z : moved.z_ohm) z[0] *= 1.0001;
  const auto c = without_fixture({sweep, known}, set, Connection::reflect, 1, 2026y / 12 / 2, {});
  const auto other = without_fixture({moved, known}, set, Connection::reflect, 1, 2026y / 12 / 2, {});
  ASSERT_TRUE(c && other);
  for (std::size_t i = 0; i < grid.size(); ++i) {
    const Complex change = other->sweep.z_ohm[i][0] - c->sweep.z_ohm[i][0];
    EXPECT_LT(std::abs(c->knowledge.errors[0].dz_ohm[i] - 100.0 * change), 0.02 * std::abs(100.0 * change));
    EXPECT_NEAR(c->knowledge.u_ratio[i], 10 * std::abs(change / c->sweep.z_ohm[i][0]), 2e-2 * c->knowledge.u_ratio[i]);
  }
}

TEST(Fixture, ASweepThatLeavesTheGridOrHangsOtherwiseIsRefused) {
  const auto grid = decades(10e3, 10e6, 31);
  const FixtureSet set = made(standards({}, grid), described());
  const auto wide = without_fixture({measured({}, decades(5e3, 1e6, 11), 9, part), {}}, set, Connection::reflect, 1, 2026y / 12 / 2, {});
  ASSERT_FALSE(wide);
  EXPECT_EQ(wide.error().finding, "set 'tweezers' covers 10.00 kHz to 10.00 MHz, and the sweep goes from 5.000 kHz to 1.000 MHz");
  const auto otherwise = without_fixture({measured({}, grid, 9, part), {}}, set, Connection::series, 1, 2026y / 12 / 2, {});
  ASSERT_FALSE(otherwise);
  EXPECT_EQ(otherwise.error().place, "--fixture");
}

TEST(Fixture, AnExpiredSetAndALargeCorrectionAreSaid) {
  const auto has = [](const CorrectedSweep& c, const char* code, Severity severity) {
    return std::any_of(c.sweep.findings.begin(), c.sweep.findings.end(),
                       [&](const Finding& f) { return f.code == code && f.severity == severity; });
  };
  const auto grid = decades(100e3, 10e6, 31);
  const FixtureSet set = made(standards({}, grid), described());
  const CorrectedSweep last_day = corrected(measured({}, grid, 9, part), set, {}, 2027y / 3 / 1);
  EXPECT_TRUE(last_day.sweep.findings.empty()) << last_day.sweep.findings.front().message;
  EXPECT_TRUE(has(corrected(measured({}, grid, 9, part), set, {}, 2027y / 3 / 2), "fixture_expired", Severity::caution));
  EXPECT_TRUE(has(corrected(measured({}, grid, 9, part), set, {}, 2026y / 11 / 30), "fixture_in_future", Severity::note));
  // Leads of 500 nH on 2.2 uH: a quarter.
  Bench leads;
  leads.lead_h = 500e-9;
  EXPECT_TRUE(has(corrected(measured(leads, grid, 9, part), made(standards(leads, grid), described())), "fixture_residual", Severity::note));
  leads.lead_h = 1.5e-6;
  EXPECT_TRUE(has(corrected(measured(leads, grid, 9, part), made(standards(leads, grid), described())), "fixture_residual", Severity::caution));
}

TEST(FixtureMaking, AStandardThatIsNotWhatItIsCalledIsRefused) {
  const auto grid = decades(10e3, 10e6, 31);
  const auto finding = [&](const auto& spoil) {
    StandardSweeps s = standards({}, grid);
    spoil(s);
    const auto set = make_fixture_set(s, described());
    return set ? std::string("made") : set.error().finding;
  };
  using testing::HasSubstr;
  EXPECT_EQ(finding([](StandardSweeps&) {}), "made");
  EXPECT_THAT(finding([](StandardSweeps& s) { std::swap(s.open, s.short_circuit); }), HasSubstr("they are exchanged"));
  EXPECT_THAT(finding([](StandardSweeps& s) { s.open = s.short_circuit; }), HasSubstr("hardly more than the short"));
  EXPECT_THAT(finding([&](StandardSweeps& s) {
                s.short_circuit = measured({}, grid, 2, [](double) { return Complex(1 / 40.0); });
              }),
              HasSubstr("it does not touch"));
  EXPECT_THAT(finding([](StandardSweeps& s) { s.load = s.open; }), HasSubstr("about as much as the open"));
  EXPECT_THAT(finding([](StandardSweeps& s) { s.load = s.short_circuit; }), HasSubstr("about as much as the short"));
  EXPECT_THAT(finding([](StandardSweeps& s) { s.short_circuit.frequency_hz[3] *= 1.01; }), HasSubstr("other frequencies"));
}

TEST(FixtureMaking, AStandardOfAnotherKindIsRefusedWithWhatItIs) {
  const auto grid = decades(10e3, 10e6, 61);
  const auto finding = [&](const auto& spoil, const FixtureSet& as) {
    StandardSweeps s = standards({}, grid);
    spoil(s);
    const auto set = make_fixture_set(s, as);
    return set ? std::string("made") : set.error().finding;
  };
  const auto conjugate = [](Sweep& s) {
    for (auto& z : s.z_ohm) z[0] = std::conj(z[0]);
  };
  const auto coil = [&](double h) { return measured({}, grid, 4, [h](double w) { return 1.0 / Complex(0.2, w * h); }); };
  using testing::HasSubstr;
  const auto stated = [](double value, Unit unit) {
    FixtureSet as = described();
    as.load_value = StatedValue::exact(value, unit);
    if (unit != Unit::ohm) as.load_inductance.reset();
    return as;
  };
  const auto nothing = [](StandardSweeps&) {};
  EXPECT_EQ(finding(nothing, stated(100, Unit::ohm)), "made");
  EXPECT_EQ(finding(nothing, stated(180, Unit::ohm)), "made");
  EXPECT_EQ(finding(nothing, stated(1e6, Unit::ohm)), "the load behind open and short is about 100 Ω, and 1.00 MΩ is stated");
  EXPECT_EQ(finding(nothing, stated(1e-12, Unit::farad)), "the load behind open and short is about 100 Ω, and 1.00 pF is stated");
  // The same size at 100 kHz, and another kind.
  EXPECT_THAT(finding(nothing, stated(1 / (kTwoPi * 1e5 * 100), Unit::farad)), HasSubstr("is about 100 Ω, and 15.9 nF is stated"));
  const auto capacitor = [&](StandardSweeps& s) { s.load = measured({}, grid, 4, [](double w) { return Complex(0, w * 1e-9); }); };
  EXPECT_EQ(finding(capacitor, stated(1e-9, Unit::farad)), "made");
  EXPECT_THAT(finding(capacitor, stated(100, Unit::ohm)), HasSubstr("is about 1.00 nF, and 100 Ω is stated"));

  FixtureSet as = described();
  as.load_value.reset();
  const auto without_load = [&](const auto& spoil) {
    return finding([&](StandardSweeps& s) {
      s.load.reset();
      spoil(s);
    }, as);
  };
  EXPECT_EQ(without_load(nothing), "made");
  EXPECT_EQ(without_load([&](StandardSweeps& s) { s.open = coil(10e-6); }), "the open is inductive, like a coil of 10.0 µH: a part is still in the fixture");
  EXPECT_THAT(without_load([&](StandardSweeps& s) { s.open = coil(10e-3); }), HasSubstr("the open is inductive, like a coil of 10.0 mH"));
  EXPECT_THAT(without_load([&](StandardSweeps& s) { conjugate(s.open); }), HasSubstr("capacitance is negative (-1.20 pF)"));
  EXPECT_THAT(without_load([&](StandardSweeps& s) { s.open = measured({}, grid, 4, [](double) { return Complex(0.01); }); }),
              HasSubstr("like a resistor of 100 Ω"));
  EXPECT_THAT(without_load([&](StandardSweeps& s) { s.short_circuit = coil(10e-6); }), HasSubstr("the short has 10.0 µH in series"));
  EXPECT_THAT(without_load([&](StandardSweeps& s) { conjugate(s.short_circuit); }), HasSubstr("the short's reactance is negative, like -18.4 nH"));
}

TEST(FixtureMaking, ACleanOpenInNoiseAndAMeterThatIsALittleOffAreNoReasonToRefuse) {
  // An open after the meter's own compensation: nothing but noise about zero, or an offset that does not follow any law.
  const auto grid = decades(1e3, 1e6, 91);
  Random random(7, 1);
  for (const double offset : {0.0, -3e-6}) {
    StandardSweeps s = standards({}, grid);
    s.load.reset();
    FixtureSet as = described();
    as.load_value.reset();
    for (auto& z : s.open.z_ohm) z[0] = 1.0 / Complex(1e-6 * random.normal(), offset + 1e-6 * random.normal());
    // Of the short some milliohm and a phase error of the meter that turns its sign.
    for (auto& z : s.short_circuit.z_ohm) z[0] = Complex(30e-3, -5e-3);
    const auto set = make_fixture_set(s, as);
    ASSERT_TRUE(set) << set.error().finding;
    EXPECT_TRUE(doubts_about(*set).empty());
  }
}

TEST(FixtureMaking, LeadsOfAMetreAreACaution) {
  const auto grid = decades(10e3, 10e6, 61);
  FixtureSet as = described();
  Bench b;
  EXPECT_TRUE(doubts_about(made(standards(b, grid), as)).empty());
  b.lead_h = 1.5e-6;
  const auto doubts = doubts_about(made(standards(b, grid), as));
  ASSERT_EQ(doubts.size(), 1u);
  EXPECT_EQ(doubts[0].code, "fixture_short");
  EXPECT_THAT(doubts[0].message, testing::HasSubstr("1.50 µH"));
}

TEST(FixtureMaking, SaysWhatItTakesOutAtEachDecade) {
  StandardSweeps s = standards({}, decades(2e3, 30e6, 151));
  s.load.reset();
  FixtureSet as = described();
  as.load_value.reset();
  const auto effects = fixture_effects(made(s, as), 10e-6);
  std::vector<double> at;
  for (const FixtureEffect& e : effects) {
    at.push_back(std::round(e.frequency_hz));
    EXPECT_NEAR(e.series_h, 18e-9, 1e-11);
    EXPECT_NEAR(e.series_ohm, 0.03, 1e-4);
    EXPECT_NEAR(e.parallel_f, 1.2e-12, 1e-15);
  }
  EXPECT_THAT(at, testing::ElementsAre(2e3, 1e4, 1e5, 1e6, 1e7, 3e7));
  EXPECT_NEAR(effects[2].part_share, 18e-9 / 10e-6, 2e-5);   // at 100 kHz the strays add 0.0005 %
}

TEST(ReferencePlane, MovesByLengthOrDelayAndSaysHowWellItIsKnown) {
  // A line of 30 mm at 2/3 of the speed of light in front of the part, 50 ohm.
  Sweep sweep;
  sweep.source.name = "line.s1p";
  sweep.as_read = "S";
  const double delay = 0.03 / (299792458.0 * 2 / 3);
  for (const double f : decades(1e6, 1e9, 21)) {
    const double t = std::tan(kTwoPi * f * delay);
    const Complex z = 1.0 / part(kTwoPi * f);
    sweep.frequency_hz.push_back(f);
    sweep.z_ohm.push_back({50.0 * (z + Complex(0, 50 * t)) / (50.0 + Complex(0, t) * z)});
    sweep.bad.push_back(false);
  }
  const auto by_length = at_reference_plane({sweep, {}}, {StatedValue::rectangular(0.03, 0.0005, Unit::metre), 2.0 / 3, 50}, {});
  const auto by_delay = at_reference_plane({sweep, {}}, {StatedValue::exact(delay, Unit::second), 1, 50}, {});
  ASSERT_TRUE(by_length && by_delay);
  EXPECT_LT(worst_error(*by_length), 1e-9);
  EXPECT_LT(worst_error(*by_delay), 1e-9);
  ASSERT_EQ(by_length->knowledge.errors.size(), 1u);
  EXPECT_TRUE(by_delay->knowledge.errors.empty());
  // Half a millimetre of line, rectangular: 1.44 ps, and at low frequency Z0 times that in henries.
  const double u_delay = 0.0005 / std::sqrt(3.0) / 0.03 * delay;
  EXPECT_NEAR(std::abs(by_length->knowledge.errors[0].dz_ohm[0]) / (kTwoPi * 1e6 * 50 * u_delay), 1, 0.15);   // |Z| is 14 ohm of 50
  // And back.
  auto back = at_reference_plane(std::move(*by_delay), {StatedValue::exact(-delay, Unit::second), 1, 50}, {});
  ASSERT_TRUE(back);
  EXPECT_LT(std::abs(back->sweep.z_ohm[5][0] - sweep.z_ohm[5][0]), 1e-9 * std::abs(sweep.z_ohm[5][0]));
  EXPECT_FALSE(at_reference_plane({sweep, {}}, {StatedValue::exact(0.01, Unit::metre), 1.2, 50}, {}));
}

TEST(TwoPortRemoval, TakesAnAdapterOutWithTheErrorsOfItsFile) {
  Sweep adapter, sweep;
  adapter.source.name = "adapter.s2p";
  adapter.ports = 2;
  adapter.reference_ohm = {50, 50};
  sweep.as_read = "S";
  for (const double f : decades(1e6, 100e6, 21)) {
    const Complex lead(0.5, kTwoPi * f * 10e-9);
    adapter.frequency_hz.push_back(f);
    adapter.scattering.push_back({lead / (lead + 100.0), 100.0 / (lead + 100.0), 100.0 / (lead + 100.0), lead / (lead + 100.0)});
    adapter.z_ohm.push_back(std::vector<Complex>(4, std::nan("")));
    sweep.frequency_hz.push_back(f);
    sweep.z_ohm.push_back({lead + 1.0 / part(kTwoPi * f)});
    sweep.bad.push_back(false);
  }
  const auto c = without_two_port({sweep, {}}, adapter, "--remove-port1", {});
  ASSERT_TRUE(c) << c.error().finding;
  EXPECT_LT(worst_error(*c), 1e-9);
  EXPECT_EQ(c->knowledge.errors.size(), 6u);
  EXPECT_TRUE(without_two_port({sweep, {}}, adapter, "--remove-port1", {.exact_bench = true})->knowledge.errors.empty());
}

}  // namespace
}  // namespace coilassay
