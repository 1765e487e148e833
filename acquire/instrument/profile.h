// How to talk to what stands on the bench (docs/formats.md#instrument-profile). Nothing about any maker is built in.
#pragma once

#include <cstddef>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "acquire/instrument/serial_stream.h"
#include "base/quantity.h"
#include "base/result.h"

namespace coilassay {

struct LinkSetup {
  enum class Kind { serial, tcp, recorded } kind = Kind::serial;
  std::string port;  // a device, "host:port", or a recorded session (resolved against the profile)
  SerialSetup serial;
  std::string terminator = "\n";        // ends what is sent
  std::string reply_terminator = "\n";  // ends a line that comes
  double timeout_s = 2;                 // for a whole reply
  double byte_timeout_s = 2;            // longest pause within a reply
  double lateness_s = 2;                // how late a reply can still come after its time-out
  double quiet_s = 0.01;                // silence that must follow a reply
  double reconnect_s = 10;              // how long a lost or silent instrument is waited for
  bool echo = false;                    // it sends back what it was sent
};

struct IdentitySetup {
  std::string ask;
  std::string expect;  // RE2 pattern, found anywhere in the reply
};

/// One value of a reply: a symbol with its unit, "status", or "-" for one that is not looked at.
struct ProfileField {
  std::string symbol;
  Unit unit = Unit::one;
  double factor = 1;     // of the stated unit: 1e-6 for "L_s [uH]"
  std::string unit_text; // as stated, for "47.02" to be read in it
  std::string place;     // "meter.toml:14"
  bool is_value() const { return symbol != "status" && symbol != "-"; }
};

/// What a reading is true at, as far as stated.
struct StatedConditions {
  std::optional<StatedValue> frequency, level_v, level_a, bias, temperature;
};

/// "1 % + 2 mohm": rectangular half-width, a share of the value and a fixed part.
struct Accuracy {
  double ratio = 0;
  double fixed = 0;  // SI
};

struct ReadingSetup {
  std::optional<std::string> ask;  // none: lines come unasked
  std::string separator = ",";     // a blank: any run of blanks
  std::optional<std::string> pattern;  // instead of a separator: its groups are the fields
  std::string decimal = ".";
  std::vector<ProfileField> fields;
  std::string status = "0";              // of the field "status" when all is well
  std::vector<std::string> invalid;      // replies that are no value, besides those everyone uses
  std::size_t attempts = 3;              // asked again after a bad reply
  std::string test, test_place;          // of the part sheet whose limits it serves; empty: the first of this kind
  StatedConditions at;
  std::map<std::string, Accuracy> accuracy;       // by symbol
  std::map<std::string, StatedValue> subtract;    // of the fixture, by symbol
};

struct RecordSetup {
  enum class Format { rows, int8, int16, float32 } format = Format::rows;
  std::vector<std::string> ask;  // one for all fields, or one for each
  bool big_endian = true;
  std::vector<double> scale, offset;  // per field
  std::string separator = ",";
  std::string decimal = ".";
  std::vector<ProfileField> fields;
  std::vector<std::string> invalid;
  double sample_interval_s = 0;
  std::size_t count = 0;  // samples of a field
};

/// Is a part in the fixture, is it touched well.
struct PresentSetup {
  std::optional<std::string> ask;
  std::string when;                          // RE2 pattern of the whole reply that means yes
  std::map<std::string, double> open_above;  // a reading above it: nothing is in the fixture
  std::map<std::string, double> short_below; // a reading below it: the fixture is shorted
  std::map<std::string, double> jitter;      // repeats that differ by more than this share: a poor contact
};

struct VerdictCommands {
  std::string pass, fail, otherwise;
};

/// A setting that is asked once and kept with what was measured.
struct SettingQuestion {
  std::string name, ask;
  std::string place;
};

/// When the instrument was calibrated, and what follows when that is too long ago.
struct CalibrationDates {
  std::string id, certificate;
  std::string calibrated, due;  // "2026-05-01"
  bool overdue_blocks = true;   // a station does not judge with it; else it only says so
};

struct InstrumentProfile {
  std::string path;
  LinkSetup link;
  std::optional<IdentitySetup> identity;
  std::vector<std::string> prepare;
  std::vector<SettingQuestion> settings;
  std::optional<ReadingSetup> reading;
  std::optional<RecordSetup> record;
  std::optional<PresentSetup> present;
  std::optional<VerdictCommands> verdict;
  std::optional<CalibrationDates> calibration;
};

/// Reads a profile; bad_sheet, wrong_unit or bad_number with the line for an unknown key, a value that makes no sense,
/// a pattern that cannot compile, no terminator, neither [reading] nor [record].
Result<InstrumentProfile> read_instrument_profile(const std::string& path);
Result<InstrumentProfile> parse_instrument_profile(std::string_view text, const std::string& name);

}  // namespace coilassay
