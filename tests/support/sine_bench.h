// Simulated steady sines for tests, measured the way the program does.
#pragma once

#include <gtest/gtest.h>

#include "acquire/synthetic/driven_sine.h"
#include "analysis/sine.h"

namespace coilassay::test {

inline synthetic::DrivenSineRecord simulated_sine(const synthetic::DrivenSineBench& bench) {
  Result<synthetic::DrivenSineRecord> record = synthetic::simulate_driven_sine(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

/// A request that states exactly what the bench has in its current channel, without tolerance.
inline SineRequest exact_sine_request(const synthetic::DrivenSineBench& bench) {
  SineRequest request;
  request.propagation.exact_bench = true;
  ChannelSetup& current = request.bench.current;
  if (bench.shunt_ohm > 0) {
    current.shunt = StatedValue::exact(bench.shunt_ohm, Unit::ohm);
    current.shunt_inductance = StatedValue::exact(bench.shunt_inductance_h, Unit::henry);
  }
  current.skew = StatedValue::exact(bench.skew_s, Unit::second);
  if (bench.probe_corner_hz > 0) current.probe_corner = StatedValue::exact(bench.probe_corner_hz, Unit::hertz);
  return request;
}

inline Measurement measured_sine(const Capture& capture, const SineRequest& request) {
  Result<Measurement> result = measure_sine(capture, request);
  EXPECT_TRUE(result) << (result ? "" : result.error().finding);
  return result ? std::move(*result) : Measurement{};
}

}  // namespace coilassay::test
