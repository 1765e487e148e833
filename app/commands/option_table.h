// Options and commands as data. Parsing, help, the man page, shell completion and docs/commands.md are made from these.
#pragma once

#include <cmath>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "base/result.h"
#include "base/unit.h"

namespace coilassay {

class Arguments;
class Console;

/// What a command says to whoever started it.
enum class ExitCode {
  done = 0,       // measured; passed, accepted
  rejected = 1,   // failed, rejected
  unusable = 2,   // a command line or an input that cannot be used
  undecided = 3,  // undecided, not comparable, or the measurement was refused
  broken = 4,     // instrument or ledger
};

enum class ValueKind {
  flag,    // there or not
  stated,  // a value with its tolerance, "10nF±1%"
  plain,   // a value without tolerance, "20 us"
  count,   // a whole number
  choice,  // one of some words
  text,
  file,
};

/// Which values make sense, the same as in a bench sheet; what lies outside is refused with the option as the place.
enum class Range {
  any,
  not_zero,      // a factor: an inverted probe is one
  not_negative,  // strays and losses
  positive,
  above_absolute_zero,  // of a temperature in degrees Celsius
};

struct Option {
  std::string_view name = {};  // "--capacitor", "-o"
  ValueKind kind = ValueKind::flag;
  std::string_view value_name = {};  // "VALUE"
  std::string_view help = {};        // one sentence without its full stop
  std::string_view example = {};     // a value as typed; checked by a test to be accepted
  Unit unit = Unit::one;             // of a stated or plain value
  Range range = Range::any;
  double below = HUGE_VAL;  // a stated or plain value must be less than this
  std::uint64_t least = 0;  // of a count
  std::uint64_t most = UINT64_MAX;
  std::vector<std::string_view> choices = {};
  bool repeatable = false;
};

struct OptionGroup {
  std::string_view title = {};
  std::vector<Option> options = {};
};

/// The words of a command that are no options.
struct Positional {
  std::string_view name = {};  // "FILE"; "FILE ID" for one of each; empty: there are none
  std::string_view help = {};
  std::size_t least = 0;
  std::size_t most = 0;
  bool files = true;  // for completion
};

struct Example {
  std::string_view line = {};  // without the program's name
  std::string_view does = {};
};

struct Command {
  std::string_view name = {};         // one word, or two: "simulate ringdown"
  std::string_view summary = {};      // completes "coilassay NAME: ..."
  std::string_view description = {};  // paragraphs, separated by a line feed
  Positional positional = {};
  std::vector<OptionGroup> groups = {};
  std::vector<Example> examples = {};
  Result<ExitCode> (*run)(const Arguments&, Console&) = nullptr;

  /// nullptr when the command has no such option.
  const Option* find(std::string_view option) const;
};

/// "--capacitor VALUE"
std::string usage_of(const Option& option);
/// "coilassay ringdown FILE... [options]"
std::string usage_of(const Command& command);

// For messages.
std::string in_quotes(std::string_view outside);  // made safe and short
std::string how_to_write(const Option& option);   // "write it like --capacitor 10nF±1%"

}  // namespace coilassay
