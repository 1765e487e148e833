// One coil, written in every pair of quantities meters use, read back to the same impedance.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using test::MadeFiles;

class SweepTable : public MadeFiles {
 protected:
  Result<Sweep> sweep(const std::string& bytes, const ReadOptions& options = {}) const {
    auto recording = read_recording(made("sweep.csv", bytes), options);
    if (!recording) return failure(recording);
    if (!std::holds_alternative<Sweep>(*recording)) return failure(Problem::usage, "test", "read as waveforms", "");
    return std::get<Sweep>(std::move(*recording));
  }
};

constexpr double kPi = std::numbers::pi;

/// 47 uH and 0.4 ohm with 20 pF and 30 kohm across: the formulas below are written down once more, independent of the reader.
Complex coil(double f) {
  const Complex s(0, 2 * kPi * f);
  return 1.0 / (1.0 / (0.4 + s * 47e-6) + s * 20e-12 + 1.0 / 30e3);
}

struct Form {
  const char* heading;
  const char* as_read;
  std::function<std::pair<double, double>(double f, Complex z)> pair;
};

double w(double f) { return 2 * kPi * f; }

const Form kForms[] = {
    {"Frequency (Hz),Re(Z) (ohm),Im(Z) (ohm)", "Z", [](double, Complex z) { return std::pair{z.real(), z.imag()}; }},
    {"freq,R,X", "Z", [](double, Complex z) { return std::pair{z.real(), z.imag()}; }},
    {"f [Hz],|Z| [ohm],phase [deg]", "Z", [](double, Complex z) { return std::pair{std::abs(z), std::arg(z) * 180 / kPi}; }},
    {"f [Hz],Z [ohm],theta [rad]", "Z", [](double, Complex z) { return std::pair{std::abs(z), std::arg(z)}; }},
    {"f [Hz],Z [dB],phase [deg]", "Z", [](double, Complex z) { return std::pair{20 * std::log10(std::abs(z)), std::arg(z) * 180 / kPi}; }},
    {"f [Hz],Y real [S],Y imag [S]", "Y", [](double, Complex z) { return std::pair{(1.0 / z).real(), (1.0 / z).imag()}; }},
    {"f [Hz],Ls [H],Rs [ohm]", "L_s R_s", [](double f, Complex z) { return std::pair{z.imag() / w(f), z.real()}; }},
    {"f [Hz],Ls [uH],Q", "L_s Q", [](double f, Complex z) { return std::pair{1e6 * z.imag() / w(f), z.imag() / z.real()}; }},
    {"f [Hz],Ls [mH],D", "L_s D", [](double f, Complex z) { return std::pair{1e3 * z.imag() / w(f), z.real() / z.imag()}; }},
    {"f [Hz],Lp [H],Rp [kohm]", "L_p R_p", [](double f, Complex z) { return std::pair{-1 / ((1.0 / z).imag() * w(f)), 1e-3 / (1.0 / z).real()}; }},
    {"f [Hz],Lp [H],Q", "L_p Q", [](double f, Complex z) { return std::pair{-1 / ((1.0 / z).imag() * w(f)), z.imag() / z.real()}; }},
    {"f [Hz],Cs [pF],D", "C_s D", [](double f, Complex z) { return std::pair{-1e12 / (z.imag() * w(f)), z.real() / std::fabs(z.imag())}; }},
    {"f [Hz],Cp [pF],Rp [ohm]", "C_p R_p", [](double f, Complex z) { return std::pair{1e12 * (1.0 / z).imag() / w(f), 1 / (1.0 / z).real()}; }},
    {"f [Hz],Cp [pF],G [mS]", "C_p G", [](double f, Complex z) { return std::pair{1e12 * (1.0 / z).imag() / w(f), 1e3 * (1.0 / z).real()}; }},
    {"f [Hz],S11 re,S11 im", "S", [](double, Complex z) { const Complex s = (z - 50.0) / (z + 50.0); return std::pair{s.real(), s.imag()}; }},
    {"f [Hz],S11 [dB],phase [deg]", "S", [](double, Complex z) { const Complex s = (z - 50.0) / (z + 50.0);
      return std::pair{20 * std::log10(std::abs(s)), std::arg(s) * 180 / kPi}; }},
};

TEST_F(SweepTable, EveryPairGivesTheSameImpedance) {
  for (const Form& form : kForms) {
    std::string text = std::string(form.heading) + "\n";
    std::vector<double> frequencies;
    for (double f = 1e4; f < 2e6; f *= 1.5) frequencies.push_back(f);
    for (const double f : frequencies) {
      const auto [a, b] = form.pair(f, coil(f));
      text += fmt::format("{},{},{}\n", f, a, b);
    }
    const auto s = sweep(text);
    ASSERT_TRUE(s) << form.heading << ": " << s.error().finding;
    EXPECT_EQ(s->as_read, form.as_read);
    EXPECT_EQ(s->frequency_hz, frequencies);
    for (std::size_t i = 0; i < frequencies.size(); ++i) {
      const Complex z = coil(frequencies[i]);
      ASSERT_FALSE(s->bad[i]);
      // S near 1 loses digits when it is turned back.
      EXPECT_LT(std::abs(s->z_ohm[i].at(0) - z), 1e-9 * std::abs(z)) << form.heading << " at " << frequencies[i];
    }
  }
}

TEST_F(SweepTable, FrequencyMayStandInKilohertzAndFall) {
  const auto s = sweep("f (kHz);R (ohm);X (ohm)\n100;1,5;30\n50;1,25;15\n50;1,26;15\n10;1,0;3\n");
  ASSERT_TRUE(s) << s.error().finding;
  EXPECT_EQ(s->frequency_hz, (std::vector<double>{100e3, 50e3, 50e3, 10e3}));
  EXPECT_EQ(s->z_ohm[1][0], Complex(1.25, 15));
}

TEST_F(SweepTable, AStatusOrAMissingNumberMarksThePoint) {
  const auto s = sweep("f [Hz],Ls [H],Rs [ohm],status\n1e3,1e-3,2,0\n2e3,1e-3,2,4\n3e3,nan,2,0\n4e3,1e-3,2,0\n");
  ASSERT_TRUE(s) << s.error().finding;
  EXPECT_EQ(s->bad, (std::vector<bool>{false, true, true, false}));
}

TEST_F(SweepTable, ValuesOutOfRangeAreLeftOutAndTheirColumnIsNamed) {
  const auto s = sweep("f [Hz],R [ohm],X [ohm]\n1000.5,1.5,2.5\n2000.5,1.0e30,4.5\n3000.5,1.5,6.5\n");
  ASSERT_TRUE(s) << s.error().finding;
  EXPECT_EQ(s->bad, (std::vector<bool>{false, true, false}));
  ASSERT_FALSE(s->findings.empty());
  EXPECT_EQ(s->findings.back().message, "1 of 3 values of 'R' are out of range (beyond 1e15), and these points are left out");
  const auto all = sweep("f [Hz],R [ohm],X [ohm]\n1000.5,1.5,1.0e30\n2000.5,1.5,1.5e30\n3000.5,1.5,-1.0e30\n");
  ASSERT_FALSE(all);
  EXPECT_EQ(all.error().finding, "all values of 'X' are out of range (beyond 1e15)");
  const auto infinite = sweep("f [Hz],R [ohm],X [ohm]\n1000.5,inf,1.5\n2000.5,1.0e308,1.5\n3000.5,inf,2.5\n");
  ASSERT_FALSE(infinite);
  EXPECT_EQ(infinite.error().finding, "column 2 of the sweep holds no usable number: its cells are empty, no numbers, or out of range");
}

TEST_F(SweepTable, TheReferenceOfSIsTakenFromTheFileOrSaid) {
  const auto stated = sweep("# reference: 75 ohm\nf [Hz],S11 re,S11 im\n1e3,0,0\n2e3,0.5,0\n");
  ASSERT_TRUE(stated) << stated.error().finding;
  EXPECT_EQ(stated->reference_ohm, std::vector<double>{75});
  EXPECT_NEAR(stated->z_ohm[1][0].real(), 225, 1e-9);
  EXPECT_TRUE(stated->findings.empty());
  const auto unsaid = sweep("f [Hz],S11 re,S11 im\n1e3,0,0\n2e3,0.5,0\n");
  ASSERT_TRUE(unsaid);
  ASSERT_EQ(unsaid->findings.size(), 1U);
  EXPECT_EQ(unsaid->findings[0].code, "scale_suspect");
}

TEST_F(SweepTable, APhaseWithoutUnitIsDegreesWhenItIsLargeAndRefusedWhenItIsSmall) {
  const auto large = sweep("f,Z,phase\n1e3,10,45\n2e3,20,60\n");
  ASSERT_TRUE(large) << large.error().finding;
  ASSERT_EQ(large->findings.size(), 1U);
  EXPECT_EQ(large->findings[0].code, "angle_unit");
  EXPECT_NEAR(large->z_ohm[0][0].real(), 10 / std::sqrt(2.0), 1e-12);
  const auto small = sweep("f,Z,phase\n1e3,10,1.5\n2e3,20,1.55\n");
  ASSERT_FALSE(small);
  EXPECT_EQ(small.error().problem, Problem::ambiguous);
  ReadOptions key;  // what the remedy says
  key.columns = {"f [Hz]", "Z [ohm]", "phase [rad]"};
  const auto settled = sweep("f,Z,phase\n1e3,10,1.5\n2e3,20,1.55\n", key);
  ASSERT_TRUE(settled) << settled.error().finding;
  EXPECT_NEAR(settled->z_ohm[0][0].imag(), 10 * std::sin(1.5), 1e-12);
}

TEST_F(SweepTable, AnAmplitudeAgainstFrequencyIsNoImpedance) {
  const auto got = read_recording(made("response.csv", "frequency_Hz,V_out_V\n1e3,1\n2e3,2\n3e3,3\n"));
  ASSERT_TRUE(got);
  EXPECT_TRUE(std::holds_alternative<std::vector<Capture>>(*got));
}

TEST_F(SweepTable, TwoNumbersInOneCellOfASimulator) {
  for (const std::string degree : {"\xC2\xB0", "\xB0"}) {
    const auto polar = sweep("Freq.\tV(coil)\n1.0e+03\t(2.0e+01dB,9.0e+01" + degree + ")\n2.0e+03\t(4.0e+01dB,-9.0e+01" + degree + ")\n");
    ASSERT_TRUE(polar) << polar.error().finding;
    EXPECT_NEAR(polar->z_ohm[0][0].imag(), 10, 1e-12);
    EXPECT_NEAR(polar->z_ohm[1][0].imag(), -100, 1e-12);
    ASSERT_EQ(polar->findings.size(), 1U);
    EXPECT_EQ(polar->findings[0].code, "scale_suspect");
  }
  const auto cartesian = sweep("Freq.\tV(coil)/I(L1)\n1.0e+03\t1.5e+0,2.5e+1\n2.0e+03\t1.5e+0,5.0e+1\n");
  ASSERT_TRUE(cartesian) << cartesian.error().finding;
  EXPECT_EQ(cartesian->z_ohm[1][0], Complex(1.5, 50));
}

}  // namespace
}  // namespace coilassay
