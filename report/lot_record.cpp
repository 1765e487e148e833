#include "report/lot_record.h"

namespace coilassay {

std::string LotRecord::report_number() const {
  return ledger && ledger->entry ? lot + "-" + std::to_string(*ledger->entry) : lot;
}

}  // namespace coilassay
