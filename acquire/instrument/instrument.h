// What stands on the bench, as its profile describes it: readings, records, presence, verdicts.
#pragma once

#include <functional>
#include <map>
#include <memory>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "acquire/capture.h"
#include "acquire/instrument/conversation.h"
#include "acquire/instrument/profile.h"
#include "acquire/instrument/reply_values.h"

namespace coilassay {

/// What was noticed while asking, for the person beside it: "no reply within 2 s; asked again".
using Remark = std::function<void(const std::string&)>;

class Instrument {
 public:
  Instrument(InstrumentProfile profile, StreamOpener opener, std::function<bool()> stopped = {}, Remark remark = {});

  /// Opens the line, asks the identity, sends [prepare], asks the settings.
  Result<void> open();
  /// One [reading]. Asked again only after a bad reply, at most [reading] attempts times (a silent instrument for as long
  /// as a lost one is waited for). instrument: no readable reply; is_gone() tells whether it is for good.
  Result<Reading> read();
  /// One [record] as a capture, with settings and identity in its head.
  Result<Capture> record();
  /// Whether a part is there, asked by [present]; yes when the profile does not ask.
  Result<bool> part_present();
  /// Sends a line of [verdict]; nothing without one.
  Result<void> show_verdict(const std::string& command);

  const InstrumentProfile& profile() const { return profile_; }
  const std::string& identity() const { return line_.identity(); }
  /// Replies to the [[setting]] questions by name; outside text.
  const std::vector<std::pair<std::string, std::string>>& settings() const { return settings_; }
  const ConversationCounts& counts() const { return line_.counts(); }
  bool is_gone() const { return gone_; }
  /// What stands in the head of a capture: identity, profile, settings, conditions.
  std::map<std::string, std::string> head() const;

 private:
  template <class T>
  Result<T> repeated(std::size_t attempts, const std::function<Answer<T>()>& once);
  Answer<Reading> read_once();
  Answer<std::vector<std::vector<double>>> record_once();

  InstrumentProfile profile_;
  Conversation line_;
  Remark remark_;
  std::vector<std::pair<std::string, std::string>> settings_;
  bool gone_ = false;
};

/// The conditions of a reading as text, "frequency" -> "100 kHz".
std::map<std::string, std::string> conditions_in_words(const StatedConditions& at);

}  // namespace coilassay
