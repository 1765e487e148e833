// A stand-in for an instrument: answers a profile's questions from a simulated coil, and misbehaves on request.
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "acquire/instrument/profile.h"
#include "base/result.h"

namespace coilassay::synthetic {

/// L and R in series with C across, measured at one frequency.
struct StandInCoil {
  double inductance_h = 47e-6;
  double resistance_ohm = 0.35;
  double parallel_capacitance_f = 0;
};

/// How often a reply goes wrong, each as a share of all replies; together at most 1.
struct Misbehaviour {
  double late = 0;        // after the time-out, within the lateness the profile states
  double split = 0;       // in two pieces with a pause
  double garbled = 0;     // bytes with a flipped high bit, or control characters
  double doubled = 0;     // twice
  double over_range = 0;  // 9.9E37 for every value
  double silent = 0;      // not at all
  double slow = 0;        // byte by byte, perhaps beyond the time-out
  double gone = 0;        // the line is dropped before, within or after the reply
  bool echo = false;              // every question is sent back first
  bool another_identity = false;  // another instrument answers once the line was dropped
};

struct StandInSetup {
  InstrumentProfile profile;
  StandInCoil coil;
  Misbehaviour misbehaviour;
  double frequency_hz = 0;    // 0: that of the profile's 'at', else 1 kHz
  double spread = 0;          // a new part after every `readings_per_part` readings: L and R scatter by this share
  std::uint64_t readings_per_part = 1;
  std::string identity;       // empty: made from what the profile expects
  std::uint64_t seed = 1;
};

/// Bytes to send some time after the question came; then perhaps the line is dropped.
struct TimedBytes {
  double after_s = 0;
  std::string bytes;
  bool drop_after = false;
};

/// Safe to use from two threads: one serves, one puts parts in.
class StandIn {
 public:
  /// bad_number or bad_sheet for a setup that cannot be: shares above 1, a field it cannot compute, an identity that the profile
  /// would not accept.
  static Result<StandIn> make(StandInSetup setup);
  ~StandIn();
  StandIn(StandIn&&) noexcept;
  StandIn& operator=(StandIn&&) noexcept;

  void put_in(const StandInCoil& coil);
  void set_present(bool present);
  /// Takes what came and gives what is to be sent; questions may come in pieces.
  std::vector<TimedBytes> receive(std::string_view bytes);
  /// The next line of an instrument that prints unasked, and whether the profile is of one.
  std::string unasked_line();
  bool prints_unasked() const;
  void line_was_dropped();
  /// Lines of [verdict] and [prepare] that came, in order (the last thousand).
  std::vector<std::string> commands_received() const;
  std::uint64_t misbehaved() const;

 private:
  struct State;
  explicit StandIn(std::unique_ptr<State> state);
  std::unique_ptr<State> state_;
};

}  // namespace coilassay::synthetic
