#include "app/commands/station_screen.h"

#include <fmt/format.h>

#include <algorithm>
#include <ostream>

#include "app/commands/block_letters.h"
#include "base/outside_text.h"
#include "report/lot_json.h"
#include "report/lot_wording.h"
#include "report/text_layout.h"

namespace coilassay {

namespace {

using Kind = StationNotice::Kind;

constexpr std::size_t kLastParts = 6;

constexpr std::string_view kGreen = "\x1b[1;32m", kRed = "\x1b[1;31m", kYellow = "\x1b[1;33m", kPlain = "\x1b[0m";

struct Look {
  BlockSign sign;
  std::string_view word, color;
  int bells;
};

Look look_of(Verdict verdict) {
  switch (verdict) {
    case Verdict::pass: return {BlockSign::tick, "PASS", kGreen, 1};
    case Verdict::fail: return {BlockSign::cross, "FAIL", kRed, 3};
    case Verdict::undecided: return {BlockSign::question, "UNDECIDED", kYellow, 2};
    case Verdict::not_comparable: break;
  }
  return {BlockSign::question, "NO VERDICT", kYellow, 2};
}

Look look_of(Kind kind) {
  switch (kind) {
    case Kind::no_part: return {BlockSign::bar, "NO PART", kYellow, 2};
    case Kind::contact: return {BlockSign::bar, "CONTACT", kYellow, 2};
    case Kind::no_reading: return {BlockSign::bar, "NO READING", kYellow, 2};
    case Kind::duplicate: return {BlockSign::bar, "DUPLICATE", kYellow, 2};
    case Kind::refused: return {BlockSign::bar, "NOT TAKEN", kYellow, 2};
    case Kind::blocked: return {BlockSign::cross, "STOP", kRed, 3};
    case Kind::checked: return {BlockSign::tick, "CHECKED", kGreen, 1};
    case Kind::set_aside: return {BlockSign::bar, "ASIDE", kYellow, 1};
    case Kind::told: break;
  }
  return {BlockSign::none, "", "", 0};
}

std::string values_of(const UnitVerdict& unit, Script script) {
  std::string words;
  for (const LimitVerdict& limit : unit.limits) {
    words += (words.empty() ? "" : "; ") + limit.quantity + " " + value_in_words(limit, script) + " (" + limits_in_words(limit, script) + ")";
    if (limit.verdict != Verdict::pass && !limit.why.empty()) words += ", " + limit.why;
  }
  return words;
}

std::string attempt_in_words(const StationUnit& unit) {
  if (unit.attempt.attempt <= 1) return "";
  std::string words = "attempt " + std::to_string(unit.attempt.attempt);
  if (unit.standing.verdict != unit.attempt.verdict) words += fmt::format(": {}, and {} stands", verdict_in_words(unit.attempt.verdict), verdict_in_words(unit.standing.verdict));
  return words;
}

std::string serial_of(const UnitVerdict& unit) { return shown(unit.serial, 60); }

}  // namespace

std::string yield_in_words(const StationProgress& progress) {
  if (progress.units == 0) return "no unit yet";
  const auto percent = [&](std::size_t count) { return fmt::format("{:.3g} %", 100.0 * static_cast<double>(count) / static_cast<double>(progress.units)); };
  return fmt::format("yield {} at the first attempt ({} of {}), {} in the end", percent(progress.first_pass), progress.first_pass, progress.units,
                     percent(progress.standing_pass));
}

void StationLines::begun(const StationProgress& progress) {
  if (quiet_) return;
  std::string words = fmt::format("lot {} of {}: serial numbers, one a line; :again REASON, :aside, :check, :quit", shown(progress.lot, 60), shown(progress.part, 60));
  if (progress.units > 0) words += fmt::format("; {} units are in the ledger", progress.units);
  notices_ << wrapped(in_script(words, style_.script), "", style_.width) << std::flush;
}

void StationLines::unit(const StationUnit& unit, const StationProgress&) {
  std::string line = fmt::format("{} {}", serial_of(unit.attempt), verdict_in_words(unit.standing.verdict));
  if (const std::string attempt = attempt_in_words(unit); !attempt.empty()) line += " (" + attempt + ")";
  line += "  " + values_of(unit.attempt, style_.script);
  units_ << in_script(line, style_.script) << std::endl;  // whoever reads it waits for it
}

void StationLines::notice(const StationNotice& notice, const StationProgress&) {
  if (quiet_ && notice.kind == Kind::told) return;
  const std::string words = notice.serial.empty() ? notice.words : notice.serial + ": " + notice.words;
  notices_ << wrapped(in_script(words, style_.script), "", style_.width) << std::flush;
}

void StationFollower::unit(const StationUnit& unit, const StationProgress&) {
  units_ << unit_line(unit.attempt, unit.standing, unit.entry, false) << std::flush;
}

void StationScreen::begun(const StationProgress& progress) { draw({}, "", {"Scan a serial number."}, progress, 0); }

void StationScreen::unit(const StationUnit& unit, const StationProgress& progress) {
  const Look look = look_of(unit.standing.verdict);
  std::vector<std::string> below{serial_of(unit.attempt)};
  if (const std::string attempt = attempt_in_words(unit); !attempt.empty()) below.front() += ", " + attempt;
  for (const LimitVerdict& limit : unit.attempt.limits) {
    std::string line = "  " + limit.quantity + "  " + value_in_words(limit, style_.script) + "  (" + limits_in_words(limit, style_.script) + ")";
    if (limit.verdict != Verdict::pass && !limit.why.empty()) line += "  " + limit.why;
    below.push_back(std::move(line));
  }
  last_.push_front(fmt::format("{:<16} {}", serial_of(unit.attempt), verdict_in_words(unit.standing.verdict)));
  if (last_.size() > kLastParts) last_.pop_back();
  draw(block_letters(look.sign, look.word, style_.width, style_.script), look.color, below, progress, look.bells);
}

void StationScreen::notice(const StationNotice& notice, const StationProgress& progress) {
  const Look look = look_of(notice.kind);
  const std::string words = notice.serial.empty() ? notice.words : notice.serial + ": " + notice.words;
  if (look.sign == BlockSign::none) {
    out_ << wrapped(in_script(words, style_.script), "", style_.width) << std::flush;
    return;
  }
  if (notice.kind == Kind::set_aside && !last_.empty()) last_.front() = fmt::format("{:<16} set aside", notice.serial);
  draw(block_letters(look.sign, look.word, style_.width, style_.script), look.color, {words}, progress, look.bells);
}

void StationScreen::draw(const std::vector<std::string>& large, std::string_view color, const std::vector<std::string>& below,
                         const StationProgress& progress, int bells) {
  std::string screen = "\x1b[2J\x1b[H";  // clear, and to the top
  const auto line = [&](const std::string& words) { screen += wrapped(in_script(words, style_.script), "", style_.width); };
  // Columns stay columns; what is too wide for the terminal it breaks itself.
  const auto row = [&](const std::string& words) { screen += in_script(words, style_.script) + '\n'; };
  line(fmt::format("Lot {} of {}", shown(progress.lot, 60), shown(progress.part, 60)));
  screen += '\n';
  if (style_.color) screen += color;
  for (const std::string& dots : large) screen += dots + '\n';
  if (style_.color && !color.empty()) screen += kPlain;
  if (!large.empty()) screen += '\n';
  for (const std::string& words : below) words.starts_with("  ") ? row(words) : line(words);
  screen += '\n';
  if (!last_.empty()) {
    line("Last parts");
    for (const std::string& words : last_) row("  " + words);
    screen += '\n';
  }
  std::string plan = fmt::format("{} {}", progress.units, progress.units == 1 ? "unit" : "units");
  if (progress.n) plan += fmt::format(" of {}", *progress.n);
  plan += fmt::format(", {} fail", progress.standing_fail);
  if (progress.accept) plan += fmt::format(" (the plan allows {})", *progress.accept);
  line(plan);
  line(yield_in_words(progress));
  row(":again REASON   :aside   :check   :quit");
  screen += "> ";
  screen += std::string(static_cast<std::size_t>(bells), '\a');
  out_ << screen << std::flush;
}

}  // namespace coilassay
