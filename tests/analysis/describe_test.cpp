#include "analysis/describe.h"

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <numbers>

#include "analysis/describe_shapes.h"
#include "analysis/describe_spectrum.h"
#include "analysis/describe_suggestion.h"
#include "base/random.h"

namespace coilassay::test {
namespace {

constexpr double kTurn = 2 * std::numbers::pi;

using Shape = std::function<double(double)>;  // of the sample index

std::vector<double> record_of(std::size_t n, const Shape& shape, double noise, std::uint64_t seed, double step = 0) {
  Random random(seed);
  std::vector<double> v(n);
  for (std::size_t i = 0; i < n; ++i) {
    v[i] = shape(static_cast<double>(i)) + noise * random.normal();
    if (step > 0) v[i] = step * std::round(v[i] / step);
  }
  return v;
}

Channel channel_of(std::string name, Unit unit, std::vector<double> samples, double step = std::nan("")) {
  Channel channel;
  channel.name = std::move(name);
  channel.unit = unit;
  channel.unit_stated = true;
  channel.samples = std::move(samples);
  channel.resolution = step;
  for (const double v : channel.samples) channel.missing += std::isnan(v) ? std::size_t{1} : std::size_t{0};
  return channel;
}

Capture capture_of(std::vector<Channel> channels, double step_s = 1e-6, double start_s = 0) {
  Capture capture;
  capture.source.name = "coil.csv";
  capture.time.start_s = start_s;
  capture.time.step_s = step_s;
  capture.channels = std::move(channels);
  for (std::size_t i = 0; i < capture.channels.size(); ++i) capture.channels[i].column = i + 2;
  return capture;
}

const DescribeOptions kAllTests{{"ringdown", "sine", "ramp", "resistance", "sweep"}, {}};

Description described(Capture capture, const DescribeOptions& options = kAllTests) {
  return describe(Recording(std::vector<Capture>{std::move(capture)}), options);
}

const Finding* finding(const Description& d, std::string_view code) {
  for (const Finding& f : d.findings) {
    if (f.code == code) return &f;
  }
  return nullptr;
}

const Shape kSine = [](double i) { return std::sin(kTurn * i / 37.3); };
const Shape kRing = [](double i) {
  return i < 300 ? 0 : std::exp(-(i - 300) / 900) * std::cos(kTurn * (i - 300) / 40);
};
const Shape kSquare = [](double i) { return std::fmod(i, 200) < 100 ? 1.0 : -1.0; };
const Shape kOneStep = [](double i) { return i < 2600 ? 0.0 : 1.0; };
const Shape kSlowSquare = [](double i) { return std::fmod(i, 1900) < 900 ? 1.0 : -1.0; };
const Shape kRamp = [](double i) { return i < 500 ? 0.0 : i < 4000 ? (i - 500) / 3500 : 0.0; };
const Shape kHardlySampled = [](double i) { return std::sin(kTurn * i / 2.7); };

struct NoiseCase {
  const char* name;
  std::size_t n;
  const Shape* shape;
  double noise;
};

class NoiseOfShapes : public testing::TestWithParam<NoiseCase> {};

// The generator's own sigma is the truth. A single record scatters by a few percent (the median of several hundred
// powers), so the mean of eight is held to 12 % and each record to 30 %.
TEST_P(NoiseOfShapes, IsThatOfTheGeneratorWhateverTheSignal) {
  const NoiseCase& c = GetParam();
  double sum = 0;
  for (std::uint64_t seed = 1; seed <= 8; ++seed) {
    const double found = noise_of(record_of(c.n, *c.shape, c.noise, seed));
    EXPECT_NEAR(found / c.noise, 1, 0.3) << "seed " << seed;
    sum += found / c.noise / 8;
  }
  EXPECT_NEAR(sum, 1, 0.12);
}

INSTANTIATE_TEST_SUITE_P(
    Describe, NoiseOfShapes,
    testing::Values(NoiseCase{"sine", 5000, &kSine, 1e-3}, NoiseCase{"quiet_sine", 5000, &kSine, 1e-5},
                    NoiseCase{"loud_sine", 5000, &kSine, 0.5}, NoiseCase{"ring", 5000, &kRing, 2e-3},
                    NoiseCase{"long_ring", 60000, &kRing, 2e-3}, NoiseCase{"square", 5000, &kSquare, 1e-3},
                    NoiseCase{"one_step", 5000, &kOneStep, 1e-3}, NoiseCase{"slow_square", 5000, &kSlowSquare, 1e-3},
                    NoiseCase{"ramp", 5000, &kRamp, 1e-3}, NoiseCase{"hardly_sampled", 5000, &kHardlySampled, 1e-3},
                    NoiseCase{"short_sine", 600, &kSine, 1e-2}),
    [](const auto& one) { return std::string(one.param.name); });

// 64 and 128 samples leave some twenty to sixty powers: a factor, not percents.
TEST(DescribeNoise, OfShortRecordsIsRightWithinHalf) {
  for (const std::size_t n : {64u, 128u, 256u}) {
    double sum = 0;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) sum += noise_of(record_of(n, kSine, 0.01, seed)) / 0.01 / 20;
    EXPECT_NEAR(sum, 1, 0.25) << n;
  }
  EXPECT_TRUE(std::isnan(noise_of(record_of(31, kSine, 0.01, 1))));
}

TEST(DescribeNoise, IsNotKnownWhereNothingChanges) {
  EXPECT_TRUE(std::isnan(noise_of(std::vector<double>(1000, 1.5))));
  EXPECT_TRUE(std::isnan(noise_of(std::vector<double>(1000, std::nan("")))));
  EXPECT_TRUE(std::isnan(noise_of({})));
  EXPECT_TRUE(std::isnan(noise_of(record_of(5000, kOneStep, 0, 1))));
}

TEST(DescribeNoise, SkipsMissingSamples) {
  auto v = record_of(5000, kSine, 1e-3, 3);
  for (std::size_t i = 200; i < v.size(); i += 700) v[i] = std::nan("");
  EXPECT_NEAR(noise_of(v), 1e-3, 2e-4);
}

// A rounded sine has an error of a step over the square root of 12 at least, whatever its spectrum looks like.
TEST(Describe, NoiseUnderTheConvertersStepIsThatOfRoundingAndSaysSo) {
  const double step = 2.0 / 256;
  const auto quiet =
      described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, kSine, step / 20, 1, step), step)}));
  EXPECT_TRUE(quiet.channels[0].noise_is_rounding);
  EXPECT_DOUBLE_EQ(quiet.channels[0].noise, step / std::sqrt(12.0));
  EXPECT_NEAR(quiet.channels[0].effective_bits, 8, 0.1);  // 256 codes

  const auto loud =
      described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, kSine, 3 * step, 1, step), step)}));
  EXPECT_FALSE(loud.channels[0].noise_is_rounding);
  EXPECT_NEAR(loud.channels[0].noise, std::hypot(3 * step, step / std::sqrt(12.0)), 0.3 * step);
}

// What a simulator writes in full has no noise; the limit of the method is not shown for it.
TEST(Describe, ComputedSamplesHaveNoNoiseToBeShown) {
  const auto d = described(capture_of({channel_of("v", Unit::volt, record_of(5000, kSine, 0, 1))}));
  EXPECT_TRUE(std::isnan(d.channels[0].noise));
  EXPECT_TRUE(std::isnan(d.channels[0].effective_bits));
}

TEST(Describe, EffectiveBitsFollowFromSpanAndNoise) {
  for (const double noise : {1e-4, 1e-3, 1e-2}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(20000, kSine, noise, 5))}));
    const ChannelDescription& c = d.channels[0];
    EXPECT_NEAR(c.effective_bits, std::log2((c.max - c.min) / (std::sqrt(12.0) * noise)), 0.2);
  }
}

TEST(Describe, CountsSamplesAsTheyStandInTheFile) {
  auto samples = record_of(1000, kSine, 0, 1);
  samples[0] = samples[17] = std::nan("");
  const auto d = described(capture_of({channel_of("CH1", Unit::volt, samples)}, 2e-7, -1.6e-6));
  EXPECT_EQ(d.kind, "waveform");
  EXPECT_EQ(d.samples, 1000u);
  EXPECT_DOUBLE_EQ(d.start_s, -1.6e-6);
  EXPECT_DOUBLE_EQ(d.sample_interval_s, 2e-7);
  EXPECT_DOUBLE_EQ(d.span_s, 999 * 2e-7);
  EXPECT_EQ(d.channels[0].missing, 2u);
  EXPECT_DOUBLE_EQ(d.channels[0].first, samples[1]);
  EXPECT_DOUBLE_EQ(d.channels[0].last, samples[999]);
  ASSERT_EQ(d.segments.size(), 1u);
  EXPECT_EQ(d.segments[0].samples, 1000u);
}

TEST(Describe, PairsOfPeakDetectionHaveTheStepBetweenDistinctTimes) {
  Capture capture = capture_of({channel_of("CH1", Unit::volt, record_of(400, kSine, 1e-3, 1))});
  capture.time.step_s = std::nan("");
  for (std::size_t i = 0; i < 400; ++i) capture.time.times_s.push_back(1e-6 * static_cast<double>(i / 2));
  const auto d = described(capture);
  EXPECT_EQ(d.samples, 400u);
  EXPECT_TRUE(d.uniform);
  EXPECT_NEAR(d.sample_interval_s, 1e-6, 1e-12);
}

TEST(Describe, UnevenStepsHaveNoInterval) {
  Capture capture = capture_of({channel_of("v(out)", Unit::volt, record_of(400, kSine, 0, 1))});
  capture.time.step_s = std::nan("");
  for (std::size_t i = 0; i < 400; ++i) capture.time.times_s.push_back(1e-6 * std::pow(static_cast<double>(i), 1.3));
  const auto d = described(capture);
  EXPECT_FALSE(d.uniform);
  EXPECT_TRUE(std::isnan(d.sample_interval_s));
  EXPECT_DOUBLE_EQ(d.start_s, 0);
}

TEST(Describe, SegmentsAreListedAndCountedTogether) {
  std::vector<Capture> captures;
  for (std::size_t i = 0; i < 3; ++i) {
    captures.push_back(capture_of({channel_of("CH1", Unit::volt, std::vector<double>(100 + i, static_cast<double>(i)))},
                                  1e-6, 1e-3 * static_cast<double>(i)));
    captures.back().segment = "run " + std::to_string(i + 1);
  }
  const auto d = describe(Recording(captures), kAllTests);
  EXPECT_EQ(d.samples, 303u);
  ASSERT_EQ(d.segments.size(), 3u);
  EXPECT_EQ(d.segments[2].label, "run 3");
  EXPECT_DOUBLE_EQ(d.segments[2].start_s, 2e-3);
  EXPECT_DOUBLE_EQ(d.channels[0].min, 0);
  EXPECT_DOUBLE_EQ(d.channels[0].max, 2);
  EXPECT_DOUBLE_EQ(d.channels[0].last, 2);
}

TEST(Describe, CutCrestsAreClippedAndPlateausAreNot) {
  const Shape clipped = [](double i) { return std::clamp(kRing(i), -0.7, 0.7); };
  const auto cut = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, clipped, 0, 1))}));
  EXPECT_GT(cut.channels[0].clipped, 20u);
  ASSERT_NE(finding(cut, "clipped"), nullptr);
  EXPECT_EQ(finding(cut, "clipped")->about, "CH1");
  // Few, wide crests: each flat top is a tenth of the record.
  const Shape wide = [](double i) { return std::clamp(std::sin(kTurn * i / 400), -0.6, 0.6); };
  EXPECT_GT(described(capture_of({channel_of("CH1", Unit::volt, record_of(1400, wide, 0, 1))})).channels[0].clipped,
            500u);
  for (const Shape* plateau : {&kOneStep, &kSlowSquare}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, *plateau, 0, 1))}));
    EXPECT_EQ(d.channels[0].clipped, 0u);
  }
}

TEST(Describe, RangeUsedIsTheShareOfTheFullScale) {
  Channel channel = channel_of("CH1", Unit::volt, record_of(5000, kSine, 1e-3, 1));
  EXPECT_TRUE(std::isnan(described(capture_of({channel})).channels[0].range_used));
  channel.full_scale = 5;
  EXPECT_NEAR(described(capture_of({channel})).channels[0].range_used, 0.2, 0.01);
}

TEST(Describe, FewCodesAreACoarseRange) {
  const double step = 0.1;
  const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, kSine, 0, 1, step), step)}));
  EXPECT_NE(finding(d, "coarse_range"), nullptr);
}

TEST(Describe, SignsOfAliasingAreNamed) {
  const auto thin = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, kHardlySampled, 1e-3, 1))}));
  ASSERT_NE(finding(thin, "aliased"), nullptr);
  EXPECT_NEAR(finding(thin, "aliased")->figure, 2.7, 0.05);
  const Shape near_half = [](double i) { return std::sin(kTurn * i / 2.1); };
  const auto high = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, near_half, 1e-3, 1))}));
  ASSERT_NE(finding(high, "aliased"), nullptr);
  EXPECT_EQ(finding(high, "aliased")->severity, Severity::caution);
  for (const Shape* fine : {&kSine, &kRing, &kSquare, &kRamp}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, *fine, 1e-3, 1))}));
    EXPECT_EQ(finding(d, "aliased"), nullptr);
  }
  EXPECT_EQ(finding(described(capture_of({channel_of("CH1", Unit::volt,
                                                     record_of(
                                                         5000, [](double) { return 0.0; }, 1, 1))})),
                    "aliased"),
            nullptr);
}

TEST(Describe, FewerThanThreePeriodsAreNamed) {
  const Shape slow_ring = [](double i) { return std::exp(-i / 700) * std::cos(kTurn * i / 800); };
  const auto ring = described(capture_of({channel_of("CH1", Unit::volt, record_of(2000, slow_ring, 1e-3, 1))}));
  ASSERT_NE(finding(ring, "few_cycles"), nullptr);
  EXPECT_NEAR(finding(ring, "few_cycles")->figure, 2.5, 0.3);
  const Shape slow_sine = [](double i) { return std::sin(kTurn * i / 800 + 0.4); };
  const auto sine = described(capture_of({channel_of("CH1", Unit::volt, record_of(1900, slow_sine, 1e-3, 1))}));
  ASSERT_NE(finding(sine, "few_cycles"), nullptr);
  EXPECT_NEAR(finding(sine, "few_cycles")->figure, 2.375, 0.1);
  for (const Shape* enough : {&kSine, &kRing}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, *enough, 1e-3, 1))}));
    EXPECT_EQ(finding(d, "few_cycles"), nullptr);
  }
}

TEST(DescribeSuggestion, ARingingChannelIsMeasuredByItsDecay) {
  const auto ring = channel_of("CH2", Unit::volt, record_of(5000, kRing, 1e-3, 1));
  const auto alone = described(capture_of({ring})).suggestion;
  EXPECT_EQ(alone.test, "ringdown");
  EXPECT_EQ(alone.command, "coilassay ringdown coil.csv");
  const auto drive = channel_of("CH1", Unit::volt,
                                record_of(
                                    5000, [](double i) { return i < 300 ? 1.0 : 0.0; }, 1e-3, 2));
  EXPECT_EQ(described(capture_of({drive, ring})).suggestion.command, "coilassay ringdown coil.csv --voltage CH2");
}

TEST(DescribeSuggestion, SteadySinesOfVoltageAndCurrentAreASine) {
  const Shape lagging = [](double i) { return 0.1 * std::sin(kTurn * i / 37.3 - 1.4); };
  const auto volts = channel_of("U", Unit::volt, record_of(5000, kSine, 1e-3, 1));
  const auto amps = channel_of("I", Unit::ampere, record_of(5000, lagging, 1e-4, 2));
  const auto both = described(capture_of({volts, amps})).suggestion;
  EXPECT_EQ(both.test, "sine");
  EXPECT_EQ(both.command, "coilassay sine coil.csv --voltage U --current I");
  EXPECT_EQ(both.note, "");
  const auto shunt = channel_of("CH2", Unit::volt, record_of(5000, lagging, 1e-4, 2));
  const auto in_volt = described(capture_of({volts, shunt})).suggestion;
  EXPECT_EQ(in_volt.command, "coilassay sine coil.csv --voltage U --current CH2");
  EXPECT_NE(in_volt.note.find("--shunt"), std::string::npos);
  EXPECT_EQ(described(capture_of({volts})).suggestion.test, "");
}

TEST(DescribeSuggestion, ACurrentThatRampsUpIsARamp) {
  const Shape pulse = [](double i) { return i >= 500 && i < 4000 ? 10.0 : 0.0; };
  const Shape knee = [](double i) {
    const double x = i < 500 || i >= 4000 ? 0 : (i - 500) / 3500;
    return x + 0.5 * std::pow(x, 6);
  };
  for (const Shape* current : {&kRamp, &knee}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, pulse, 0.02, 1)),
                                         channel_of("CH2", Unit::ampere, record_of(5000, *current, 2e-3, 2))}));
    EXPECT_EQ(d.suggestion.test, "ramp");
    EXPECT_EQ(d.suggestion.command, "coilassay ramp coil.csv --voltage CH1 --current CH2");
  }
}

TEST(DescribeSuggestion, ReadingsOfBothPolaritiesAreAResistance) {
  Capture capture = capture_of({channel_of("V", Unit::volt, {0.1402, -0.1398, 0.1401, -0.1399}),
                                channel_of("I", Unit::ampere, {0.5, -0.5, 0.5, -0.5})},
                               std::nan(""), std::nan(""));
  const auto d = described(capture);
  EXPECT_EQ(d.suggestion.test, "resistance");
  EXPECT_EQ(d.suggestion.command, "coilassay resistance coil.csv --voltage V --current I");
}

TEST(DescribeSuggestion, AVoltageAndACurrentBetweenQuietEndsAreABurst) {
  // A chirp of 60 periods with quiet before and after; the current lags and falls with frequency.
  const Shape volts = [](double i) { return i < 500 || i > 3500 ? 0 : std::sin(kTurn * (i - 500) * (i - 500) / 150000); };
  const Shape amps = [](double i) {
    return i < 500 || i > 3500 ? 0 : -0.02 * std::cos(kTurn * (i - 500) * (i - 500) / 150000) * 300 / (i - 200);
  };
  const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, volts, 1e-3, 1)),
                                       channel_of("CH2", Unit::ampere, record_of(5000, amps, 1e-5, 2))}));
  EXPECT_EQ(d.suggestion.test, "sweep");
  EXPECT_EQ(d.suggestion.command, "coilassay sweep coil.csv --voltage CH1 --current CH2 --from-waveform");
}

TEST(DescribeSuggestion, NothingIsMadeOfNoiseStepsAndDrifts) {
  const Shape silence = [](double) { return 0.0; };
  for (const Shape* shape : {&silence, &kOneStep, &kSquare, &kRamp}) {
    const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, *shape, 1e-2, 4))}));
    EXPECT_EQ(d.suggestion.test, "") << "shape " << (shape - &kSine);
    EXPECT_EQ(d.suggestion.command, "");
  }
}

TEST(DescribeSuggestion, NamesOnlyTestsTheProgramHas) {
  Sweep sweep;
  sweep.source.name = "z.csv";
  sweep.frequency_hz = {1e6, 1e5, 1e4};
  sweep.z_ohm.assign(3, {{1, 2}});
  sweep.as_read = "R X";
  const auto with = describe(Recording(sweep), kAllTests);
  EXPECT_EQ(with.kind, "sweep");
  EXPECT_EQ(with.samples, 3u);
  EXPECT_DOUBLE_EQ(with.frequency_first_hz, 1e6);
  EXPECT_DOUBLE_EQ(with.frequency_last_hz, 1e4);
  EXPECT_EQ(with.suggestion.command, "coilassay sweep z.csv");
  const auto without = describe(Recording(sweep), {.tests = {"ringdown"}, .arguments = {}});
  EXPECT_EQ(without.suggestion.test, "");
  EXPECT_EQ(without.suggestion.command, "");
  EXPECT_EQ(without.suggestion.looks_like, "impedance against frequency");
}

TEST(DescribeSuggestion, RepeatsWhatWasNeededToReadTheFile) {
  const auto d = described(capture_of({channel_of("CH1", Unit::volt, record_of(5000, kRing, 1e-3, 1))}),
                           {.tests = {"ringdown"}, .arguments = {"--delimiter", ";"}});
  EXPECT_EQ(d.suggestion.command, "coilassay ringdown coil.csv --delimiter ';'");
}

TEST(DescribeSuggestion, NamesAreQuotedForAShell) {
  EXPECT_EQ(shell_word("ring.csv"), "ring.csv");
  EXPECT_EQ(shell_word("my ring.csv"), "'my ring.csv'");
  EXPECT_EQ(shell_word("it's; rm -rf $(x).csv"), "'it'\\''s; rm -rf $(x).csv'");
  EXPECT_EQ(shell_word(""), "''");
  EXPECT_EQ(shell_word("~/a"), "'~/a'");
  EXPECT_EQ(shell_word("a\nb\x1b'"), "$'a\\012b\\033\\''");
  EXPECT_EQ(shell_word("\xff.csv"), "$'\\377.csv'");
  Capture capture = capture_of({channel_of("CH1", Unit::volt, record_of(5000, kRing, 1e-3, 1))});
  capture.source.name = "-rf.csv";
  EXPECT_EQ(described(capture).suggestion.command, "coilassay ringdown ./-rf.csv");
}

}  // namespace
}  // namespace coilassay::test
