// Whether a ledger is what was written: each way in which it could have been changed is looked for.
#include <charconv>

#include "base/outside_text.h"
#include "ledger/creation.h"
#include "ledger/state.h"

namespace coilassay {

namespace {

constexpr std::int64_t kChunk = 500;  // entries read at a time, so that stations need not wait for the whole

/// Collects what is wrong; `add` says whether there is room for more.
class Faults {
 public:
  explicit Faults(LedgerCheck& check) : check_(&check) {}
  void add(std::int64_t id, std::string what) {
    if (check_->faults.size() < kMostFaults) check_->faults.push_back({id, std::move(what)});
    else check_->more_faults = true;
  }

 private:
  LedgerCheck* check_;
};

/// A number SQLite wrote; a value that is none was put there by somebody.
std::int64_t number_of(const std::string& text) {
  std::int64_t number = 0;
  std::from_chars(text.data(), text.data() + text.size(), number);
  return number;
}

/// The columns of an entry in the order they are read below.
SqlRow columns_of(const EntryContent& c) {
  return {std::string(name(c.kind)), to_text(c.time), c.part, c.revision, c.supplier, c.sheet_sha256, c.lot, c.serial,
          std::to_string(c.attempt), c.verdict, c.operator_name, c.instrument, c.program,
          c.corrects ? std::to_string(*c.corrects) : "", c.reason};
}
constexpr std::string_view kColumnNames[] = {"kind", "time", "part", "revision", "supplier", "sheet_sha256", "lot", "serial",
                                             "attempt", "verdict", "operator", "instrument", "program", "corrects", "reason"};
constexpr std::size_t kColumns = std::size(kColumnNames);

struct Chain {
  std::int64_t last = 0;
  std::string hash{kFirstPrevious};
  std::string part;
};

struct Sources {
  std::int64_t entry = 0;
  std::vector<EntrySource> list;
};

/// Sources of the entries of a chunk, in order.
Result<std::vector<Sources>> sources_of(LedgerStore& store, std::int64_t from, std::int64_t to) {
  std::vector<Sources> all;
  const Result<void> read = store.each(
      "SELECT CAST(entry AS TEXT), test, file, sha256 FROM source WHERE entry BETWEEN ? AND ? ORDER BY entry, position", {from, to}, 4,
      [&all](const SqlRow& row) {
        const std::int64_t entry = number_of(row[0]);
        if (all.empty() || all.back().entry != entry) all.push_back({entry, {}});
        all.back().list.push_back({row[1], row[2], row[3]});
        return true;
      });
  if (!read) return failure(read);
  return all;
}

void compare_columns(const SqlRow& row, std::int64_t id, const EntryContent& content, Faults& faults) {
  const SqlRow expected = columns_of(content);
  for (std::size_t i = 0; i < kColumns; ++i) {
    if (row[i + 1] != expected[i]) {
      faults.add(id, "the column '" + std::string(kColumnNames[i]) + "' says '" + shown(row[i + 1], 60) +
                         "', the record itself '" + shown(expected[i], 60) + "'");
    }
  }
}

/// Row: id, the columns, body, previous, hash.
void check_entry(const SqlRow& row, const std::vector<Sources>& sources, Chain& chain, Faults& faults) {
  const std::int64_t id = number_of(row[0]);
  const std::string &body = row[kColumns + 1], &previous = row[kColumns + 2], &hash = row[kColumns + 3];
  if (id != chain.last + 1) {
    const std::string missing = id == chain.last + 2 ? "entry " + std::to_string(chain.last + 1) + " is missing"
                                                     : "entries " + std::to_string(chain.last + 1) + " to " +
                                                           std::to_string(id - 1) + " are missing";
    faults.add(id, missing);
  }
  if (previous != chain.hash) faults.add(id, "it does not follow the entry before it: the hash of that one is another");
  if (entry_hash(previous, body) != hash) faults.add(id, "its text does not have the hash that was recorded");
  chain.last = id;
  chain.hash = hash;

  const Result<EntryContent> content = content_of(body);
  if (!content) {
    faults.add(id, "its text is not one this program writes");
    return;
  }
  compare_columns(row, id, *content, faults);
  if (id == 1) chain.part = content->part;
  if (content->part != chain.part) faults.add(id, "it is about another part than the first entry");
  if (content->corrects && (*content->corrects < 1 || *content->corrects >= id)) {
    faults.add(id, "it corrects an entry that was not there before it");
  }
  std::vector<EntrySource> stored;
  for (const Sources& each : sources) {
    if (each.entry == id) stored = each.list;
  }
  if (stored != content->sources) faults.add(id, "the list of its files was changed");
}

Result<void> check_entries(LedgerStore& store, std::int64_t end, Chain& chain, LedgerCheck& check, Faults& faults, Progress* progress) {
  for (std::int64_t from = 0; from <= end; from += kChunk) {
    const std::int64_t to = std::min(from + kChunk - 1, end);
    const Result<std::vector<Sources>> sources = sources_of(store, from, to);
    if (!sources) return failure(sources);
    const Result<void> read = store.each(
        "SELECT CAST(id AS TEXT), kind, time, part, revision, supplier, sheet_sha256, lot, serial, CAST(attempt AS TEXT),"
        " verdict, operator, instrument, program, CAST(corrects AS TEXT), reason, body, previous, hash"
        " FROM entry WHERE id BETWEEN ? AND ? ORDER BY id", {from, to}, kColumns + 4, [&](const SqlRow& row) {
          ++check.entries;
          check_entry(row, *sources, chain, faults);
          return true;
        });
    if (!read) return failure(read);
    if (progress != nullptr &&
        !progress->advance("checking " + store.path(), static_cast<std::uint64_t>(to), static_cast<std::uint64_t>(end))) {
      return failure(Problem::interrupted, store.path(), "stopped before the end", "");
    }
  }
  return {};
}

/// The file as SQLite sees it: pages, indexes that miss an entry, rows without their entry.
Result<void> check_structure(LedgerStore& store, Faults& faults) {
  Result<void> read = store.each("SELECT integrity_check FROM pragma_integrity_check(10)", {}, 1, [&faults](const SqlRow& row) {
    if (row[0] != "ok") faults.add(0, "the file's structure is damaged: " + shown(row[0], 120));
    return true;
  });
  if (!read) return read;
  read = store.each("SELECT DISTINCT CAST(entry AS TEXT) FROM source WHERE entry NOT IN (SELECT id FROM entry) LIMIT 5", {}, 1,
                    [&faults](const SqlRow& row) {
                      faults.add(0, "files are listed for entry " + row[0] + ", which does not exist");
                      return true;
                    });
  if (!read) return read;
  return store.each("SELECT CAST(id AS TEXT) FROM entry WHERE id < 1 LIMIT 5", {}, 1, [&faults](const SqlRow& row) {
    faults.add(0, "an entry has the number " + row[0]);
    return true;
  });
}

}  // namespace

Result<LedgerCheck> Ledger::verify(Progress* progress) const {
  LedgerStore& store = state_->store;
  LedgerCheck check;
  Faults faults(check);
  const Result<std::vector<std::string>> schema = schema_faults(store);
  if (!schema) return failure(schema);
  for (const std::string& fault : *schema) faults.add(0, fault);

  const Result<LedgerHead> end = head();
  if (!end) return failure(end);
  Chain chain;
  Result<void> read = check_entries(store, end->id, chain, check, faults, progress);
  if (read) read = check_structure(store, faults);
  if (!read) {
    // A page that cannot be read is what was looked for; what was found before it still counts.
    if (read.error().problem != Problem::ledger) return failure(read);
    faults.add(0, read.error().finding);
  }
  check.head = {chain.last, chain.hash};
  check.part = chain.part;
  return check;
}

}  // namespace coilassay
