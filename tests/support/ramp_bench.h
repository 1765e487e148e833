// Simulated saturation tests, measured the way the program does.
#pragma once

#include <gtest/gtest.h>

#include "acquire/synthetic/driven_ramp.h"
#include "analysis/ramp.h"

namespace coilassay::test {

/// 8 bits and half a step of noise on both channels.
inline synthetic::DrivenRampBench coarse_bench(synthetic::CoreKind kind, std::uint64_t seed = 1) {
  synthetic::DrivenRampBench bench;
  bench.core.kind = kind;
  bench.bits = 8;
  bench.voltage_full_scale_v = 12.5;
  bench.current_full_scale_a = 20;
  bench.voltage_noise_v = 0.5 * 12.5 / 128;
  bench.current_noise_a = 0.5 * 20.0 / 128;
  bench.seed = seed;
  return bench;
}

inline synthetic::DrivenRampRecord simulated(const synthetic::DrivenRampBench& bench) {
  Result<synthetic::DrivenRampRecord> record = synthetic::simulate_driven_ramp(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return record ? std::move(*record) : synthetic::DrivenRampRecord{};
}

/// States exactly what the bench has.
inline RampRequest exact_request(const synthetic::DrivenRampBench& bench) {
  RampRequest request;
  request.propagation.exact_bench = true;
  request.bench.winding_resistance = StatedValue::exact(bench.resistance_ohm, Unit::ohm);
  if (bench.shunt_ohm > 0) request.bench.current.shunt = StatedValue::exact(bench.shunt_ohm, Unit::ohm);
  return request;
}

inline Measurement measured(const Capture& capture, const RampRequest& request) {
  Result<Measurement> result = measure_ramp(capture, request);
  EXPECT_TRUE(result) << (result ? "" : result.error().finding);
  return result ? std::move(*result) : Measurement{};
}

inline bool covers(const Estimate& estimate, double truth) { return estimate.low <= truth && truth <= estimate.high; }

inline const Finding* finding(const Measurement& result, std::string_view code) {
  for (const Finding& f : result.findings) {
    if (f.code == code) return &f;
  }
  return nullptr;
}

/// The finding, or an empty one when it was not raised: expectations then fail and nothing crashes.
inline Finding finding_or_none(const Measurement& result, std::string_view code) {
  for (const Finding& f : result.findings) {
    if (f.code == code) return f;
  }
  return {};
}

}  // namespace coilassay::test
