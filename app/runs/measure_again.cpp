#include "app/runs/measure_again.h"

#include <filesystem>
#include <nlohmann/json.hpp>

#include "app/runs/unit_entry.h"
#include "app/runs/unit_tests.h"
#include "app/runs/version.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;
using Json = nlohmann::ordered_json;

/// A file as it was recorded, and where it is now.
struct Moved {
  std::string recorded, now;
};

Result<std::string> sheet_path(const EntryContent& entry, const Json& details, const AgainJob& job) {
  if (job.sheet) return *job.sheet;
  const auto recorded = details.find("sheet");
  if (recorded == details.end() || !recorded->is_string() || recorded->get<std::string>().empty()) {
    return failure(Problem::usage, "--again", "the entry of unit '" + shown(entry.serial, 60) + "' does not say which part sheet judged it",
                   "name it with --sheet FILE");
  }
  return recorded->get<std::string>();
}

Result<PartSheet> sheet_of_then(const EntryContent& entry, const Json& details, const AgainJob& job) {
  const Result<std::string> path = sheet_path(entry, details, job);
  if (!path) return failure(path);
  Result<PartSheet> sheet = read_part_sheet(*path);
  if (!sheet) return sheet;
  if (sheet->sha256 != entry.sheet_sha256) {
    return failure(Problem::unreadable, *path, "this is not the part sheet of then: its digest is another",
                   "name the sheet of revision '" + shown(entry.revision, 40) + "' with --sheet FILE");
  }
  return sheet;
}

/// The captures of then, by test, each with the digest that was recorded.
Result<LotUnit> captures_of_then(const EntryContent& entry, const AgainJob& job, std::vector<Moved>& moved) {
  LotUnit unit;
  unit.serial = entry.serial;
  for (const EntrySource& source : entry.sources) {
    const std::string path = job.folder ? (fs::path(*job.folder) / fs::path(source.file).filename()).string() : source.file;
    const Result<std::string> digest = digest_of_file(path);
    if (!digest) {
      return failure(Problem::unreadable, path, "the capture of then cannot be read: " + digest.error().finding,
                     "say where the captures are now with --folder FOLDER");
    }
    if (*digest != source.sha256) {
      return failure(Problem::unreadable, path, "this is not the capture of then: its digest is another",
                     "say where the captures of then are with --folder FOLDER");
    }
    moved.push_back({source.file, path});
    auto test = std::find_if(unit.tests.begin(), unit.tests.end(), [&](const UnitCaptures& each) { return each.test == source.test; });
    if (test == unit.tests.end()) test = unit.tests.insert(unit.tests.end(), UnitCaptures{source.test, {}, {}});
    test->files.push_back(path);
  }
  return unit;
}

/// The bare name of a file wherever its path stands in a text.
std::string without_paths(std::string text, const std::vector<Moved>& moved) {
  for (const Moved& file : moved) {
    for (const std::string& path : {file.recorded, file.now}) {
      const std::string name = fs::path(path).filename().string();
      if (path == name) continue;
      for (std::size_t at = 0; (at = text.find(path, at)) != std::string::npos; at += name.size()) text.replace(at, path.size(), name);
    }
  }
  return text;
}

std::string in_short(const Json& value) { return shown(value.dump(-1, ' ', false, Json::error_handler_t::replace), 80); }

class Comparison {
 public:
  Comparison(MeasuredAgain& outcome, const std::vector<Moved>& moved) : outcome_(&outcome), moved_(&moved) {}

  void compare(const std::string& where, const Json& recorded, const Json& now) {
    if (recorded.is_object() && now.is_object()) {
      compare_members(where, recorded, now);
    } else if (recorded.is_array() && now.is_array() && recorded.size() == now.size()) {
      for (std::size_t i = 0; i < recorded.size(); ++i) compare(where + "[" + std::to_string(i) + "]", recorded[i], now[i]);
    } else if (recorded.is_string() && now.is_string()) {
      if (without_paths(recorded.get<std::string>(), *moved_) != without_paths(now.get<std::string>(), *moved_)) add(where, recorded, now);
    } else if (recorded != now) {
      add(where, recorded, now);
    }
  }

 private:
  void compare_members(const std::string& where, const Json& recorded, const Json& now) {
    const std::string before = where.empty() ? "" : where + ".";
    for (const auto& [key, value] : recorded.items()) {
      if (key == "program" || (where.empty() && key == "sheet")) continue;
      const auto other = now.find(key);
      if (other == now.end()) add(before + key, value, nullptr);
      else compare(before + key, value, *other);
    }
    for (const auto& [key, value] : now.items()) {
      if (key != "program" && !recorded.contains(key)) add(before + key, nullptr, value);
    }
  }
  void add(const std::string& where, const Json& recorded, const Json& now) {
    if (outcome_->differences.size() == kMostDifferences) ++outcome_->more;
    else outcome_->differences.push_back({where, in_short(recorded), in_short(now)});
  }

  MeasuredAgain* outcome_;
  const std::vector<Moved>* moved_;
};

}  // namespace

Result<MeasuredAgain> measure_again(const EntryContent& entry, const AgainJob& job, const RunContext& context) {
  if (entry.kind != EntryKind::unit || entry.sources.empty()) {
    return failure(Problem::usage, "--again",
                   entry.kind == EntryKind::unit ? "the entry names no capture that could be measured again"
                                                 : "an entry of kind '" + std::string(name(entry.kind)) + "' is not measured",
                   "show it without --again");
  }
  const Json recorded = Json::parse(entry.details, nullptr, false);
  const Result<PartSheet> sheet = sheet_of_then(entry, recorded, job);
  if (!sheet) return failure(sheet);
  std::vector<Moved> moved;
  const Result<LotUnit> unit = captures_of_then(entry, job, moved);
  if (!unit) return failure(unit);
  const Result<std::vector<PreparedTest>> tests = prepare_tests(*sheet);
  if (!tests) return failure(tests);

  RunContext then = context;
  then.now = entry.time;
  UnitRun run;
  run.tests = run_tests(*tests, *unit, false, then);
  run.verdict = judge_unit(*sheet, entry.serial, static_cast<std::uint64_t>(entry.attempt), tested(run.tests));
  run.reason = entry.reason;
  const EntryContent again = unit_entry(run, {&*sheet, entry.lot, entry.operator_name, entry.instrument, entry.program, entry.time});

  MeasuredAgain outcome;
  outcome.files = entry.sources.size();
  outcome.recorded_by = entry.program;
  outcome.program = program_name();
  Comparison comparison(outcome, moved);
  comparison.compare("verdict", entry.verdict, again.verdict);
  comparison.compare("", recorded, Json::parse(again.details, nullptr, false));
  return outcome;
}

}  // namespace coilassay
