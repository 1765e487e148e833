// One entry of a ledger: what was recorded, and its place in the chain.
#pragma once

#include <array>
#include <cstdint>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/result.h"
#include "base/utc_time.h"

namespace coilassay {

enum class EntryKind {
  unit,        // one attempt at one unit, with its verdict
  lot,         // the decision on a lot
  check,       // a check standard was measured
  correction,  // says what an earlier entry should have said; that one stays as it is
};

std::string_view name(EntryKind kind);  // "unit", "lot", "check", "correction"
std::optional<EntryKind> entry_kind(std::string_view name);
inline constexpr std::array kEntryKinds{EntryKind::unit, EntryKind::lot, EntryKind::check, EntryKind::correction};

/// A file that was measured.
struct EntrySource {
  std::string test;    // "ramp"; empty when it is none of a test
  std::string file;    // as the run found it
  std::string sha256;  // 64 hexadecimal digits
  friend bool operator==(const EntrySource&, const EntrySource&) = default;
};

/// What is recorded. Texts are valid UTF-8 without zero bytes; empty means "does not apply" and is null in the body.
struct EntryContent {
  EntryKind kind = EntryKind::unit;
  UtcTime time{};
  std::string part, revision, supplier;
  std::string sheet_sha256;     // of the part sheet
  std::string lot;
  std::string serial;           // of the unit or the check standard
  int attempt = 0;              // of a unit, from 1; else 0
  std::string verdict;          // unit: pass, fail, undecided, not_comparable; lot: accept, reject, undecided
  std::string operator_name, instrument, program;
  std::vector<EntrySource> sources;
  std::optional<std::int64_t> corrects;  // of a correction: the entry it is about
  std::string reason;                    // of a correction, or of another attempt
  /// A JSON object with everything else: limits, conditions, corrections, settings, plan. Its members stand in the body
  /// behind those above and may not repeat their names (`kEntryMembers`). Empty is the same as "{}".
  std::string details;
};

/// Names that `details` may not use: those of the fields of EntryContent.
inline constexpr std::array<std::string_view, 22> kEntryMembers{
    "schema", "kind", "time", "part", "revision", "supplier", "sheet_sha256", "lot", "serial", "attempt", "verdict",
    "operator", "instrument", "program", "sources", "corrects", "reason",
    // and those a document adds to a stored entry
    "id", "previous", "hash", "body", "corrected_by"};

/// A content that is stored.
struct Entry {
  std::int64_t id = 0;  // 1, 2, 3 ... without gaps
  EntryContent content;
  std::string body;      // the exact JSON text: one object on one line; every field above is in it
  std::string previous;  // hash of the entry before; kFirstPrevious for the first
  std::string hash;      // SHA-256 of previous, a line feed and body
  std::optional<std::int64_t> corrected_by;  // the newest correction that points here
};

/// What stands before the first entry.
inline constexpr std::string_view kFirstPrevious = "0000000000000000000000000000000000000000000000000000000000000000";

/// The JSON text of a content, members in a fixed order, numbers of `details` kept to the last digit.
/// ledger: text that is no UTF-8 or holds a zero byte, details that are no JSON object or repeat a name of the fields, a
/// correction without reason or entry, a digest that is none.
Result<std::string> body_of(const EntryContent& content);

/// The way back. ledger when the body is not one that `body_of` makes.
Result<EntryContent> content_of(std::string_view body);

/// Hash of an entry: 64 lower-case hexadecimal digits.
std::string entry_hash(std::string_view previous, std::string_view body);

}  // namespace coilassay
