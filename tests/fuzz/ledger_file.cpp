// Files that are given out as ledgers: opened, verified and read without harm.
#include "ledger/ledger.h"
#include "tests/fuzz/input_file.h"
#include "tests/fuzz/target.h"

namespace {

using namespace coilassay;
using fuzz::require;

void read_ledger(std::string_view bytes) {
  const std::string path = fuzz::input_file("input.ledger", bytes);
  const Result<Ledger> ledger = Ledger::open({.path = path, .wait_s = 0});
  if (!ledger) {
    require(ledger.error().problem == Problem::ledger && !ledger.error().finding.empty(), "a refusal says what was found");
    return;
  }
  const Result<LedgerCheck> check = ledger->verify();
  const Result<std::vector<Entry>> entries = ledger->find({});
  if (!check || !check->holds()) return;
  require(entries.has_value(), "a chain that holds can be read");
  require(static_cast<std::int64_t>(entries->size()) == check->entries, "every entry that was verified is read");
  std::string previous{kFirstPrevious};
  for (const Entry& entry : *entries) {
    require(entry.previous == previous && entry.hash == entry_hash(entry.previous, entry.body), "the chain holds");
    previous = entry.hash;
  }
}

}  // namespace

COILASSAY_FUZZ_TARGET(ledger_file, read_ledger)
