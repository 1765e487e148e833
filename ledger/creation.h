// A new ledger appears whole or not at all.
#pragma once

#include <string>

#include "base/result.h"
#include "ledger/store.h"

namespace coilassay {

/// Makes an empty ledger, readable by owner and group (0640 less the umask), when there is none of that name or an empty file.
/// One that was made meanwhile by another program is as good.
Result<void> make_ledger(const std::string& path, int wait_s);

/// Whether the file is a ledger this version can use. `adding`: also that nobody touched its rules.
Result<void> check_ledger(LedgerStore& store, bool adding);

/// What is missing in the file, or does not belong there, a sentence each; empty when all is as it was made.
Result<std::vector<std::string>> schema_faults(LedgerStore& store);

}  // namespace coilassay
