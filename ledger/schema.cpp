#include "ledger/schema.h"

#include <array>

namespace coilassay {

namespace {

// STRICT keeps types as they are declared. What is not said is '' (or 0), never NULL, but for the entry a correction points
// to. REPLACE would delete without the delete trigger noticing, hence the rules stand at the insert: an entry must be the
// next one, and follow the last.
constexpr std::array<SchemaItem, 13> kSchema{{
    {"table", "entry",
     "CREATE TABLE entry(id INTEGER PRIMARY KEY CHECK(id > 0),"
     " kind TEXT NOT NULL CHECK(kind IN ('unit', 'lot', 'check', 'correction')), time TEXT NOT NULL, part TEXT NOT NULL,"
     " revision TEXT NOT NULL, supplier TEXT NOT NULL, sheet_sha256 TEXT NOT NULL, lot TEXT NOT NULL, serial TEXT NOT NULL,"
     " attempt INTEGER NOT NULL, verdict TEXT NOT NULL, operator TEXT NOT NULL, instrument TEXT NOT NULL,"
     " program TEXT NOT NULL, corrects INTEGER REFERENCES entry(id), reason TEXT NOT NULL, body TEXT NOT NULL,"
     " previous TEXT NOT NULL UNIQUE, hash TEXT NOT NULL UNIQUE) STRICT"},
    {"table", "source",
     "CREATE TABLE source(entry INTEGER NOT NULL REFERENCES entry(id), position INTEGER NOT NULL, test TEXT NOT NULL,"
     " file TEXT NOT NULL, sha256 TEXT NOT NULL, PRIMARY KEY(entry, position)) STRICT, WITHOUT ROWID"},
    {"index", "entry_serial", "CREATE INDEX entry_serial ON entry(serial)"},
    {"index", "entry_lot", "CREATE INDEX entry_lot ON entry(lot)"},
    {"index", "entry_kind", "CREATE INDEX entry_kind ON entry(kind) WHERE kind <> 'unit'"},
    {"index", "entry_corrects", "CREATE INDEX entry_corrects ON entry(corrects) WHERE corrects IS NOT NULL"},
    {"index", "source_sha256", "CREATE INDEX source_sha256 ON source(sha256)"},
    {"trigger", "entry_keeps_what_it_says",
     "CREATE TRIGGER entry_keeps_what_it_says BEFORE UPDATE ON entry"
     " BEGIN SELECT RAISE(ABORT, 'a ledger is never changed: add a correction'); END"},
    {"trigger", "entry_stays",
     "CREATE TRIGGER entry_stays BEFORE DELETE ON entry"
     " BEGIN SELECT RAISE(ABORT, 'nothing is deleted from a ledger: add a correction'); END"},
    {"trigger", "entry_follows_the_last",
     "CREATE TRIGGER entry_follows_the_last BEFORE INSERT ON entry"
     " WHEN NEW.id IS NOT (SELECT coalesce(max(id), 0) + 1 FROM entry)"
     " OR NEW.previous IS NOT coalesce((SELECT hash FROM entry ORDER BY id DESC LIMIT 1),"
     " '0000000000000000000000000000000000000000000000000000000000000000')"
     " OR EXISTS(SELECT 1 FROM entry WHERE hash = NEW.hash)"
     " BEGIN SELECT RAISE(ABORT, 'a ledger only grows at its end'); END"},
    {"trigger", "source_keeps_what_it_says",
     "CREATE TRIGGER source_keeps_what_it_says BEFORE UPDATE ON source"
     " BEGIN SELECT RAISE(ABORT, 'a ledger is never changed: add a correction'); END"},
    {"trigger", "source_stays",
     "CREATE TRIGGER source_stays BEFORE DELETE ON source"
     " BEGIN SELECT RAISE(ABORT, 'nothing is deleted from a ledger: add a correction'); END"},
    {"trigger", "source_follows_its_entry",
     "CREATE TRIGGER source_follows_its_entry BEFORE INSERT ON source"
     " WHEN NEW.entry IS NOT (SELECT max(id) FROM entry)"
     " OR NEW.position IS NOT (SELECT count(*) FROM source WHERE entry = NEW.entry)"
     " BEGIN SELECT RAISE(ABORT, 'a ledger only grows at its end'); END"},
}};

}  // namespace

std::span<const SchemaItem> ledger_schema() { return kSchema; }

}  // namespace coilassay
