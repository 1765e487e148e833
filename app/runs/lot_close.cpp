#include "app/runs/lot_close.h"

#include <cassert>

namespace coilassay {

Result<void> close_lot(LotRecord& record, const std::vector<LotHistory>& history, Ledger* ledger, const std::string& ledger_path,
                       const InspectionSetting& setting) {
  assert(record.plan);
  std::vector<UnitVerdict> verdicts, all;
  LotOutcome outcome;
  for (LotUnitRecord& unit : record.units) {
    unit.in_sample = false;
    all.push_back(unit.verdict);
  }
  for (const std::size_t i : choose_sample(*record.plan, record.units.size())) {
    record.units[i].in_sample = true;
    verdicts.push_back(record.units[i].verdict);
    if (record.units[i].entry) outcome.units.push_back(*record.units[i].entry);
  }
  record.decision = decide_lot(record.sheet, *record.plan, verdicts);
  record.statistics = lot_values(all);
  std::vector<LotHistory> with_this = history;
  if (record.decision.decision != LotResult::undecided) {
    with_this.push_back({record.when, record.decision.decision, record.plan->severity, record.decision.between_accept_and_reject});
  }
  record.next = next_severity(record.sheet.sampling, with_this);
  if (ledger == nullptr) return {};
  outcome.plan = *record.plan;
  outcome.decision = record.decision;
  outcome.next = *record.next;
  outcome.lot_size = record.lot_size;
  const Result<StoredDecision> stored = store_decision(*ledger, outcome, setting);
  if (!stored) return failure(stored);
  const Result<LedgerHead> head = ledger->head();
  if (!head) return failure(head);
  LotLedger place{ledger_path, 0, stored->entry.id, head->hash, stored->entry.id, stored->replaces};
  for (const LotUnitRecord& unit : record.units) {
    if (unit.entry && (place.first == 0 || *unit.entry < place.first)) place.first = *unit.entry;
  }
  record.ledger = std::move(place);
  return {};
}

}  // namespace coilassay
