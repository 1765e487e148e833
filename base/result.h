// What went wrong, as a value: a kind, a place, a finding and a remedy.
#pragma once

#include <string>
#include <string_view>
#include <tl/expected.hpp>

namespace coilassay {

/// The kinds of failure a caller may want to tell apart; `name()` is the text in an error document.
enum class Problem {
  usage,               // the command line asks for something that does not exist or does not fit
  unreadable,          // no such file, a directory, no permission, vanished
  not_a_capture,       // empty, binary, or a text in which no table of numbers was found
  damaged,             // a table that breaks its own shape: place names the line
  ambiguous,           // can be read in two ways that give different numbers
  missing_column,      // a column that was asked for does not exist
  bad_number,          // a value that is no number, or out of range
  wrong_unit,          // a value with a unit of another kind
  bad_sheet,           // a sheet (TOML) that is not valid: syntax, unknown key, wrong type
  too_few_samples,     // not enough to fit anything
  no_signal,           // nothing above the noise
  rank_deficient,      // the data do not determine the parameters
  not_converged,       // a fit that did not settle
  cannot_write,        // full disk, read-only, no such folder
  missing_helper,      // a program run as a child (gnuplot, Chromium) is not there or failed
  instrument,          // port, socket or reply
  ledger,              // the record cannot be opened, read or extended
  interrupted,         // the user stopped it
};

std::string_view name(Problem problem);

/// One failure, ready to be shown: "<place>: <finding>" and "try: <remedy>".
struct Error {
  Problem problem = Problem::usage;
  std::string place;    // "file.csv:3", "--capacitor", "bench.toml:7"; outside text is escaped when it is shown
  std::string finding;  // one clear sentence, no full stop needed
  std::string remedy;   // what to do next; may be empty when nothing sensible can be said
};

template <class T>
using Result = tl::expected<T, Error>;

/// Shorthand for returning a failure from a function that gives a Result.
inline tl::unexpected<Error> failure(Problem problem, std::string place, std::string finding, std::string remedy) {
  return tl::make_unexpected(Error{problem, std::move(place), std::move(finding), std::move(remedy)});
}

/// Passes on the failure of another result.
template <class T>
tl::unexpected<Error> failure(const Result<T>& other) {
  return tl::make_unexpected(other.error());
}

}  // namespace coilassay
