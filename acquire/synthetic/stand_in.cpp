#include "acquire/synthetic/stand_in.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <complex>
#include <deque>
#include <mutex>
#include <numbers>

#include "acquire/instrument/pattern.h"
#include "acquire/synthetic/driven_sine.h"
#include "base/outside_text.h"
#include "base/random.h"

namespace coilassay::synthetic {

namespace {

constexpr double kLevel_v = 1;

/// What an ideal meter would show of the coil; nullopt for a symbol it does not have.
std::optional<double> ideal_value(const StandInCoil& coil, double frequency_hz, std::string_view symbol) {
  const double w = 2 * std::numbers::pi * frequency_hz;
  const std::complex<double> j(0, 1);
  const std::complex<double> branch = coil.resistance_ohm + j * w * coil.inductance_h;
  const std::complex<double> z = branch / (1.0 + j * w * coil.parallel_capacitance_f * branch);
  const std::complex<double> y = 1.0 / z;
  if (symbol == "f") return frequency_hz;
  if (symbol == "Z") return std::abs(z);
  if (symbol == "phi") return std::arg(z);
  if (symbol == "R_s" || symbol == "R_ac") return z.real();
  if (symbol == "X_s") return z.imag();
  if (symbol == "L_s" || symbol == "L") return z.imag() / w;
  if (symbol == "R_p") return 1 / y.real();
  if (symbol == "L_p") return -1 / (w * y.imag());
  if (symbol == "Q") return std::abs(z.imag()) / z.real();
  if (symbol == "D") return z.real() / std::abs(z.imag());
  if (symbol == "R_dc") return coil.resistance_ohm;
  if (symbol == "V") return kLevel_v;
  if (symbol == "I") return kLevel_v / std::abs(z);
  return std::nullopt;
}

std::string number_text(double value, const std::string& decimal) {
  std::string text = fmt::format("{:+.5E}", value);
  if (decimal == ",") std::replace(text.begin(), text.end(), '.', ',');
  return text;
}

/// A pattern's groups replaced by the values, its backslashes and anchors taken away: enough for patterns such as
/// "L=(\S+) R=(\S+)".
std::string filled_pattern(const std::string& pattern, const std::vector<std::string>& values) {
  std::string text;
  std::size_t next = 0;
  int depth = 0;
  for (std::size_t i = 0; i < pattern.size(); ++i) {
    const char c = pattern[i];
    if (c == '\\') {
      ++i;
      if (depth == 0 && i < pattern.size()) text += pattern[i] == 's' ? ' ' : pattern[i];
    } else if (c == '(') {
      if (depth++ == 0 && next < values.size()) text += values[next++];
    } else if (c == ')') {
      --depth;
    } else if (depth == 0 && c != '^' && c != '$' && c != '*' && c != '+' && c != '?') {
      text += c;
    }
  }
  return text;
}

}  // namespace

struct StandIn::State {
  State(StandInSetup s) : setup(std::move(s)), random(setup.seed), part(setup.coil) {}

  mutable std::mutex mutex;
  StandInSetup setup;
  Random random;
  StandInCoil part;
  std::string identity;
  std::string incoming;
  std::deque<std::string> commands;
  std::uint64_t readings = 0, misbehaved = 0;
  bool present = true, dropped = false;

  double frequency() const {
    if (setup.frequency_hz > 0) return setup.frequency_hz;
    const auto& reading = setup.profile.reading;
    if (reading && reading->at.frequency && reading->at.frequency->value > 0) return reading->at.frequency->value;
    return 1e3;
  }

  std::string joined(const std::vector<ProfileField>& fields, const std::string& separator, const std::string& decimal,
                     const std::optional<std::string>& pattern, bool over_range) {
    std::vector<std::string> values;
    for (const ProfileField& field : fields) {
      if (field.symbol == "status") values.push_back(setup.profile.reading->status);
      else if (field.symbol == "-") values.push_back("0");
      else if (over_range) values.push_back("+9.90000E+37");
      else values.push_back(number_text(*ideal_value(part, frequency(), field.symbol) / field.factor, decimal));
    }
    if (over_range && decimal == ",") {
      for (std::string& value : values) std::replace(value.begin(), value.end(), '.', ',');
    }
    if (pattern) return filled_pattern(*pattern, values);
    std::string line;
    for (std::size_t i = 0; i < values.size(); ++i) line += (i > 0 ? separator : "") + values[i];
    return line;
  }

  std::string reading_line(bool over_range) {
    if (setup.spread > 0 && readings % std::max<std::uint64_t>(1, setup.readings_per_part) == 0) {
      part.inductance_h = setup.coil.inductance_h * (1 + setup.spread * random.normal());
      part.resistance_ohm = setup.coil.resistance_ohm * (1 + setup.spread * random.normal());
    }
    ++readings;
    const ReadingSetup& reading = *setup.profile.reading;
    return joined(reading.fields, reading.separator, reading.decimal, reading.pattern, over_range);
  }

  std::string record_reply(std::size_t question);
  std::optional<std::string> reply_to(const std::string& line, bool over_range);
  std::vector<TimedBytes> sent_as_it_goes_wrong(const std::string& line);
};

StandIn::StandIn(std::unique_ptr<State> state) : state_(std::move(state)) {}
StandIn::~StandIn() = default;
StandIn::StandIn(StandIn&&) noexcept = default;
StandIn& StandIn::operator=(StandIn&&) noexcept = default;

Result<StandIn> StandIn::make(StandInSetup setup) {
  const Misbehaviour& m = setup.misbehaviour;
  const double all = m.late + m.split + m.garbled + m.doubled + m.over_range + m.silent + m.slow + m.gone;
  if (all > 1) return failure(Problem::bad_number, "misbehaviour", "the shares of what goes wrong add up to more than 1", "take less of each");
  const InstrumentProfile& profile = setup.profile;
  auto state = std::make_unique<State>(setup);
  const auto check_fields = [&](const std::vector<ProfileField>& fields, bool waveform) -> Result<void> {
    for (const ProfileField& field : fields) {
      const bool known = waveform ? field.unit == Unit::volt || field.unit == Unit::ampere : ideal_value(setup.coil, 1e3, field.symbol).has_value();
      if (field.is_value() && !known) {
        return failure(Problem::bad_sheet, field.place, "a simulated coil has no '" + shown(field.symbol, 20) + "'", "it knows f, Z, phi, R_s, X_s, L_s, R_p, L_p, Q, D, R_dc, V and I");
      }
    }
    return {};
  };
  if (profile.reading) {
    if (auto fine = check_fields(profile.reading->fields, false); !fine) return failure(fine);
    if (profile.reading->pattern) {
      const auto pattern = Pattern::compile(*profile.reading->pattern, "pattern");
      if (!pattern) return failure(pattern);
      if (!pattern->found_in(state->reading_line(false))) {
        return failure(Problem::bad_sheet, profile.path, "a reply that fits this pattern cannot be made up", "try the stand-in with a simpler pattern, such as L=(\\S+) R=(\\S+)");
      }
      state = std::make_unique<State>(setup);
    }
  }
  if (profile.record) {
    if (auto fine = check_fields(profile.record->fields, true); !fine) return failure(fine);
  }
  state->identity = setup.identity;
  if (profile.identity) {
    if (state->identity.empty()) state->identity = "Skerry Buoy Works," + profile.identity->expect + ",stand-in,1";
    const auto pattern = Pattern::compile(profile.identity->expect, "expect");
    if (!pattern) return failure(pattern);
    if (!pattern->found_in(state->identity)) {
      return failure(Problem::usage, "--identity", "the profile would not accept '" + shown(state->identity, 80) + "'", "say what it answers: --identity TEXT");
    }
  }
  return StandIn(std::move(state));
}

void StandIn::put_in(const StandInCoil& coil) {
  const std::lock_guard lock(state_->mutex);
  state_->part = coil;
}
void StandIn::set_present(bool present) {
  const std::lock_guard lock(state_->mutex);
  state_->present = present;
}
void StandIn::line_was_dropped() {
  const std::lock_guard lock(state_->mutex);
  state_->dropped = true;
  state_->incoming.clear();
}
std::vector<std::string> StandIn::commands_received() const {
  const std::lock_guard lock(state_->mutex);
  return {state_->commands.begin(), state_->commands.end()};
}
std::uint64_t StandIn::misbehaved() const {
  const std::lock_guard lock(state_->mutex);
  return state_->misbehaved;
}
bool StandIn::prints_unasked() const { return state_->setup.profile.reading && !state_->setup.profile.reading->ask; }

std::string StandIn::unasked_line() {
  const std::lock_guard lock(state_->mutex);
  return state_->reading_line(false) + state_->setup.profile.link.reply_terminator;
}

/// A sine over the part, as rows or as a block.
std::string StandIn::State::record_reply(std::size_t question) {
  const RecordSetup& record = *setup.profile.record;
  DrivenSineBench bench;
  bench.inductance_h = part.inductance_h;
  bench.resistance_ohm = part.resistance_ohm;
  bench.parallel_capacitance_f = part.parallel_capacitance_f;
  bench.frequency_hz = frequency();
  bench.amplitude_v = kLevel_v;
  bench.samples = record.count;
  bench.sample_interval_s = record.sample_interval_s;
  const auto solved = simulate_driven_sine(bench);
  if (!solved) return "ERROR";
  const bool one_for_all = record.ask.size() == 1;
  std::string reply, payload;
  for (std::size_t n = 0; n < record.count; ++n) {
    for (std::size_t i = one_for_all ? 0 : question; i < (one_for_all ? record.fields.size() : question + 1); ++i) {
      const ProfileField& field = record.fields[i];
      const double si = field.is_value() ? solved->capture.channels[field.unit == Unit::volt ? 0 : 1].samples[n] : 0;
      const double raw = (si - record.offset[i]) / record.scale[i];
      if (record.format == RecordSetup::Format::rows) {
        reply += (i > 0 && one_for_all ? record.separator : "") + number_text(raw, record.decimal);
        continue;
      }
      std::uint32_t bits = 0;
      std::size_t width = 4;
      if (record.format == RecordSetup::Format::float32) {
        bits = std::bit_cast<std::uint32_t>(static_cast<float>(raw));
      } else {
        width = record.format == RecordSetup::Format::int8 ? 1 : 2;
        const double most = width == 1 ? 127 : 32767;
        bits = static_cast<std::uint32_t>(static_cast<std::int32_t>(std::clamp(std::round(raw), -most - 1, most)));
      }
      for (std::size_t b = 0; b < width; ++b) {
        const std::size_t shift = 8 * (record.big_endian ? width - 1 - b : b);
        payload += static_cast<char>(bits >> shift & 0xff);
      }
    }
    if (record.format == RecordSetup::Format::rows && n + 1 < record.count) reply += setup.profile.link.reply_terminator;
  }
  if (record.format == RecordSetup::Format::rows) return reply;
  const std::string length = std::to_string(payload.size());
  return "#" + std::to_string(length.size()) + length + payload;
}

/// nullopt: a command without a reply.
std::optional<std::string> StandIn::State::reply_to(const std::string& line, bool over_range) {
  const InstrumentProfile& profile = setup.profile;
  if (profile.identity && line == profile.identity->ask) {
    return dropped && setup.misbehaviour.another_identity ? identity + " (another)" : identity;
  }
  if (profile.reading && profile.reading->ask == line) return reading_line(over_range);
  if (profile.record) {
    for (std::size_t q = 0; q < profile.record->ask.size(); ++q) {
      if (profile.record->ask[q] == line) return record_reply(q);
    }
  }
  if (profile.present && profile.present->ask == line) {
    const std::string yes = filled_pattern(profile.present->when, {});
    return present ? yes : yes == "0" ? "1" : "0";
  }
  for (const SettingQuestion& setting : profile.settings) {
    if (setting.ask == line) return setting.name == "frequency" ? number_text(frequency(), ".") : setting.name == "level" ? number_text(kLevel_v, ".") : "0";
  }
  commands.push_back(line);
  if (commands.size() > 1000) commands.pop_front();
  return std::nullopt;
}

std::vector<TimedBytes> StandIn::State::sent_as_it_goes_wrong(const std::string& question) {
  const Misbehaviour& m = setup.misbehaviour;
  const LinkSetup& link = setup.profile.link;
  double draw = random.uniform();
  const auto falls = [&](double of_all) {
    const bool hit = draw >= 0 && draw < of_all;
    draw -= of_all;
    return hit;
  };
  const bool over_range = falls(m.over_range);
  const auto answer = reply_to(question, over_range);
  std::vector<TimedBytes> all;
  if (m.echo) all.push_back({0, question + link.terminator});
  if (!answer) return all;
  const std::string reply = *answer + link.reply_terminator;
  const std::size_t cut = random.below(reply.size() + 1);
  const double share = random.uniform();
  misbehaved += 1;
  if (over_range) {
    all.push_back({0, reply});
  } else if (falls(m.late)) {
    all.push_back({link.timeout_s + share * 0.95 * link.lateness_s, reply});
  } else if (falls(m.split)) {
    all.push_back({0, reply.substr(0, cut)});
    all.push_back({share * 0.8 * link.timeout_s, reply.substr(cut)});
  } else if (falls(m.garbled)) {
    std::string garbled = reply;
    for (std::uint64_t n = 1 + random.below(3); n > 0; --n) {
      char& byte = garbled[random.below(garbled.size())];
      byte = random.uniform() < 0.7 ? static_cast<char>(byte ^ 0x80) : static_cast<char>(1 + random.below(8));
    }
    all.push_back({0, garbled});
  } else if (falls(m.doubled)) {
    all.push_back({0, reply});
    all.push_back({share * 0.5 * link.quiet_s, reply});
  } else if (falls(m.silent)) {
    // nothing
  } else if (falls(m.slow)) {
    const double span = (0.2 + 0.8 * share) * (link.timeout_s + 0.9 * link.lateness_s);
    for (std::size_t i = 0; i < reply.size(); ++i) {
      all.push_back({span * static_cast<double>(i) / static_cast<double>(reply.size()), reply.substr(i, 1)});
    }
  } else if (falls(m.gone)) {
    all.push_back({0, share < 0.33 ? "" : share < 0.66 ? reply.substr(0, cut) : reply, true});
  } else {
    misbehaved -= 1;
    all.push_back({0, reply});
  }
  return all;
}

std::vector<TimedBytes> StandIn::receive(std::string_view bytes) {
  const std::lock_guard lock(state_->mutex);
  State& s = *state_;
  s.incoming += bytes;
  if (s.incoming.size() > 65536) s.incoming.clear();
  std::vector<TimedBytes> all;
  const std::string& end = s.setup.profile.link.terminator;
  for (std::size_t at; (at = s.incoming.find(end)) != std::string::npos;) {
    const std::string line = s.incoming.substr(0, at);
    s.incoming.erase(0, at + end.size());
    for (TimedBytes& each : s.sent_as_it_goes_wrong(line)) all.push_back(std::move(each));
  }
  return all;
}

}  // namespace coilassay::synthetic
