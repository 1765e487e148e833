// The smallest program that measures with coilassay's libraries: consumer CAPTURE FARADS
#include <cstdio>
#include <cstdlib>

#include "acquire/reader.h"
#include "analysis/ring_down.h"

int main(int, char** arguments) {
  const auto recording = coilassay::read_recording(arguments[1]);
  if (!recording) return 2;
  coilassay::RingDownRequest request;
  request.bench.capacitors.push_back({coilassay::StatedValue::exact(std::atof(arguments[2]), coilassay::Unit::farad), {}});
  const auto measured = coilassay::measure_ring_down(std::get<0>(*recording).front(), request);
  if (!measured || measured->find("L_s") == nullptr) return 3;
  std::printf("%.17g\n", measured->find("L_s")->quantity.value);
}
