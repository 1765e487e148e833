// Touchstone: one network written in every version, format, unit and order, read back to the same impedances.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <cmath>
#include <complex>
#include <numbers>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using Complex = std::complex<double>;
using Matrix = std::vector<Complex>;
using test::MadeFiles;

constexpr double kPi = std::numbers::pi;

class Touchstone : public MadeFiles {
 protected:
  Result<Sweep> sweep(const std::string& name, const std::string& bytes) const {
    auto recording = read_recording(made(name, bytes));
    if (!recording) return failure(recording);
    return std::get<Sweep>(std::move(*recording));
  }
};

/// Two coupled coils, 10 uH and 40 uH, k = 0.5, with 1 and 2 ohm.
Matrix transformer(double f) {
  const double w = 2 * kPi * f;
  return {Complex(1, w * 10e-6), Complex(0, w * 10e-6), Complex(0, w * 10e-6), Complex(2, w * 40e-6)};
}

/// S of a two-port from Z by the textbook formulas, references apart (written out, independent of the reader).
Matrix scattering(const Matrix& z, double r1, double r2) {
  const Complex d = (z[0] + r1) * (z[3] + r2) - z[1] * z[2];
  const double root = 2 * std::sqrt(r1 * r2);
  return {((z[0] - r1) * (z[3] + r2) - z[1] * z[2]) / d, root * z[1] / d, root * z[2] / d, ((z[0] + r1) * (z[3] - r2) - z[1] * z[2]) / d};
}

Matrix admittance(const Matrix& z) {
  const Complex d = z[0] * z[3] - z[1] * z[2];
  return {z[3] / d, -z[1] / d, -z[2] / d, z[0] / d};
}

std::string number_pair(Complex v, const std::string& format) {
  if (format == "RI") return fmt::format(" {} {}", v.real(), v.imag());
  const double degrees = std::arg(v) * 180 / kPi;
  if (format == "DB") return fmt::format(" {} {}", 20 * std::log10(std::abs(v)), degrees);
  return fmt::format(" {} {}", std::abs(v), degrees);
}

void expect_near(const Sweep& s, const std::vector<double>& frequencies, Matrix (*truth)(double)) {
  ASSERT_EQ(s.frequency_hz.size(), frequencies.size());
  for (std::size_t i = 0; i < frequencies.size(); ++i) {
    EXPECT_NEAR(s.frequency_hz[i], frequencies[i], 1e-9 * frequencies[i]);
    const Matrix z = truth(frequencies[i]);
    ASSERT_EQ(s.z_ohm[i].size(), z.size());
    for (std::size_t k = 0; k < z.size(); ++k) EXPECT_LT(std::abs(s.z_ohm[i][k] - z[k]), 1e-8 * std::abs(z[0])) << i << " " << k;
  }
}

const std::vector<double> kFrequencies = {100e3, 200e3, 500e3, 1e6};

TEST_F(Touchstone, TwoPortsOfVersion1InEveryForm) {
  for (const std::string format : {"RI", "MA", "DB"}) {
    for (const std::string kind : {"S", "Z", "Y"}) {
      for (const auto& [unit, scale] : {std::pair{"Hz", 1.0}, std::pair{"kHz", 1e3}, std::pair{"MHz", 1e6}, std::pair{"GHz", 1e9}}) {
        for (const double r : {50.0, 75.0, 2.5}) {
          std::string text = fmt::format("! made for a test\n   # {} {} {} R {}\n", unit, kind, format, r);
          for (const double f : kFrequencies) {
            Matrix m = transformer(f);
            if (kind == "S") m = scattering(m, r, r);
            if (kind == "Y") m = admittance(m);
            for (Complex& v : m) v *= kind == "Z" ? 1 / r : kind == "Y" ? r : 1;  // version 1 normalises
            // 11 21 12 22
            text += fmt::format("{}", f / scale) + number_pair(m[0], format) + number_pair(m[2], format) + number_pair(m[1], format) +
                    number_pair(m[3], format) + " ! remark\n";
          }
          const auto s = sweep("coupled.s2p", text);
          ASSERT_TRUE(s) << text << s.error().finding;
          EXPECT_EQ(s->as_read, kind);
          EXPECT_EQ(s->reference_ohm, (std::vector<double>{r, r}));
          EXPECT_TRUE(s->findings.empty());
          expect_near(*s, kFrequencies, transformer);
        }
      }
    }
  }
}

TEST_F(Touchstone, TwoPortsOfVersion2WithUnequalReferencesAndBothOrders) {
  for (const std::string order : {"12_21", "21_12"}) {
    std::string text = "! note\n[Version] 2.0\n# MHz S RI R 50\n[Number of Ports] 2\n[Two-Port Data Order] " + order +
                       "\n[Number of Frequencies] 4\n[Reference] 50\n 200\n[Begin Information]\nanything 1 2 3\n[End Information]\n[Network Data]\n";
    for (const double f : kFrequencies) {
      const Matrix m = scattering(transformer(f), 50, 200);
      const bool rows = order == "12_21";
      text += fmt::format("{}", f / 1e6) + number_pair(m[0], "RI") + number_pair(rows ? m[1] : m[2], "RI") +
              number_pair(rows ? m[2] : m[1], "RI") + number_pair(m[3], "RI") + "\n";
    }
    text += "[Noise Data]\n1 2 3 4 5\n[End]\nnothing counts here\n";
    const auto s = sweep("coupled.ts", text);
    ASSERT_TRUE(s) << s.error().finding;
    EXPECT_EQ(s->reference_ohm, (std::vector<double>{50, 200}));
    expect_near(*s, kFrequencies, transformer);
  }
}

TEST_F(Touchstone, OrdersOfANonReciprocalTwoPortAreNotMixedUp) {
  // Z21 = 3, Z12 = 1: an amplifier, so that the order shows.
  const auto v1 = sweep("a.s2p", "# Hz Z RI R 1\n1000 5 0 3 0 1 0 7 0\n2000 5 0 3 0 1 0 7 0\n");
  ASSERT_TRUE(v1);
  EXPECT_EQ(v1->z_ohm[0], (Matrix{5.0, 1.0, 3.0, 7.0}));
  ASSERT_EQ(v1->findings.size(), 1U);
  EXPECT_EQ(v1->findings[0].code, "not_reciprocal");
  const std::string head = "[Version] 2.0\n# Hz Z RI R 1\n[Number of Ports] 2\n[Two-Port Data Order] ";
  const auto rows = sweep("a.s2p", head + "12_21\n[Network Data]\n1000 5 0 1 0 3 0 7 0\n");
  ASSERT_TRUE(rows);
  EXPECT_EQ(rows->z_ohm[0], (Matrix{5.0, 1.0, 3.0, 7.0}));
}

TEST_F(Touchstone, Version2IsAbsoluteAndVersion1Normalised) {
  const auto v1 = sweep("a.s1p", "# Hz Z RI R 50\n1000 2 1\n");
  const auto v2 = sweep("a.s1p", "[Version] 2.0\n# Hz Z RI R 50\n[Number of Ports] 1\n[Network Data]\n1000 2 1\n[End]\n");
  ASSERT_TRUE(v1);
  ASSERT_TRUE(v2);
  EXPECT_EQ(v1->z_ohm[0][0], Complex(100, 50));
  EXPECT_EQ(v2->z_ohm[0][0], Complex(2, 1));
}

TEST_F(Touchstone, DefaultsAreGigahertzScatteringMagnitudeAngleFiftyOhm) {
  const auto s = sweep("a.s1p", "#\n1 0.5 0\n2 0.5 180\n");
  ASSERT_TRUE(s) << s.error().finding;
  EXPECT_EQ(s->frequency_hz, (std::vector<double>{1e9, 2e9}));
  EXPECT_NEAR(s->z_ohm[0][0].real(), 150, 1e-9);
  EXPECT_NEAR(s->z_ohm[1][0].real(), 50.0 / 3, 1e-9);
}

TEST_F(Touchstone, RowsOfManyPortsAreWrapped) {
  for (const std::size_t n : {3U, 5U, 9U}) {
    std::string text = "# Hz Z RI R 1\n";
    Matrix truth;
    for (std::size_t i = 0; i < n; ++i) {
      text += i == 0 ? "1000" : "  ";
      for (std::size_t j = 0; j < n; ++j) {
        const Complex v(static_cast<double>(10 * std::min(i, j) + std::max(i, j) + 1), 0.5);
        truth.push_back(v);
        text += fmt::format(" {} {}", v.real(), v.imag());
        if (j % 4 == 3 && j + 1 < n) text += "\n   ";  // four pairs a line
      }
      text += "\n";
    }
    const auto s = sweep(fmt::format("many.s{}p", n), text + "! end\n");
    ASSERT_TRUE(s) << s.error().finding;
    EXPECT_EQ(s->ports, n);
    EXPECT_EQ(s->z_ohm[0], truth);
  }
}

TEST_F(Touchstone, HalfMatricesAreCompleted) {
  const std::string head = "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 3\n[Matrix Format] ";
  const Matrix truth = {1.0, 2.0, 3.0, 2.0, 4.0, 5.0, 3.0, 5.0, 6.0};
  const auto lower = sweep("a.ts", head + "Lower\n[Network Data]\n1000 1 0\n 2 0 4 0\n 3 0 5 0 6 0\n[End]\n");
  const auto upper = sweep("a.ts", head + "Upper\n[Network Data]\n1000 1 0 2 0 3 0\n 4 0 5 0\n 6 0\n[End]\n");
  ASSERT_TRUE(lower) << lower.error().finding;
  ASSERT_TRUE(upper) << upper.error().finding;
  EXPECT_EQ(lower->z_ohm[0], truth);
  EXPECT_EQ(upper->z_ohm[0], truth);
}

TEST_F(Touchstone, NoiseOfVersion1IsSkipped) {
  const auto s = sweep("a.s2p", "# Hz Z RI R 1\n1000 5 0 1 0 1 0 7 0\n2000 5 0 1 0 1 0 7 0\n! noise\n1000 0.5 0.4 30 0.2\n2000 0.5 0.4 30 0.2\n");
  ASSERT_TRUE(s) << s.error().finding;
  EXPECT_EQ(s->frequency_hz.size(), 2U);
}

TEST_F(Touchstone, HybridParametersBecomeImpedances) {
  const auto h = sweep("a.s2p", "# Hz H RI R 1\n1000 2 0 0.5 0 -0.5 0 0.25 0\n");  // h11 h21 h12 h22
  ASSERT_TRUE(h) << h.error().finding;
  // v1 = h11 i1 + h12 v2, i2 = h21 i1 + h22 v2: z22 = 1/h22 = 4, z12 = h12/h22 = -2, z21 = -h21/h22 = -2, z11 = h11 - h12 h21/h22 = 3
  EXPECT_EQ(h->z_ohm[0], (Matrix{3.0, -2.0, -2.0, 4.0}));
}

TEST_F(Touchstone, AnOpenSeenByScatteringIsMarkedBad) {
  const auto s = sweep("a.s1p", "# Hz S RI R 50\n1000 1 0\n2000 0.5 0\n");
  ASSERT_TRUE(s);
  EXPECT_EQ(s->bad, (std::vector<bool>{true, false}));
  EXPECT_TRUE(std::isnan(s->z_ohm[0][0].real()));
}

TEST_F(Touchstone, ACoilBetweenTwoPortsHasNoImpedanceMatrixButItsScatteringIsKept) {
  // 100 ohm between ports of 50 ohm: S11 = S21 = 1/2 exactly, and 1 - S has no inverse.
  const auto read = sweep("through.s2p", "# Hz S RI R 50\n1e5 0.5 0 0.5 0 0.5 0 0.5 0\n2e5 0 0 1 0 1 0 0 0\n");
  ASSERT_TRUE(read);
  EXPECT_TRUE(read->bad.at(0));
  EXPECT_EQ(read->scattering.at(0).at(2), Complex(0.5));
  EXPECT_EQ(read->scattering.at(1).at(2), Complex(1));
  const auto impedance = sweep("z.s1p", "# Hz Z RI R 50\n1e5 0.5 0\n");
  ASSERT_TRUE(impedance);
  EXPECT_TRUE(impedance->scattering.empty());
}

TEST_F(Touchstone, AnotherCountThanStatedIsSaid) {
  const auto s = sweep("a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 1\n[Number of Frequencies] 3\n[Network Data]\n1 1 0\n2 1 0\n[End]\n");
  ASSERT_TRUE(s);
  ASSERT_EQ(s->findings.size(), 1U);
  EXPECT_EQ(s->findings[0].code, "header_contradicts");
}

TEST_F(Touchstone, IsRecognisedByItsOptionLineToo) {
  EXPECT_TRUE(sweep("renamed.txt", "! x\n# MHz S RI R 50\n1 0.5 0\n2 0.4 0\n"));
}

struct Damage {
  const char* name;
  const char* text;
  const char* place;
  const char* part;
};

TEST_F(Touchstone, DamageIsNamedWithItsLine) {
  for (const Damage& d : {Damage{"a.s1p", "# Hz Z RI R 50\n1000 2 1\n2000 2\n", "a.s1p:3", "2 numbers of 3"},
                          Damage{"a.s1p", "# Hz Z RI R 50\n1000 2 x\n", "a.s1p:2", "'x' is no number"},
                          Damage{"a.s1p", "# Hz Z RI R 50\n-1000 2 1\n", "a.s1p:2", "below zero"},
                          Damage{"a.s1p", "1 0.5 0\n2 0.5 0\n# Hz H RI R 1\n", "a.s1p:3", "behind the first numbers"},
                          Damage{"a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 1\n[Network Data]\n1 1 0\n[Number of Ports] 2\n", "a.ts:6",
                                 "[number of ports] stands behind the first numbers"},
                          Damage{"a.s1p", "# Hz Z RI R fifty\n1000 2 1\n", "a.s1p:1", "R without a resistance"},
                          Damage{"a.s1p", "# Hz Q RI R 50\n1000 2 1\n", "a.s1p:1", "'q'"},
                          Damage{"a.s1p", "! nothing\n", "a.s1p", "no network data"},
                          Damage{"a.ts", "[Version] 3.0\n# Hz Z RI\n", "a.ts:1", "version 3.0"},
                          Damage{"a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 2\n[Network Data]\n1 1 0 1 0 1 0 1 0\n", "a.ts:5", "Data Order"},
                          Damage{"a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] two\n", "a.ts:3", "whole number"},
                          Damage{"a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 3\n[Reference] 50 60\n[Network Data]\n1 1 0 0 0 0 0\n0 0 1 0 0 0\n0 0 0 0 1 0\n", "a.ts:8", "2 references for 3 ports"},
                          Damage{"a.ts", "[Version] 2.0\n# Hz Z RI\n[Number of Ports] 2\n[Mixed-Mode Order] D1,2 C1,2\n", "a.ts:4", "mixed-mode"}}) {
    const auto s = sweep(d.name, d.text);
    ASSERT_FALSE(s) << d.text;
    EXPECT_TRUE(s.error().place.ends_with(d.place)) << s.error().place << " for " << d.text;
    EXPECT_NE(s.error().finding.find(d.part), std::string::npos) << s.error().finding;
  }
}

}  // namespace
}  // namespace coilassay
