#include "app/runs/station_bench.h"

#include <algorithm>
#include <cmath>

#include "acquire/instrument/open_stream.h"
#include "analysis/reading.h"
#include "app/runs/spared_files.h"
#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

/// The test of the sheet a profile's readings belong to: the one it names, else the first of the kind, else the kind itself.
Result<TestPlan> test_of(const InstrumentProfile& profile, const PartSheet& sheet) {
  TestPlan plan;
  plan.name = plan.kind = "reading";
  if (!profile.reading->test.empty()) {
    const TestPlan* named = sheet.find_test(profile.reading->test);
    if (named != nullptr && named->kind == "reading") return *named;
    return failure(Problem::bad_sheet, profile.reading->test_place,
                   "the part sheet has no test '" + shown(profile.reading->test, 40) + "' of the kind reading", "write [test." + shown(profile.reading->test, 40) + "] with kind = \"reading\" in it, or leave this out");
  }
  for (const TestPlan& each : sheet.tests) {
    if (each.kind == "reading") return each;
  }
  return plan;
}

Measurement measured(const Reading& reading, const Instrument& instrument) {
  Measurement m = measure_reading(reading, instrument.profile(), instrument.identity(), instrument.settings());
  const auto& calibration = instrument.profile().calibration;
  if (calibration) {
    if (m.equipment.empty()) m.equipment.push_back({});
    EquipmentItem& item = m.equipment.front();
    if (item.id.empty()) item.id = calibration->id;
    item.certificate = calibration->certificate;
    item.calibrated = calibration->calibrated;
    item.due = calibration->due;
  }
  return m;
}

std::vector<TestedUnit> as_tested(const std::vector<TestRun>& runs) {
  std::vector<TestedUnit> tested;
  for (const TestRun& run : runs) tested.push_back({run.test, run.measurement});
  return tested;
}

}  // namespace

std::vector<TestRun> served_once(const PartSheet& sheet, std::vector<std::vector<TestRun>> runs_of) {
  // Which profile serves each limit.
  std::vector<std::optional<std::size_t>> server(sheet.limits.size());
  for (std::size_t l = 0; l < sheet.limits.size(); ++l) {
    for (std::size_t p = 0; p < runs_of.size() && !server[l]; ++p) {
      if (judge_limit(sheet.limits[l], sheet, as_tested(runs_of[p])).value) server[l] = p;
    }
  }
  std::vector<TestRun> all;
  for (std::size_t p = 0; p < runs_of.size(); ++p) {
    for (TestRun& run : runs_of[p]) {
      std::erase_if(run.measurement.estimates, [&](const Estimate& estimate) {
        bool of_a_limit = false, serves = false;
        for (std::size_t l = 0; l < sheet.limits.size(); ++l) {
          if (sheet.limits[l].quantity != estimate.symbol || !server[l]) continue;
          of_a_limit = true;
          serves = serves || *server[l] == p;
        }
        return of_a_limit && !serves;
      });
      all.push_back(std::move(run));
    }
  }
  return all;
}

Result<StationBench> StationBench::make(const std::vector<std::string>& profiles, const PartSheet& sheet, const std::optional<std::string>& trace,
                                        UtcTime now, std::function<bool()> stopped, Remark remark) {
  StationBench bench;
  std::size_t sorters = 0, number = 0;
  for (const std::string& path : profiles) {
    auto profile = read_instrument_profile(path);
    if (!profile) return failure(profile);
    if (auto fine = check_profile_symbols(*profile, true); !fine) return failure(fine);
    if (!profile->reading) {
      return failure(Problem::bad_sheet, path, "the profile has no [reading], and a station asks for one per unit", "say what is asked and which fields come: [reading] ask, fields");
    }
    if (profile->verdict && ++sorters > 1) {
      return failure(Problem::bad_sheet, path, "a second profile has [verdict], and there is one sorter", "leave it out of one of them");
    }
    auto plan = test_of(*profile, sheet);
    if (!plan) return failure(plan);
    std::shared_ptr<ByteLog> log;
    ++number;
    if (trace) {
      const std::string file = profiles.size() == 1 ? *trace : *trace + "-" + std::to_string(number);
      // A recorded session that is played is read while the log is written.
      if (auto spared = spare_files(std::vector<GivenFile>{{"--trace", file}}, std::vector<GivenFile>{{"", profile->link.port}}); !spared) return failure(spared);
      auto begun = ByteLog::begin(file, "coilassay trace of " + path + ", begun " + to_text(now));
      if (!begun) return failure(begun);
      log = *begun;
    }
    const StreamOpener opener = opener_of(profile->link, log);
    bench.places_.push_back({std::make_unique<Instrument>(std::move(*profile), opener, stopped, remark), plan->name, plan->repeats});
  }
  return bench;
}

Result<void> StationBench::open() {
  for (Place& place : places_) {
    if (auto opened = place.instrument->open(); !opened) return opened;
  }
  return {};
}

std::optional<PartMeasured> StationBench::contact_fault(const Place& place, const std::vector<Reading>& readings) const {
  const auto& present = place.instrument->profile().present;
  if (!present) return std::nullopt;
  const auto fault = [](Unmeasured what, std::string why) { return PartMeasured{what, std::move(why), {}}; };
  for (const auto& [symbol, limit] : present->open_above) {
    for (const Reading& reading : readings) {
      const ReadingValue* value = reading.find(symbol);
      if (value == nullptr || !reading.status_ok) continue;
      // Over range is what an empty fixture reads like.
      if (value->state == ValueState::over_range) return fault(Unmeasured::no_part, symbol + " is over range, as of an empty fixture");
      if (value->value > limit) return fault(Unmeasured::no_part, symbol + " is " + to_text(value->value, value->unit) + ", as of an empty fixture");
    }
  }
  for (const auto& [symbol, limit] : present->short_below) {
    for (const Reading& reading : readings) {
      const ReadingValue* value = reading.find(symbol);
      if (value != nullptr && reading.status_ok && value->value < limit) {
        return fault(Unmeasured::contact, symbol + " is " + to_text(value->value, value->unit) + ", as of a shorted fixture");
      }
    }
  }
  for (const auto& [symbol, share] : present->jitter) {
    double least = HUGE_VAL, most = -HUGE_VAL;
    for (const Reading& reading : readings) {
      const ReadingValue* value = reading.find(symbol);
      if (value == nullptr || !std::isfinite(value->value)) continue;
      least = std::min(least, value->value);
      most = std::max(most, value->value);
    }
    if (most - least > share * std::max(std::abs(most), std::abs(least))) {
      return fault(Unmeasured::contact, "repeats of " + symbol + " differ by " + to_percent_text((most - least) / std::abs(most)) + ", as with a poor contact");
    }
  }
  return std::nullopt;
}

Result<bool> StationBench::part_present() {
  for (Place& place : places_) {
    const auto& present = place.instrument->profile().present;
    if (!present) continue;
    if (present->ask) return place.instrument->part_present();
    if (present->open_above.empty()) continue;
    auto reading = place.instrument->read();
    if (!reading) return failure(reading);
    const auto fault = contact_fault(place, {*reading});
    return !fault || fault->unmeasured != Unmeasured::no_part;
  }
  return true;
}

Result<PartMeasured> StationBench::measure(const PartSheet& sheet) {
  const auto asked_presence = [&]() -> Result<bool> {
    for (Place& place : places_) {
      auto there = place.instrument->part_present();
      if (!there || !*there) return there;
    }
    return true;
  };
  // What is not broken but unreadable costs this reading, not the station.
  const auto unreadable = [&](const Error& error) -> Result<PartMeasured> {
    const bool gone = std::any_of(places_.begin(), places_.end(), [](const Place& place) { return place.instrument->is_gone(); });
    if (gone || error.problem == Problem::interrupted) return tl::make_unexpected(error);
    return PartMeasured{Unmeasured::no_reading, error.finding, {}};
  };
  auto there = asked_presence();
  if (!there) return unreadable(there.error());
  if (!*there) return PartMeasured{Unmeasured::no_part, "the instrument says that nothing is in the fixture", {}};

  std::vector<std::vector<TestRun>> runs_of;
  for (Place& place : places_) {
    std::vector<Reading> readings;
    for (std::size_t n = 0; n < place.repeats; ++n) {
      auto reading = place.instrument->read();
      if (!reading) return unreadable(reading.error());
      readings.push_back(std::move(*reading));
    }
    if (auto fault = contact_fault(place, readings)) return std::move(*fault);
    std::vector<TestRun> runs;
    for (const Reading& reading : readings) runs.push_back({place.test, "reading", std::nullopt, "", measured(reading, *place.instrument)});
    runs_of.push_back(std::move(runs));
  }
  there = asked_presence();
  if (!there) return unreadable(there.error());
  if (!*there) return PartMeasured{Unmeasured::contact, "the part was taken out while it was measured", {}};
  PartMeasured result;
  result.runs = served_once(sheet, std::move(runs_of));
  return result;
}

Result<void> StationBench::sort(const std::optional<Verdict>& verdict) {
  for (Place& place : places_) {
    const auto& commands = place.instrument->profile().verdict;
    if (!commands) continue;
    const std::string& command = verdict == Verdict::pass ? commands->pass : verdict == Verdict::fail ? commands->fail : commands->otherwise;
    return place.instrument->show_verdict(command);
  }
  return {};
}

bool StationBench::has_presence_rule() const {
  return std::any_of(places_.begin(), places_.end(), [](const Place& place) {
    const auto& present = place.instrument->profile().present;
    return present && (present->ask || !present->open_above.empty());
  });
}

bool StationBench::has_sorter() const {
  return std::any_of(places_.begin(), places_.end(), [](const Place& place) { return place.instrument->profile().verdict.has_value(); });
}

std::string StationBench::identities() const {
  std::string all;
  for (const Place& place : places_) {
    const std::string& identity = place.instrument->identity().empty() ? place.instrument->profile().link.port : place.instrument->identity();
    all += (all.empty() ? "" : " + ") + identity;
  }
  return all;
}

std::vector<EquipmentItem> StationBench::equipment() const {
  std::vector<EquipmentItem> items;
  for (const Place& place : places_) {
    const auto& calibration = place.instrument->profile().calibration;
    EquipmentItem item;
    if (calibration) item = {calibration->id, calibration->certificate, calibration->calibrated, calibration->due};
    if (item.id.empty()) item.id = place.instrument->identity().empty() ? place.instrument->profile().link.port : place.instrument->identity();
    items.push_back(std::move(item));
  }
  return items;
}

std::vector<EquipmentItem> StationBench::blocking_equipment() const {
  std::vector<EquipmentItem> items = equipment();
  for (std::size_t i = places_.size(); i-- > 0;) {
    const auto& calibration = places_[i].instrument->profile().calibration;
    if (!calibration || !calibration->overdue_blocks) items.erase(items.begin() + static_cast<long>(i));
  }
  return items;
}

}  // namespace coilassay
