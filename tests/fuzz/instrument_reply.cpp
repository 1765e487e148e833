// What an instrument says: lines of readings and rows, headers of blocks, lines of a log. The first byte chooses how it is taken.
#include <cmath>

#include "acquire/instrument/block.h"
#include "acquire/instrument/byte_log.h"
#include "acquire/instrument/profile.h"
#include "acquire/instrument/reply_values.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

const InstrumentProfile& profile_of(const char* text) {
  static std::map<const char*, InstrumentProfile> profiles;
  auto found = profiles.find(text);
  if (found == profiles.end()) {
    Result<InstrumentProfile> parsed = parse_instrument_profile(text, "meter.toml");
    require(parsed.has_value(), "the profile of the target is one");
    found = profiles.emplace(text, std::move(*parsed)).first;
  }
  return found->second;
}

constexpr const char* kSeparated =
    "[link]\nkind = \"tcp\"\nport = \"localhost:5025\"\n[reading]\nask = \"FETC?\"\nseparator = \",\"\n"
    "fields = [\"L_s [uH]\", \"R_s [ohm]\", \"status\"]\nstatus = \"0\"\ninvalid = [\"-1.0\"]\n";
constexpr const char* kPattern =
    "[link]\nkind = \"tcp\"\nport = \"localhost:5025\"\n[reading]\npattern = \"L=([0-9.eE+-]+) *R=([0-9.eE+-]+)\"\n"
    "fields = [\"L_s [H]\", \"R_s [ohm]\"]\n";
constexpr const char* kRows =
    "[link]\nkind = \"tcp\"\nport = \"localhost:5025\"\n[record]\nask = \"RUN\"\nformat = \"rows\"\nseparator = \",\"\n"
    "fields = [\"V [V]\", \"I [mA]\"]\nsample_interval = \"1 us\"\ncount = 100\n";

void check(const Result<Reading>& reading) {
  if (!reading) {
    require(!reading.error().finding.empty(), "a refusal says what was found");
    return;
  }
  for (const ReadingValue& value : reading->values) {
    require((value.state == ValueState::measured) == std::isfinite(value.value), "a value that was measured is a number");
  }
}

void take(std::string_view bytes) {
  if (bytes.empty()) return;
  const std::string line(bytes.substr(1));
  switch (bytes.front()) {
    case 's': check(parse_reading(*profile_of(kSeparated).reading, line, "meter")); break;
    case 'p': check(parse_reading(*profile_of(kPattern).reading, line, "meter")); break;
    case 'r': {
      const auto row = parse_row(*profile_of(kRows).record, line, "meter");
      require(!row || row->size() == 2, "a row has a value per field");
      break;
    }
    case 'b': {
      BlockHeader header;
      if (read_block_header(line, header) == HeaderState::complete) {
        require(header.header_bytes >= 3 && header.header_bytes <= 11 && header.header_bytes <= line.size(), "a header lies within what came");
      }
      break;
    }
    case 'v': {
      const auto samples = raw_samples(std::string_view(line).substr(0, line.size() / 4 * 4), RecordSetup::Format::float32, true);
      require(samples.size() == line.size() / 4, "a sample per four bytes");
      break;
    }
    default: {
      bool fine = true;
      require(unescaped_bytes(escaped_bytes(line), fine) == line && fine, "a log gives back what went through");
      unescaped_bytes(line, fine);
    }
  }
}

}  // namespace

COILASSAY_FUZZ_TARGET(instrument_reply, take)
