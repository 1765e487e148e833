// The durable record of units and lots: an SQLite file to which entries can only be added.
#pragma once

#include <cstdint>
#include <memory>
#include <optional>
#include <span>
#include <string>
#include <vector>

#include "base/progress.h"
#include "base/result.h"
#include "ledger/entry.h"

namespace coilassay {

inline constexpr int kLedgerWait = 10;  // s

enum class LedgerMode {
  create,     // for adding; made when it is not there
  append,     // for adding; must be there
  read_only,  // for looking; works in a folder that may not be written
};

struct LedgerRequest {
  std::string path;
  LedgerMode mode = LedgerMode::read_only;
  /// A ledger holds one part. When given, one that holds another is refused; with create or append the first entry
  /// decides in any case.
  std::string part = {};
  int wait_s = kLedgerWait;  // for other programs that hold the file
};

/// Largest number of entries that are stored, and synced, together.
inline constexpr std::size_t kLargestBatch = 25;

/// Where the chain ends: goes into every report, so that a tail that was cut off shows.
struct LedgerHead {
  std::int64_t id = 0;  // 0: no entry yet
  std::string hash{kFirstPrevious};
};

struct EntryQuery {
  std::optional<EntryKind> kind = {};
  std::optional<std::string> lot = {}, serial = {}, revision = {}, supplier = {};
  std::optional<std::string> sha256 = {};        // of any of its sources
  std::optional<std::int64_t> from = {}, to = {};  // ids, both included
  std::optional<std::size_t> newest = {};        // only so many, the newest; the order stays that of the ids
};

/// What `verify` found wrong, in plain words.
struct LedgerFault {
  std::int64_t id = 0;  // of the entry; 0: the file as a whole
  std::string what;
};

struct LedgerCheck {
  std::int64_t entries = 0;
  LedgerHead head;
  std::string part;
  std::vector<LedgerFault> faults;  // at most kMostFaults
  bool more_faults = false;
  bool holds() const { return faults.empty(); }
};
inline constexpr std::size_t kMostFaults = 20;

/// Every failure is Problem::ledger with one sentence: not there, not a ledger, written by a newer version, damaged, locked
/// by another program, read-only, full disk, another part. After a failed `append` nothing of the batch is stored, and
/// the object goes on working.
///
/// Several processes may add to one file; each batch is one transaction that holds the file alone, waiting up to
/// `wait_s` for the others. A ledger in use by one thread only.
class Ledger {
 public:
  static Result<Ledger> open(const LedgerRequest& request);
  ~Ledger();
  Ledger(Ledger&&) noexcept;
  Ledger& operator=(Ledger&&) noexcept;

  /// Adds 1 .. kLargestBatch entries; when it returns they are on the disk. Refused besides: a unit whose attempt is there
  /// already (as when another station was quicker: ask `units` again), a correction of an entry that does not exist or
  /// is itself a correction.
  Result<std::vector<Entry>> append(std::span<const EntryContent> contents);
  Result<Entry> append(const EntryContent& content);

  Result<LedgerHead> head() const;
  /// Of the first entry; empty when there is none yet.
  Result<std::string> part() const;
  /// As it was recorded. usage when there is none of that number.
  Result<Entry> entry(std::int64_t id) const;
  /// The entry whose hash begins so; none, or the first of several.
  Result<std::optional<Entry>> entry_of_hash(const std::string& beginning) const;
  /// As they were recorded, in the order of their ids.
  Result<std::vector<Entry>> find(const EntryQuery& query) const;
  /// Corrections that point to an entry, oldest first.
  Result<std::vector<Entry>> corrections_of(std::int64_t id) const;

  /// Entries as they stand today: serial, lot, supplier and verdict are those of the newest correction, `corrected_by` says
  /// so; id, body and hash are those of the original.
  /// All attempts at one unit (kind unit), oldest first; over all lots when `lot` is absent.
  Result<std::vector<Entry>> units(const std::string& serial, const std::optional<std::string>& lot = {}) const;
  Result<std::vector<Entry>> units_of_lot(const std::string& lot) const;
  /// Units any of whose files had this digest: the same capture, perhaps under two serials.
  Result<std::vector<Entry>> units_with_digest(const std::string& sha256) const;
  /// Decisions on lots of one supplier (of every supplier when absent), oldest first: for switching.
  Result<std::vector<Entry>> lots(const std::optional<std::string>& supplier = {}) const;
  /// Check standards of one serial, oldest first.
  Result<std::vector<Entry>> checks(const std::string& serial) const;

  /// Reads everything: the chain, that columns and sources say what the bodies say, that the rules against changing are in
  /// place, and the file's own structure. A fault is no failure of the call.
  Result<LedgerCheck> verify(Progress* progress = nullptr) const;

  const std::string& path() const;

 private:
  struct State;
  explicit Ledger(std::unique_ptr<State> state);
  std::unique_ptr<State> state_;
};

}  // namespace coilassay
