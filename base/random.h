// Random numbers that are the same on every machine: the seed is always given, never taken from the clock.
#pragma once

#include <array>
#include <cstdint>

namespace coilassay {

/// xoshiro256++ (Blackman and Vigna), seeded by SplitMix64; `stream` gives independent sequences for one seed.
class Random {
 public:
  explicit Random(std::uint64_t seed, std::uint64_t stream = 0);
  explicit Random(const std::array<std::uint64_t, 4>& state);  // not all zero
  std::uint64_t bits();
  double uniform();                          // [0, 1), 53 bits
  double uniform(double low, double high);   // [low, high)
  double normal();                           // mean 0, standard deviation 1; ziggurat of 256 layers
  double student_t(double dof);              // needs dof > 0
  std::uint64_t below(std::uint64_t n);      // [0, n), without bias

 private:
  std::array<std::uint64_t, 4> state_;
};

}  // namespace coilassay
