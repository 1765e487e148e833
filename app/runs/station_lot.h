// What a station knows of its lot: every attempt at every unit, as the ledger has it.
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "app/runs/lot_past.h"
#include "app/runs/station_run.h"
#include "ledger/ledger.h"

namespace coilassay {

class StationLot {
 public:
  /// Opens the ledger, made when it is not there, and takes up what it holds of the lot. ledger.
  static Result<StationLot> open(const StationJob& job, PartSheet sheet, UtcTime now);

  struct Known {
    std::vector<UnitVerdict> attempts;     // by this sheet
    std::uint64_t last_attempt = 0;        // highest number given, by whatever sheet
    std::optional<std::int64_t> entry;     // of the newest attempt
    bool from_ledger = false;              // of an earlier run
    std::vector<EntrySource> sources;
  };
  /// nullptr when there is no attempt at it.
  const Known* find(const std::string& serial) const;
  /// As many units were measured as the lot was said to have.
  bool is_full() const { return lot_size_ && order_.size() >= *lot_size_; }
  std::uint64_t lot_size() const { return lot_size_.value_or(0); }
  /// Attempts of this sheet that gave a result and count.
  std::uint64_t counted(const std::string& serial) const;

  /// Stores an attempt and brings it to the disk; only then it is known here.
  Result<UnitVerdict> store(const std::string& serial, const std::vector<TestRun>& runs, const std::string& reason, UtcTime now,
                            const std::string& instrument);
  /// A correction that makes the newest attempt undecided.
  Result<void> set_aside(const std::string& serial, UtcTime now, const std::string& instrument);
  UnitVerdict standing_of(const std::string& serial) const;
  /// The check standard was measured.
  Result<void> store_check(const Estimate& value, const std::vector<TestRun>& runs, UtcTime now, const std::string& instrument);
  Result<CheckStatus> check_state(UtcTime now, CheckChart* chart = nullptr) const;
  /// A lot other than this one that has this serial.
  Result<std::optional<std::string>> other_lot_of(const std::string& serial) const;

  Result<LedgerHead> head() const { return ledger_.head(); }
  StationProgress progress() const;
  const PartSheet& sheet() const { return sheet_; }
  /// Severity, and the plan when the lot's size is known. Discontinued: why, and no plan.
  const NextSeverity& severity() const { return severity_; }
  const std::optional<SamplingPlan>& plan() const { return plan_; }
  /// Decides and stores; the record of the whole lot.
  Result<LotRecord> close(const std::string& instrument, const std::vector<EquipmentItem>& equipment, std::vector<Finding> findings, UtcTime now);

 private:
  StationLot(Ledger ledger, PartSheet sheet) : ledger_(std::move(ledger)), sheet_(std::move(sheet)) {}
  InspectionSetting setting(UtcTime now, const std::string& instrument) const;
  void tell_cautions(const std::vector<TestRun>& runs);

  Ledger ledger_;
  PartSheet sheet_;
  std::string ledger_path_, lot_, operator_;
  std::optional<std::uint64_t> lot_size_;
  std::vector<LotHistory> history_;
  NextSeverity severity_;
  std::optional<SamplingPlan> plan_;
  std::map<std::string, Known> units_;
  std::vector<std::string> order_;         // serials as they were first measured
  std::vector<LotTestRecord> tests_;
  std::vector<Caution> cautions_;
};

}  // namespace coilassay
