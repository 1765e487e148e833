// Simulated ring-downs for tests, measured the way the program does.
#pragma once

#include <gtest/gtest.h>

#include "acquire/synthetic/ring_down.h"
#include "analysis/ring_down.h"

namespace coilassay::test {

inline synthetic::RingDownRecord simulated(const synthetic::RingDownBench& bench) {
  Result<synthetic::RingDownRecord> record = synthetic::simulate_ring_down(bench);
  EXPECT_TRUE(record) << (record ? "" : record.error().finding);
  return std::move(*record);
}

/// A request that states exactly what the bench has across the coil, without tolerance.
inline RingDownRequest exact_request(const synthetic::RingDownBench& bench) {
  RingDownRequest request;
  request.propagation.exact_bench = true;
  CapacitorSetup capacitor{StatedValue::exact(bench.capacitance_f, Unit::farad), std::nullopt};
  if (bench.capacitor_dissipation > 0) {
    capacitor.dissipation_factor = StatedValue::exact(bench.capacitor_dissipation, Unit::one);
  }
  request.bench.capacitors.push_back(capacitor);
  request.bench.voltage.input_capacitance = StatedValue::exact(bench.probe_capacitance_f, Unit::farad);
  request.bench.voltage.input_resistance = StatedValue::exact(bench.probe_resistance_ohm, Unit::ohm);
  if (bench.across_resistance_ohm > 0) {
    request.bench.across_resistance = StatedValue::exact(bench.across_resistance_ohm, Unit::ohm);
  }
  if (bench.across_capacitance_f > 0) {
    request.bench.across_capacitance = StatedValue::exact(bench.across_capacitance_f, Unit::farad);
  }
  return request;
}

inline Measurement measured(const Capture& capture, const RingDownRequest& request) {
  Result<Measurement> result = measure_ring_down(capture, request);
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

}  // namespace coilassay::test
