#include "tests/support/instrument_bench.h"

#include <algorithm>
#include <chrono>
#include <cmath>
#include <stdexcept>
#include <vector>

#include "acquire/instrument/instrument.h"
#include "acquire/instrument/open_stream.h"

namespace coilassay::test {

namespace {

template <class T>
T value_of(Result<T> result) {
  if (!result) throw std::runtime_error(result.error().place + ": " + result.error().finding);
  return std::move(*result);
}

}  // namespace

std::string meter_profile_text(const std::string& port) {
  return "[link]\nkind = \"tcp\"\nport = \"" + port +
         "\"\ntimeout = \"50 ms\"\nlateness = \"50 ms\"\nquiet = \"2 ms\"\nreconnect = \"2 s\"\n"
         "[identity]\nexpect = \"bench-lcr\"\n"
         "[reading]\nask = \"FETC?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\", \"status\"]\nattempts = 10\n"
         "at = { frequency = \"100 kHz\", level = \"1 V\", bias = \"0 A\" }\n"
         "accuracy = { L_s = \"0.2 %\", R_s = \"1 % + 2 mohm\" }\n";
}

InstrumentProfile parsed_profile(const std::string& text) { return value_of(parse_instrument_profile(text, "meter.toml")); }

ServedStandIn::ServedStandIn(synthetic::StandInSetup setup, double line_every_s)
    : stand_in_(value_of(synthetic::StandIn::make(std::move(setup)))),
      server_(value_of(synthetic::StandInServer::listen("127.0.0.1:0"))),
      thread_([this, line_every_s] { server_.run(stand_in_, line_every_s, [this] { return stop_.load(); }); }) {}

ServedStandIn::~ServedStandIn() {
  stop_ = true;
  thread_.join();
}

synthetic::Misbehaviour five_percent() {
  synthetic::Misbehaviour m;
  m.late = m.split = m.garbled = m.doubled = m.over_range = m.silent = m.slow = m.gone = 0.05 / 8;
  return m;
}

UnitsMeasured measure_units(std::uint64_t units, const synthetic::Misbehaviour& misbehaviour, std::uint64_t seed) {
  synthetic::StandInSetup setup;
  setup.profile = parsed_profile(meter_profile_text("127.0.0.1:1"));
  setup.misbehaviour = misbehaviour;
  setup.seed = seed;
  ServedStandIn served(setup);
  const InstrumentProfile profile = parsed_profile(meter_profile_text(served.address()));
  Instrument instrument(profile, opener_of(profile.link));
  if (auto opened = instrument.open(); !opened) throw std::runtime_error(opened.error().finding);

  UnitsMeasured result;
  std::vector<double> recoveries;
  for (std::uint64_t unit = 0; unit < units; ++unit) {
    // Neighbours differ by far more than the digits of a reply; a value of any of the last 97 units is told apart.
    synthetic::StandInCoil coil;
    coil.inductance_h = 47e-6 * (1 + 0.01 * static_cast<double>(unit % 97));
    served.stand_in().put_in(coil);
    const std::uint64_t before = instrument.counts().resynchronisations;
    const auto begun = std::chrono::steady_clock::now();
    const Result<Reading> reading = instrument.read();
    const double took = std::chrono::duration<double>(std::chrono::steady_clock::now() - begun).count();
    ++result.units;
    result.longest_s = std::max(result.longest_s, took);
    if (instrument.counts().resynchronisations == before + 1) recoveries.push_back(took);
    if (!reading) {
      ++result.refused;
      if (instrument.is_gone()) break;
      continue;
    }
    if (!reading->good()) {
      ++result.over_range;
      continue;
    }
    ++result.read;
    const double found = reading->find("L_s")->value;
    if (std::abs(found / coil.inductance_h - 1) > 1e-4) ++result.wrong_unit;
  }
  const ConversationCounts& counts = instrument.counts();
  result.misbehaved = served.stand_in().misbehaved();
  result.resynchronisations = counts.resynchronisations;
  result.reconnections = counts.reconnections;
  result.timeouts = counts.timeouts;
  result.stale_bytes = counts.stale_bytes;
  std::sort(recoveries.begin(), recoveries.end());
  if (!recoveries.empty()) {
    result.median_recovery_s = recoveries[recoveries.size() / 2];
    result.most_recoveries_within_s = recoveries[recoveries.size() * 95 / 100];
  }
  return result;
}

}  // namespace coilassay::test
