#include "app/runs/station_run.h"

#include <algorithm>
#include <charconv>
#include <chrono>

#include "acquire/instrument/pattern.h"
#include "app/runs/check_run.h"
#include "app/runs/station_bench.h"
#include "app/runs/station_lot.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "inspection/readiness.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

using Clock = std::chrono::steady_clock;
using Kind = StationNotice::Kind;

constexpr std::size_t kLongestSerial = 100;
constexpr std::chrono::milliseconds kTurn{50};         // between looks at the clock while waiting for a line
constexpr std::chrono::milliseconds kPresenceTurn{200};  // between looks into the fixture

/// What stops a line from being a serial number; empty when nothing does.
std::string trouble_with_serial(const std::string& line) {
  if (line.find('\0') != std::string::npos) return "this line is longer than any serial number";
  if (shown(line, kLongestSerial) != line) return "control characters, broken text or more than 100 characters are no serial number";
  return {};
}

class Station {
 public:
  Station(const StationJob& job, StationLot lot, StationBench bench, std::optional<Pattern> serials)
      : job_(job), lot_(std::move(lot)), bench_(std::move(bench)), serials_(std::move(serials)) {}

  Result<StationEnd> run() {
    if (auto opened = bench_.open(); !opened) return end_broken(opened.error());
    job_.view->begun(lot_.progress());
    if (lot_.severity().severity == Severity105::discontinued) {
      notice(Kind::blocked, "", "inspection of this part from this supplier is discontinued: " + lot_.severity().why);
      return end();
    }
    tell_state();
    return job_.count_serials ? by_presence() : by_lines();
  }

 private:
  using Step = std::optional<Error>;  // what is gone for good

  Result<StationEnd> by_lines() {
    for (std::string line; !quit_ && !stopped();) {
      const LineSource::Came came = job_.input->next(line, kTurn);
      if (came == LineSource::Came::ended) break;
      if (came == LineSource::Came::cut_end) {
        notice(Kind::refused, shown(line, 60), "the input ended in the middle of this line: it is not taken");
        break;
      }
      if (came == LineSource::Came::nothing) continue;
      if (const Step broke = take_line(line)) return end_broken(*broke);
    }
    return end();
  }

  /// Without a scanner: a part that is put in gets the next number; it must be taken out before the next one counts.
  Result<StationEnd> by_presence() {
    bool was_there = true;  // what lies there at the start is not known to be new
    for (std::string line; !quit_ && !stopped();) {
      const LineSource::Came came = job_.input->next(line, kPresenceTurn);
      if (came == LineSource::Came::ended || came == LineSource::Came::cut_end) break;
      if (came == LineSource::Came::line && line.starts_with(':')) {
        if (const Step broke = take_line(line)) return end_broken(*broke);
        continue;
      }
      if (came == LineSource::Came::line && !line.empty()) notice(Kind::refused, shown(line, 60), "serial numbers are counted here; only commands are taken");
      const auto there = bench_.part_present();
      if (!there) {
        if (there.error().problem == Problem::interrupted) break;
        return end_broken(there.error());
      }
      if (*there && !was_there && lot_.is_full()) {
        tell_full("");
      } else if (*there && !was_there) {
        if (const Step broke = measure(next_number(), "")) return end_broken(*broke);
      }
      was_there = *there;
    }
    return end();
  }

  std::string next_number() {
    std::string serial;
    do serial = std::to_string(++number_);
    while (lot_.find(serial) != nullptr);
    return serial;
  }

  Step take_line(const std::string& typed) {
    std::string line = typed;
    while (!line.empty() && (line.back() == ' ' || line.back() == '\t')) line.pop_back();
    line.erase(0, line.find_first_not_of(" \t") == std::string::npos ? line.size() : line.find_first_not_of(" \t"));
    if (line.empty()) return std::nullopt;
    if (line.front() == ':') return take_command(line);
    if (const std::string trouble = trouble_with_serial(line); !trouble.empty()) {
      notice(Kind::refused, shown(line, 60), trouble);
      return std::nullopt;
    }
    const auto& standard = lot_.sheet().check_standard;
    if (standard && line == standard->serial) return check();
    if (serials_ && !serials_->is_all_of(line)) {
      notice(Kind::refused, shown(line, 60), "this is no serial number of the part: the sheet asks for " + shown(lot_.sheet().serial_pattern, 60));
      return std::nullopt;
    }
    if (lot_.find(line) != nullptr) {
      current_ = line;
      const UnitVerdict stands = lot_.standing_of(line);
      notice(Kind::duplicate, shown(line, 60), "it was inspected already: " + std::string(name(stands.verdict)) + "; :again REASON measures it once more" + reasons());
      return std::nullopt;
    }
    if (lot_.is_full()) {
      tell_full(shown(line, 60));
      return std::nullopt;
    }
    const auto other = lot_.other_lot_of(line);
    if (!other) return other.error();
    if (*other) notice(Kind::told, shown(line, 60), "this serial was inspected in lot " + shown(**other, 60) + " as well: is it mistyped?");
    return measure(line, "");
  }

  /// One more would make another lot of it, with another plan.
  void tell_full(const std::string& serial) {
    const std::uint64_t size = lot_.lot_size();
    notice(Kind::refused, serial,
           "the lot of " + std::to_string(size) + (size == 1 ? " unit" : " units") +
               " is complete: this one is not measured. Is it of another lot, or was --lot-size too small?");
  }

  std::string reasons() const {
    std::string list;
    const auto& all = lot_.sheet().retest.reasons;
    for (std::size_t i = 0; i < all.size(); ++i) list += (i == 0 ? " (" : ", ") + std::to_string(i + 1) + " " + shown(all[i], 60);
    return list.empty() ? list : list + ")";
  }

  Step take_command(const std::string& line) {
    const std::size_t blank = std::min(line.find(' '), line.size());
    const std::string word = line.substr(1, blank - 1);
    const std::string rest = blank < line.size() ? line.substr(blank + 1) : "";
    if (word == "quit" || word == "q") {
      quit_ = true;
    } else if (word == "check") {
      return check();
    } else if (word == "aside") {
      return aside();
    } else if (word == "again") {
      return again(rest);
    } else {
      notice(Kind::refused, shown(line, 60), "no such command: there are :again REASON, :aside, :check and :quit");
    }
    return std::nullopt;
  }

  Step again(const std::string& words) {
    if (current_.empty()) {
      notice(Kind::refused, "", "there is no unit to measure again: scan it first");
      return std::nullopt;
    }
    std::string reason = words;
    const auto& listed = lot_.sheet().retest.reasons;
    std::size_t index = 0;
    const auto [end, trouble] = std::from_chars(words.data(), words.data() + words.size(), index);
    const bool number = trouble == std::errc() && end == words.data() + words.size();
    if (number && index >= 1 && index <= listed.size()) reason = listed[index - 1];
    else if (number || words.empty()) {
      notice(Kind::refused, shown(current_, 60), listed.empty() ? "a retest needs a reason: :again WORDS" : "a retest needs the number of a reason:" + reasons());
      return std::nullopt;
    }
    if (lot_.counted(current_) >= lot_.sheet().retest.attempts) {
      const std::uint64_t allowed = lot_.sheet().retest.attempts;
      notice(Kind::refused, shown(current_, 60), "it has had the " + std::to_string(allowed) + (allowed == 1 ? " attempt" : " attempts") + " that count: the sheet allows no more");
      return std::nullopt;
    }
    return measure(current_, shown(reason, 200));
  }

  Step aside() {
    if (current_.empty() || lot_.find(current_) == nullptr) {
      notice(Kind::refused, "", "there is no unit to set aside: scan one first");
      return std::nullopt;
    }
    if (auto done = lot_.set_aside(current_, job_.clock(), bench_.identities()); !done) return done.error();
    notice(Kind::set_aside, shown(current_, 60), "set aside: it counts as undecided");
    return std::nullopt;
  }

  /// Whether parts may be judged now; says why not.
  Result<bool> may_judge() {
    const UtcTime now = job_.clock();
    const std::chrono::year_month_day today(std::chrono::floor<std::chrono::days>(now));
    const auto overdue = overdue_calibrations(bench_.blocking_equipment(), today);
    if (!overdue.empty()) {
      notice(Kind::blocked, "", overdue.front().message + ". No part is judged with it; [calibration] in the profile says so");
      return false;
    }
    if (!lot_.sheet().check_standard) return true;
    const auto state = lot_.check_state(now);
    if (!state) return failure(state);
    if (state->may_inspect) return true;
    notice(Kind::blocked, "", state->why + ". Put it in and type :check");
    return false;
  }

  /// Said once at the start, so that nobody learns of it from the first part.
  void tell_state() {
    const std::chrono::year_month_day today(std::chrono::floor<std::chrono::days>(job_.clock()));
    for (Finding& each : overdue_calibrations(bench_.equipment(), today)) {
      notice(Kind::told, "", each.message);
      findings_.push_back(std::move(each));
    }
    if (!lot_.sheet().check_standard) return;
    if (const auto state = lot_.check_state(job_.clock()); state && state->state != CheckState::good) notice(Kind::told, "", state->why + ": put it in and type :check");
  }

  Step check() {
    const auto& standard = lot_.sheet().check_standard;
    if (!standard) {
      notice(Kind::refused, "", "the part sheet names no check standard");
      return std::nullopt;
    }
    auto measured = bench_.measure(lot_.sheet());
    if (!measured) return interrupted(measured.error());
    if (told_unmeasured(*measured, standard->serial)) return std::nullopt;
    const auto value = check_value(lot_.sheet(), measured->runs);
    if (!value) {
      notice(Kind::no_reading, shown(standard->serial, 60), "the reading of the check standard gave no " + standard->quantity);
      return std::nullopt;
    }
    if (auto stored = lot_.store_check(*value, measured->runs, job_.clock(), bench_.identities()); !stored) return stored.error();
    const auto state = lot_.check_state(job_.clock());
    if (!state) return state.error();
    notice(state->may_inspect ? Kind::checked : Kind::blocked, shown(standard->serial, 60), to_text(value->quantity.value, value->quantity.unit) + ": " + state->why);
    return std::nullopt;
  }

  bool told_unmeasured(const PartMeasured& measured, const std::string& serial) {
    if (!measured.unmeasured) return false;
    const Kind kind = *measured.unmeasured == Unmeasured::no_part   ? Kind::no_part
                      : *measured.unmeasured == Unmeasured::contact ? Kind::contact
                                                                    : Kind::no_reading;
    notice(kind, shown(serial, 60), shown(measured.why, 300) + "; nothing is recorded");
    return true;
  }

  /// A stop by the user is no failure.
  Step interrupted(const Error& error) {
    if (error.problem != Problem::interrupted) return error;
    quit_ = true;
    return std::nullopt;
  }

  Step measure(const std::string& serial, const std::string& reason) {
    const auto begun = Clock::now();
    const auto may = may_judge();
    if (!may) return may.error();
    if (!*may) return std::nullopt;
    auto measured = bench_.measure(lot_.sheet());
    if (!measured) {
      static_cast<void>(bench_.sort(std::nullopt));  // gone or not: a part of which nothing is known must not look good
      return interrupted(measured.error());
    }
    if (told_unmeasured(*measured, serial)) {
      if (measured->unmeasured == Unmeasured::no_part) return std::nullopt;
      return sorted(std::nullopt);
    }
    auto stored = lot_.store(serial, measured->runs, reason, job_.clock(), bench_.identities());
    if (!stored) {
      static_cast<void>(bench_.sort(std::nullopt));
      return stored.error();
    }
    current_ = serial;
    const UnitVerdict stands = lot_.standing_of(serial);
    job_.view->unit({*stored, stands, lot_.find(serial)->entry, std::chrono::duration<double>(Clock::now() - begun).count()}, lot_.progress());
    return sorted(stands.verdict);
  }

  Step sorted(const std::optional<Verdict>& verdict) {
    auto done = bench_.sort(verdict);
    if (done) return std::nullopt;
    return interrupted(done.error());
  }

  void notice(Kind kind, const std::string& serial, const std::string& words) { job_.view->notice({kind, serial, words}, lot_.progress()); }
  bool stopped() const { return job_.stopped && job_.stopped(); }

  Result<StationEnd> end() {
    StationEnd end;
    auto record = lot_.close(bench_.identities(), bench_.equipment(), findings_, job_.clock());
    if (!record) return end_broken(record.error());
    end.record = std::move(*record);
    if (const auto head = lot_.head()) end.head = *head;
    return end;
  }

  Result<StationEnd> end_broken(const Error& error) {
    StationEnd end;
    end.broke = error;
    end.record.sheet = lot_.sheet();
    if (const auto head = lot_.head()) end.head = *head;
    return end;
  }

  const StationJob& job_;
  StationLot lot_;
  StationBench bench_;
  std::optional<Pattern> serials_;
  std::string current_;           // the unit shown last, or the one just refused as a duplicate
  std::vector<Finding> findings_;
  std::uint64_t number_ = 0;
  bool quit_ = false;
};

}  // namespace

Result<StationEnd> run_station(const StationJob& job, const RunContext& context) {
  auto sheet = read_part_sheet(job.sheet);
  if (!sheet) return failure(sheet);
  std::optional<Pattern> serials;
  if (!sheet->serial_pattern.empty()) {
    auto pattern = Pattern::compile(sheet->serial_pattern, sheet->serial_place);
    if (!pattern) return failure(pattern);
    serials = std::move(*pattern);
  }
  const auto remark = [&job](const std::string& words) { job.view->notice({Kind::told, "", shown(words, 300)}, {}); };
  auto bench = StationBench::make(job.profiles, *sheet, job.trace, context.now, job.stopped, remark);
  if (!bench) return failure(bench);
  if (job.count_serials && !bench->has_presence_rule()) {
    return failure(Problem::usage, "--count-serials", "no profile can tell whether a part is in the fixture", "write [present] with ask, or with open_above, in the profile");
  }
  auto lot = StationLot::open(job, std::move(*sheet), context.now);
  if (!lot) return failure(lot);
  return Station(job, std::move(*lot), std::move(*bench), std::move(serials)).run();
}

}  // namespace coilassay
