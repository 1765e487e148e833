// What a Ledger holds; for the source files of this room.
#pragma once

#include "ledger/ledger.h"
#include "ledger/store.h"

namespace coilassay {

struct Ledger::State {
  mutable LedgerStore store;
};

}  // namespace coilassay
