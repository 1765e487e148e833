// A stand-in instrument served by a thread of the test, and profiles to talk to it.
#pragma once

#include <atomic>
#include <cstdint>
#include <string>
#include <thread>

#include "acquire/instrument/profile.h"
#include "acquire/synthetic/stand_in.h"
#include "acquire/synthetic/stand_in_server.h"

namespace coilassay::test {

/// A meter that answers "FETC?" with L_s and R_s and a status; time-outs of 50 ms.
std::string meter_profile_text(const std::string& port);
InstrumentProfile parsed_profile(const std::string& text);

/// Serves until it goes out of scope.
class ServedStandIn {
 public:
  /// The setup's profile may have any port; port() is where it really listens.
  explicit ServedStandIn(synthetic::StandInSetup setup, double line_every_s = 0.02);
  ~ServedStandIn();
  ServedStandIn(const ServedStandIn&) = delete;
  ServedStandIn& operator=(const ServedStandIn&) = delete;
  std::string address() const { return "127.0.0.1:" + std::to_string(server_.port()); }
  synthetic::StandIn& stand_in() { return stand_in_; }

 private:
  synthetic::StandIn stand_in_;
  synthetic::StandInServer server_;
  std::atomic<bool> stop_{false};
  std::thread thread_;
};

/// Many units one after the other through one instrument that misbehaves.
struct UnitsMeasured {
  std::uint64_t units = 0, read = 0, over_range = 0, refused = 0;
  std::uint64_t wrong_unit = 0;        // a value that is not that of the unit in the fixture
  std::uint64_t misbehaved = 0, resynchronisations = 0, reconnections = 0, timeouts = 0, stale_bytes = 0;
  double longest_s = 0, median_recovery_s = 0, most_recoveries_within_s = 0;  // the 95 % point
};
UnitsMeasured measure_units(std::uint64_t units, const synthetic::Misbehaviour& misbehaviour, std::uint64_t seed);
/// Five percent of all replies go wrong, in every way there is.
synthetic::Misbehaviour five_percent();

}  // namespace coilassay::test
