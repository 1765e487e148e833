// From an instrument to a capture file, row by row.
#pragma once

#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct AcquireJob {
  std::string profile;                  // path
  std::string file;                     // new; "-" is standard output
  std::optional<std::uint64_t> count;   // of readings, or of records
  std::optional<double> every_s;        // pace; as fast as it goes when absent
  std::optional<std::string> trace;     // path of a log of all bytes
  std::function<bool()> stopped;
  std::function<void(const std::string&)> remark;      // what went wrong on the way and was put right
  std::function<void(const std::string&)> row_written;  // each row in words
};

struct AcquireSummary {
  std::string file, instrument;
  std::string what;                     // "readings" or "records"
  std::uint64_t rows = 0;               // written
  std::uint64_t without_value = 0;      // of readings: over range, a bad status, or no readable reply
  std::uint64_t useless = 0;            // of these: not one value that may be used
  std::uint64_t unreadable = 0;         // of these: no reply, or one that was none
  std::string last_trouble;             // of an unreadable one; outside text
  std::vector<std::pair<std::string, std::string>> settings;
  std::uint64_t timeouts = 0, resynchronised = 0, reconnected = 0;
  bool stopped = false;                 // by the user
};

/// One record when the profile has [record] and no count or pace is asked for a [reading]; else readings, `count` of them or until
/// stopped; with [record] alone, `count` records, which become segments of the file. Settings and identity stand in its
/// head. usage: a file that is there already. instrument: it cannot be opened, or is gone for good: what came is kept.
Result<AcquireSummary> run_acquire(const AcquireJob& job, const RunContext& context);

std::string to_json(const AcquireSummary& summary);

/// The profile tried step by step.
struct TryStep {
  std::string title;                         // "identity"
  std::vector<std::pair<bool, std::string>> bytes;  // true: sent; escaped, shortened
  std::vector<std::string> read_as;          // "L_s: 47.02 µH"
  std::optional<Error> trouble;              // the last step only
};
struct TryReport {
  std::vector<TryStep> steps;
  bool works() const { return !steps.empty() && !steps.back().trouble; }
};
/// Fails only when the profile itself cannot be read.
Result<TryReport> run_try_profile(const std::string& profile, const std::optional<std::string>& trace, const std::function<bool()>& stopped,
                                  const RunContext& context);
std::string to_json(const TryReport& report);

}  // namespace coilassay
