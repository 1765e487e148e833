// The instruments of a station: one part in the fixture at a time, measured by all of them.
#pragma once

#include <cstddef>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "acquire/instrument/instrument.h"
#include "app/runs/unit_entry.h"
#include "base/result.h"
#include "inspection/part_sheet.h"

namespace coilassay {

/// Why a part was not measured although nothing is broken.
enum class Unmeasured {
  no_part,     // nothing is in the fixture
  contact,     // the fixture is shorted, or repeats differ too much
  no_reading,  // no readable reply, though asked again
};

struct PartMeasured {
  std::optional<Unmeasured> unmeasured;
  std::string why;            // of that
  std::vector<TestRun> runs;  // one for each reading of each profile
};

class StationBench {
 public:
  /// Reads the profiles. bad_sheet, wrong_unit: also for a symbol that cannot be judged, a profile without [reading], two with
  /// [verdict], one that names a test the sheet does not have.
  static Result<StationBench> make(const std::vector<std::string>& profiles, const PartSheet& sheet, const std::optional<std::string>& trace,
                                   UtcTime now, std::function<bool()> stopped, Remark remark);

  /// Opens every line. instrument.
  Result<void> open();
  /// Contact before, all readings, contact after; then what an earlier profile serves is taken out of the later ones' values.
  /// Fails only when an instrument is gone for good, or the user stopped.
  Result<PartMeasured> measure(const PartSheet& sheet);
  /// Whether a part is in the fixture, by the first profile that can tell; no_part for a reading that shows an open fixture.
  Result<bool> part_present();
  /// Drives the sorter; nothing without one.
  Result<void> sort(const std::optional<Verdict>& verdict);

  bool has_presence_rule() const;
  bool has_sorter() const;
  std::string identities() const;
  std::vector<EquipmentItem> equipment() const;
  /// Calibrations whose dates block.
  std::vector<EquipmentItem> blocking_equipment() const;

 private:
  struct Place {
    std::unique_ptr<Instrument> instrument;
    std::string test;          // of the part sheet
    std::size_t repeats = 1;
  };
  std::optional<PartMeasured> contact_fault(const Place& place, const std::vector<Reading>& readings) const;

  std::vector<Place> places_;
};

/// Values of later profiles that an earlier one serves already are taken out: a limit is served by the first profile that
/// yields its symbol at its conditions. `runs_of`: the runs of each profile, in order.
std::vector<TestRun> served_once(const PartSheet& sheet, std::vector<std::vector<TestRun>> runs_of);

}  // namespace coilassay
