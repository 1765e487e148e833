// A stand-in instrument that serves until it is stopped.
#pragma once

#include <functional>
#include <string>

#include "acquire/synthetic/stand_in.h"
#include "base/result.h"

namespace coilassay {

struct SimulateInstrumentJob {
  std::string profile;                   // path
  std::string listen;                    // "localhost:5025"; port 0: the system chooses
  synthetic::StandInSetup setup;         // its profile is read from the file
  double line_every_s = 0.1;             // of a profile that prints unasked
  std::function<void(unsigned short port)> listening;  // called once callers can come
  std::function<bool()> stopped;         // asked at least every 50 ms
};

/// Serves one caller after the other until stopped. Failures of the profile and of the port.
Result<void> run_simulate_instrument(const SimulateInstrumentJob& job);

}  // namespace coilassay
