#include "acquire/sweep_writer.h"

#include <sstream>

#include "acquire/synthetic/coil_sweep.h"
#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

class SweepWriter : public test::MadeFiles {
 protected:
  Sweep read_back(const std::string& name, const std::string& bytes) const {
    auto recording = read_recording(made(name, bytes));
    EXPECT_TRUE(recording) << recording.error().finding;
    if (!recording || !std::holds_alternative<Sweep>(*recording)) {
      ADD_FAILURE() << "not read as a sweep";
      return {};
    }
    return std::get<Sweep>(std::move(*recording));
  }

  static Sweep noisy(std::size_t marked = 0) {
    return synthetic::simulate_coil_sweep({.noise_ratio = 1e-2, .marked = marked, .seed = 11})->sweep;
  }

  static std::string table(const Sweep& sweep, SweepColumns columns) {
    std::ostringstream out;
    write_sweep_csv(out, sweep, columns);
    return out.str();
  }

  static void expect_equal(const Sweep& back, const Sweep& sweep, double relative) {
    ASSERT_EQ(back.frequency_hz, sweep.frequency_hz);
    for (std::size_t i = 0; i < sweep.z_ohm.size(); ++i) {
      EXPECT_LE(std::abs(back.z_ohm[i][0] - sweep.z_ohm[i][0]), relative * std::abs(sweep.z_ohm[i][0])) << i;
    }
  }
};

TEST_F(SweepWriter, ImpedancesComeBackBitForBit) {
  const Sweep sweep = noisy();
  const Sweep back = read_back("z.csv", table(sweep, SweepColumns::impedance));
  EXPECT_EQ(back.frequency_hz, sweep.frequency_hz);
  EXPECT_EQ(back.z_ohm, sweep.z_ohm);
  EXPECT_EQ(back.as_read, "Z");
  EXPECT_TRUE(back.findings.empty());
}

TEST_F(SweepWriter, OtherColumnsComeBackToRounding) {
  const Sweep sweep = noisy();
  expect_equal(read_back("l.csv", table(sweep, SweepColumns::inductance)), sweep, 1e-14);
  expect_equal(read_back("p.csv", table(sweep, SweepColumns::magnitude_phase)), sweep, 1e-14);
  const Sweep s = read_back("s.csv", table(sweep, SweepColumns::scattering));
  // Rounding of S near 1 is divided by 1 - S: |Z|/50 at the bottom end, its inverse at the top.
  expect_equal(s, sweep, 1e-10);
  EXPECT_EQ(s.as_read, "S");
}

TEST_F(SweepWriter, MarkedPointsStayMarked) {
  const Sweep sweep = noisy(4);
  const Sweep back = read_back("m.csv", table(sweep, SweepColumns::impedance));
  EXPECT_EQ(back.bad, sweep.bad);
}

TEST_F(SweepWriter, TouchstoneOfOnePortComesBack) {
  Sweep sweep = noisy();
  sweep.reference_ohm = {75};
  std::ostringstream out;
  write_touchstone(out, sweep, "a coil\nof two lines");
  EXPECT_EQ(out.str().substr(0, 26), "! a coil\n! of two lines\n# ");
  const Sweep back = read_back("c.s1p", out.str());
  EXPECT_EQ(back.reference_ohm, std::vector<double>{75});
  expect_equal(back, sweep, 1e-10);
}

TEST_F(SweepWriter, TouchstoneOfTwoPortsKeepsTheOrder) {
  Sweep sweep;
  sweep.ports = 2;
  sweep.frequency_hz = {1e6, 2e6};
  sweep.z_ohm = {{{10, 100}, {1, 20}, {2, 30}, {5, 50}}, {{11, 200}, {1, 40}, {2, 60}, {6, 99}}};
  sweep.bad = {false, false};
  std::ostringstream out;
  write_touchstone(out, sweep, "");
  const Sweep back = read_back("t.s2p", out.str());
  ASSERT_EQ(back.ports, 2U);
  for (std::size_t i = 0; i < 2; ++i) {
    for (std::size_t k = 0; k < 4; ++k) EXPECT_NEAR(std::abs(back.z_ohm[i][k] - sweep.z_ohm[i][k]), 0, 1e-10) << i << k;
  }
}

TEST_F(SweepWriter, APointWithoutImpedanceIsLeftOutOfTouchstone) {
  Sweep sweep = noisy();
  sweep.z_ohm[3][0] = {std::nan(""), 0};
  std::ostringstream out;
  write_touchstone(out, sweep, "");
  EXPECT_EQ(read_back("g.s1p", out.str()).frequency_hz.size(), sweep.frequency_hz.size() - 1);
}

}  // namespace
}  // namespace coilassay
