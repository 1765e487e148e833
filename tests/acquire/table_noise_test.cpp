// Good files with bytes changed, left out and put in at random: read or refused, but never a crash, a hang, or a silent
// loss of rows. A quick stand-in for long fuzzing, with fixed seeds.
#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>

#include "base/random.h"
#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::bytes_of;
using test::MadeFiles;

class TableNoise : public MadeFiles {};

std::string spoilt(std::string bytes, Random& random) {
  const std::size_t changes = 1 + random.below(3);
  for (std::size_t i = 0; i < changes && !bytes.empty(); ++i) {
    const std::size_t at = random.below(bytes.size());
    switch (random.below(4)) {
      case 0: bytes[at] = static_cast<char>(random.below(256)); break;
      case 1: bytes.erase(at, 1 + random.below(20)); break;
      case 2: bytes.insert(at, bytes.substr(random.below(bytes.size()), random.below(40))); break;
      default: bytes[at] = "0123456789.,;-+eE\t\n\"# "[random.below(22)]; break;
    }
  }
  return bytes;
}

TEST_F(TableNoise, SpoiltFilesAreReadOrRefused) {
  Random random(77);
  std::size_t refused = 0;
  std::size_t tried = 0;
  for (const auto& entry : std::filesystem::directory_iterator("tests/acquire/data")) {
    const std::string good = bytes_of(entry.path().string());
    const std::string extension = entry.path().extension().string();
    for (int i = 0; i < 30; ++i, ++tried) {
      const auto got = read_recording(made("spoilt" + extension, spoilt(good, random)));
      if (!got) {
        ++refused;
        EXPECT_FALSE(got.error().finding.empty());
        EXPECT_FALSE(got.error().place.empty());
        continue;
      }
      if (const auto* captures = std::get_if<std::vector<Capture>>(&*got)) {
        for (const Capture& c : *captures) {
          for (const Channel& channel : c.channels) {
            EXPECT_EQ(channel.samples.size(), c.samples());
            std::size_t missing = 0;
            for (const double v : channel.samples) missing += std::isnan(v) ? 1U : 0U;
            EXPECT_EQ(channel.missing, missing);
          }
          if (!c.time.uniform()) {
            EXPECT_EQ(c.time.times_s.size(), c.samples());
          }
        }
      }
    }
  }
  EXPECT_GT(refused, tried / 10);  // the spoiling does something
}

}  // namespace
}  // namespace coilassay
