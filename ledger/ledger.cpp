#include "ledger/ledger.h"

#include <algorithm>
#include <cassert>

#include "base/outside_text.h"
#include "ledger/creation.h"
#include "ledger/state.h"
#include "ledger/store.h"

namespace coilassay {

namespace {

tl::unexpected<Error> refused(const std::string& path, std::string finding, std::string remedy) {
  return failure(Problem::ledger, path, std::move(finding), std::move(remedy));
}

/// An entry `e` and the newest correction `c` of it.
constexpr std::string_view kSelect =
    "SELECT CAST(e.id AS TEXT), e.body, e.previous, e.hash, CAST(c.id AS TEXT), c.lot, c.serial, c.supplier, c.verdict"
    " FROM entry e LEFT JOIN entry c ON c.id = (SELECT max(id) FROM entry WHERE corrects = e.id) WHERE ";
constexpr std::size_t kColumns = 9;

enum class View { recorded, corrected };

Result<std::vector<Entry>> entries(LedgerStore& store, const std::string& where, const std::vector<SqlValue>& values, View view) {
  std::vector<Entry> found;
  Result<void> fine;
  const Result<void> read = store.each(std::string(kSelect) + where, values, kColumns, [&](const SqlRow& row) {
    Result<EntryContent> content = content_of(row[1]);
    if (!content || entry_hash(row[2], row[1]) != row[3]) {
      fine = refused(store.path(), "entry " + row[0] + " is damaged or was altered", "coilassay ledger verify says what is wrong");
      return false;
    }
    Entry entry{.id = std::stoll(row[0]), .content = std::move(*content), .body = row[1], .previous = row[2], .hash = row[3],
                .corrected_by = {}};
    if (!row[4].empty()) {
      entry.corrected_by = std::stoll(row[4]);
      if (view == View::corrected) {
        entry.content.lot = row[5];
        entry.content.serial = row[6];
        entry.content.supplier = row[7];
        entry.content.verdict = row[8];
      }
    }
    found.push_back(std::move(entry));
    return true;
  });
  if (!read) return failure(read);
  if (!fine) return failure(fine);
  return found;
}

Result<LedgerHead> head_of(LedgerStore& store) {
  const Result<SqlRow> last = store.first("SELECT CAST(id AS TEXT), hash FROM entry ORDER BY id DESC LIMIT 1", {}, 2);
  if (!last) return failure(last);
  if (last->empty()) return LedgerHead{};
  return LedgerHead{std::stoll((*last)[0]), (*last)[1]};
}

Result<std::string> part_of(LedgerStore& store) {
  const Result<SqlRow> first = store.first("SELECT part FROM entry ORDER BY id LIMIT 1", {}, 1);
  if (!first) return failure(first);
  return first->empty() ? std::string() : first->front();
}

tl::unexpected<Error> other_part(const std::string& path, const std::string& holds, const std::string& asked) {
  return refused(path, "this is the ledger of part '" + shown(holds, 60) + "', not of '" + shown(asked, 60) + "'",
                 "give each part a ledger of its own");
}

/// Units as they stand today. Candidates come from the indexes; what stands is then compared.
Result<std::vector<Entry>> units_of(LedgerStore& store, const std::string& serial, const std::optional<std::string>& lot) {
  std::vector<SqlValue> values{serial, serial, serial};
  std::string where =
      "e.kind = 'unit' AND e.id IN (SELECT id FROM entry WHERE serial = ? UNION SELECT corrects FROM entry WHERE serial = ?"
      " AND corrects IS NOT NULL) AND coalesce(c.serial, e.serial) = ?";
  if (lot) {
    where += " AND coalesce(c.lot, e.lot) = ?";
    values.emplace_back(*lot);
  }
  return entries(store, where + " ORDER BY e.id", values, View::corrected);
}

Result<void> check_place(LedgerStore& store, const EntryContent& content) {
  if (content.kind == EntryKind::unit) {
    const Result<std::vector<Entry>> before = units_of(store, content.serial, content.lot);
    if (!before) return failure(before);
    for (const Entry& entry : *before) {
      if (entry.content.attempt != content.attempt || entry.content.revision != content.revision) continue;
      return refused(store.path(), "entry " + std::to_string(entry.id) + " is attempt " + std::to_string(content.attempt) +
                                       " at unit '" + shown(content.serial, 60) + "' already",
                     "look at it with coilassay ledger show, and measure again only with a reason");
    }
  }
  if (content.corrects) {
    const Result<SqlRow> row = store.first("SELECT kind FROM entry WHERE id = ?", {*content.corrects}, 1);
    if (!row) return failure(row);
    const std::string number = std::to_string(*content.corrects);
    if (row->empty()) return refused(store.path(), "there is no entry " + number + " to correct", "coilassay ledger list shows what there is");
    if (row->front() == name(EntryKind::correction)) {
      return refused(store.path(), "entry " + number + " is a correction itself", "correct the entry it is about: the newest correction counts");
    }
  }
  return {};
}

Result<void> insert(LedgerStore& store, const Entry& entry) {
  const EntryContent& c = entry.content;
  const SqlValue corrects = c.corrects ? SqlValue(*c.corrects) : SqlValue();
  Result<void> stored = store.run(
      "INSERT INTO entry(id, kind, time, part, revision, supplier, sheet_sha256, lot, serial, attempt, verdict, operator,"
      " instrument, program, corrects, reason, body, previous, hash) VALUES(?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
      {entry.id, std::string(name(c.kind)), to_text(c.time), c.part, c.revision, c.supplier, c.sheet_sha256, c.lot, c.serial,
       std::int64_t{c.attempt}, c.verdict, c.operator_name, c.instrument, c.program, corrects, c.reason, entry.body,
       entry.previous, entry.hash});
  for (std::size_t i = 0; stored && i < c.sources.size(); ++i) {
    stored = store.run("INSERT INTO source(entry, position, test, file, sha256) VALUES(?, ?, ?, ?, ?)",
                       {entry.id, static_cast<std::int64_t>(i), c.sources[i].test, c.sources[i].file, c.sources[i].sha256});
  }
  return stored;
}

/// Within a transaction that holds the file: what is read here stays true until it ends.
Result<void> add_all(LedgerStore& store, std::vector<Entry>& batch) {
  Result<LedgerHead> head = head_of(store);
  if (!head) return failure(head);
  Result<std::string> part = part_of(store);
  if (!part) return failure(part);
  if (head->id == 0) part = batch.front().content.part;
  for (Entry& entry : batch) {
    if (entry.content.part != *part) return other_part(store.path(), *part, entry.content.part);
    if (Result<void> fine = check_place(store, entry.content); !fine) return fine;
    entry.id = head->id + 1;
    entry.previous = head->hash;
    entry.hash = entry_hash(entry.previous, entry.body);
    if (Result<void> stored = insert(store, entry); !stored) return stored;
    head = LedgerHead{entry.id, entry.hash};
  }
  return {};
}

}  // namespace

Ledger::Ledger(std::unique_ptr<State> state) : state_(std::move(state)) {}
Ledger::~Ledger() = default;
Ledger::Ledger(Ledger&&) noexcept = default;
Ledger& Ledger::operator=(Ledger&&) noexcept = default;

Result<Ledger> Ledger::open(const LedgerRequest& request) {
  const bool adding = request.mode != LedgerMode::read_only;
  if (request.mode == LedgerMode::create) {
    if (const Result<void> made = make_ledger(request.path, request.wait_s); !made) return failure(made);
  }
  Result<LedgerStore> store = LedgerStore::open(request.path, adding, request.wait_s);
  if (!store) return failure(store);
  if (const Result<void> usable = check_ledger(*store, adding); !usable) return failure(usable);
  const Result<std::string> part = part_of(*store);
  if (!part) return failure(part);
  if (!request.part.empty() && !part->empty() && *part != request.part) return other_part(request.path, *part, request.part);
  return Ledger(std::make_unique<State>(State{std::move(*store)}));
}

Result<std::vector<Entry>> Ledger::append(std::span<const EntryContent> contents) {
  assert(!contents.empty() && contents.size() <= kLargestBatch);
  std::vector<Entry> batch;
  for (const EntryContent& content : contents) {
    Result<std::string> body = body_of(content);
    if (!body) return failure(body);
    // As it will be read back: details in the writing of the body.
    Result<EntryContent> stored = content_of(*body);
    if (!stored) return failure(stored);
    batch.push_back({.id = 0, .content = std::move(*stored), .body = std::move(*body), .previous = {}, .hash = {}, .corrected_by = {}});
  }
  LedgerStore& store = state_->store;
  // Immediate: a transaction that read first and wants to write later would be refused when another station was quicker.
  if (const Result<void> begun = store.run("BEGIN IMMEDIATE"); !begun) return failure(begun);
  Result<void> done = add_all(store, batch);
  if (done) done = store.run("COMMIT");
  if (!done) {
    (void)store.run("ROLLBACK");  // SQLite may have done so itself
    return failure(done);
  }
  return batch;
}

Result<Entry> Ledger::append(const EntryContent& content) {
  Result<std::vector<Entry>> stored = append(std::span(&content, 1));
  if (!stored) return failure(stored);
  return std::move(stored->front());
}

Result<LedgerHead> Ledger::head() const { return head_of(state_->store); }

Result<std::string> Ledger::part() const { return part_of(state_->store); }

Result<Entry> Ledger::entry(std::int64_t id) const {
  Result<std::vector<Entry>> found = entries(state_->store, "e.id = ?", {id}, View::recorded);
  if (!found) return failure(found);
  if (found->empty()) {
    return failure(Problem::usage, path(), "there is no entry " + std::to_string(id), "coilassay ledger list shows what there is");
  }
  return std::move(found->front());
}

Result<std::optional<Entry>> Ledger::entry_of_hash(const std::string& beginning) const {
  // By comparing, not by a pattern: nothing in the text has a meaning of its own.
  Result<std::vector<Entry>> found = entries(state_->store, "substr(e.hash, 1, length(?)) = ? ORDER BY e.id LIMIT 1",
                                             {beginning, beginning}, View::recorded);
  if (!found) return failure(found);
  if (found->empty()) return std::nullopt;
  return std::move(found->front());
}

Result<std::vector<Entry>> Ledger::find(const EntryQuery& query) const {
  std::string where = "1";
  std::vector<SqlValue> values;
  const auto need = [&](std::string_view condition, SqlValue value) {
    where += " AND " + std::string(condition);
    values.push_back(std::move(value));
  };
  if (query.kind) need("e.kind = ?", std::string(name(*query.kind)));
  if (query.lot) need("e.lot = ?", *query.lot);
  if (query.serial) need("e.serial = ?", *query.serial);
  if (query.revision) need("e.revision = ?", *query.revision);
  if (query.supplier) need("e.supplier = ?", *query.supplier);
  if (query.sha256) need("e.id IN (SELECT entry FROM source WHERE sha256 = ?)", *query.sha256);
  if (query.from) need("e.id >= ?", *query.from);
  if (query.to) need("e.id <= ?", *query.to);
  where += query.newest ? " ORDER BY e.id DESC LIMIT ?" : " ORDER BY e.id";
  if (query.newest) values.emplace_back(static_cast<std::int64_t>(*query.newest));
  Result<std::vector<Entry>> found = entries(state_->store, where, values, View::recorded);
  if (found && query.newest) std::reverse(found->begin(), found->end());
  return found;
}

Result<std::vector<Entry>> Ledger::corrections_of(std::int64_t id) const {
  return entries(state_->store, "e.corrects = ? ORDER BY e.id", {id}, View::recorded);
}

Result<std::vector<Entry>> Ledger::units(const std::string& serial, const std::optional<std::string>& lot) const {
  return units_of(state_->store, serial, lot);
}

Result<std::vector<Entry>> Ledger::units_of_lot(const std::string& lot) const {
  return entries(state_->store,
                 "e.kind = 'unit' AND e.id IN (SELECT id FROM entry WHERE lot = ? UNION SELECT corrects FROM entry WHERE lot = ?"
                 " AND corrects IS NOT NULL) AND coalesce(c.lot, e.lot) = ? ORDER BY e.id",
                 {lot, lot, lot}, View::corrected);
}

Result<std::vector<Entry>> Ledger::units_with_digest(const std::string& sha256) const {
  return entries(state_->store, "e.kind = 'unit' AND e.id IN (SELECT entry FROM source WHERE sha256 = ?) ORDER BY e.id",
                 {sha256}, View::corrected);
}

Result<std::vector<Entry>> Ledger::lots(const std::optional<std::string>& supplier) const {
  // "<> 'unit'" is what the index was made with.
  if (!supplier) return entries(state_->store, "e.kind = 'lot' AND e.kind <> 'unit' ORDER BY e.id", {}, View::corrected);
  return entries(state_->store, "e.kind = 'lot' AND e.kind <> 'unit' AND coalesce(c.supplier, e.supplier) = ? ORDER BY e.id",
                 {*supplier}, View::corrected);
}

Result<std::vector<Entry>> Ledger::checks(const std::string& serial) const {
  return entries(state_->store, "e.kind = 'check' AND e.kind <> 'unit' AND coalesce(c.serial, e.serial) = ? ORDER BY e.id",
                 {serial}, View::corrected);
}

const std::string& Ledger::path() const { return state_->store.path(); }

}  // namespace coilassay
