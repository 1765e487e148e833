// Ledgers as documents: coilassay.ledger/1 and coilassay.verify/1.
#pragma once

#include <optional>
#include <span>
#include <string>

#include "ledger/ledger.h"

namespace coilassay {

/// An entry that was measured again from its raw files.
struct MeasuredAgain {
  std::size_t files = 0;
  std::string recorded_by, program;  // then and now
  struct Difference {
    std::string where, recorded, now;
  };
  std::vector<Difference> differences;
  std::size_t more = 0;  // differences beyond those listed
  bool same() const { return differences.empty(); }
};

/// Entries with everything their bodies say, the body's exact text beside it, and where the chain ends.
std::string ledger_json(std::span<const Entry> entries, const std::string& part, const LedgerHead& head,
                        const std::optional<MeasuredAgain>& again = {});

/// A head that was printed somewhere, looked up in the chain.
struct ExpectedHead {
  std::string hash;
  std::optional<std::int64_t> id;  // the entry that has it; absent: none has
};

/// Whether everything is as it should be: the chain holds and goes on from the head that was expected.
bool holds(const LedgerCheck& check, const std::optional<ExpectedHead>& expected);

/// When it does not hold, the members of an error document (problem, place, finding, remedy) stand in it as well.
std::string verify_json(const LedgerCheck& check, const std::string& file, const std::optional<ExpectedHead>& expected);

/// The same in one sentence: "entry 3: its text does not have the hash that was recorded, and 2 more faults".
std::string fault_in_words(const LedgerCheck& check, const std::optional<ExpectedHead>& expected);

}  // namespace coilassay
