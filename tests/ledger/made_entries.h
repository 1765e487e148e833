// Entries of a made-up lot, and processes that add them.
#pragma once

#include <string>
#include <vector>

#include "ledger/ledger.h"

namespace coilassay::test {

/// Attempt 1 at a unit of lot "0412" of part "drum-47", with two files.
EntryContent made_unit(const std::string& serial, const std::string& verdict = "pass");
EntryContent made_lot(const std::string& lot, const std::string& decision);

/// A new ledger of that many units, "0001", "0002" ...; the test fails when it cannot be made.
Ledger made_ledger(const std::string& path, int units);

/// What the sqlite3 shell says, messages included.
struct ShellEnd {
  int exit_code = -1;
  std::string text;
};
ShellEnd sqlite_shell(const std::string& path, const std::string& sql);

}  // namespace coilassay::test
