#include "app/runs/lot_folder.h"

#include <algorithm>
#include <cctype>
#include <filesystem>
#include <fstream>
#include <map>

#include "acquire/reader.h"
#include "app/runs/measure_unit.h"
#include "base/digest.h"
#include "base/outside_text.h"
#include "base/sheet.h"

namespace coilassay {

namespace {

namespace fs = std::filesystem;

constexpr std::size_t kMostFiles = 1'000'000;

bool is_number(std::string_view text) {
  return !text.empty() && text.size() < 7 &&
         std::all_of(text.begin(), text.end(), [](char c) { return c >= '0' && c <= '9'; });
}

std::vector<std::string_view> pieces_of(std::string_view name) {
  std::vector<std::string_view> pieces;
  for (std::size_t begin = 0;;) {
    const std::size_t dot = name.find('.', begin);
    pieces.push_back(name.substr(begin, dot - begin));
    if (dot == std::string_view::npos) return pieces;
    begin = dot + 1;
  }
}

struct CaptureName {
  std::string serial, test;
  int number = 0;    // 0: not numbered
  std::string item;  // "primary_open"; empty for all other tests
};

/// What a file name says; nothing when it names no test.
std::optional<CaptureName> capture_name(const std::string& file, std::span<const std::string_view> tests) {
  const std::vector<std::string_view> pieces = pieces_of(file);
  // The last piece that is a test: a serial may have points in it, an ending may be of two pieces.
  for (std::size_t i = pieces.size() - 1; i-- > 1;) {
    if (std::find(tests.begin(), tests.end(), pieces[i]) == tests.end()) continue;
    CaptureName name;
    name.serial = file.substr(0, static_cast<std::size_t>(pieces[i].data() - file.data()) - 1);
    name.test = pieces[i];
    if (i + 2 < pieces.size() && is_number(pieces[i + 1])) name.number = std::stoi(std::string(pieces[i + 1]));
    const std::optional<CouplingItem> item = coupling_item_of(file.substr(name.serial.size()));
    if (item) name.item = coilassay::name(*item);
    return name.serial.empty() ? std::nullopt : std::optional(name);
  }
  return std::nullopt;
}

bool passed_over(const fs::directory_entry& entry) {
  const std::string name = entry.path().filename().string();
  return name.starts_with('.') || name.ends_with(".toml") || name.ends_with(".truth.json") || !entry.is_regular_file();
}

/// The nearest test to a piece of a stray's name, for "did you mean".
std::string hint_for(const std::string& file, std::span<const std::string_view> tests) {
  const auto pieces = pieces_of(file);
  for (std::size_t i = 1; i + 1 < pieces.size(); ++i) {
    if (const std::string_view near = nearest(pieces[i], tests); !near.empty()) return std::string(near);
  }
  return {};
}

void tell_strays(LotFolder& lot, std::span<const std::string_view> tests) {
  if (lot.strays.empty()) return;
  constexpr std::size_t kNamed = 3;
  std::string names;
  for (std::size_t i = 0; i < lot.strays.size() && i < kNamed; ++i) {
    names += (i == 0 ? "'" : ", '") + shown(lot.strays[i], 60) + "'";
    if (const std::string hint = hint_for(lot.strays[i], tests); !hint.empty()) names += " (" + hint + "?)";
  }
  if (lot.strays.size() > kNamed) names += " and " + std::to_string(lot.strays.size() - kNamed) + " more";
  lot.findings.push_back({"stray_file", Severity::note,
                          "not measured, because the name is not of the form SERIAL.TEST.ENDING: " + names,
                          lot.strays.front(), static_cast<double>(lot.strays.size()), Unit::one});
}

/// Captures of one place, a number or the item of a coupling each.
using Place = std::pair<int, std::string>;
using Numbered = std::multimap<Place, std::string>;

UnitCaptures captures_of(const std::string& serial, const std::string& test, const Numbered& numbered) {
  UnitCaptures captures{test, {}, std::nullopt};
  for (const auto& [place, path] : numbered) captures.files.push_back(path);
  for (auto it = numbered.begin(); it != numbered.end(); ++it) {
    const auto next = std::next(it);
    if (next == numbered.end() || next->first != it->first) continue;
    captures.trouble = Error{Problem::ambiguous, it->second,
                             "unit " + shown(serial, 60) + " has a second capture for the same place, " +
                                 shown(fs::path(next->second).filename().string(), 80),
                             "remove the one that does not count, or number them as in SERIAL." + test + ".1.csv"};
    break;
  }
  return captures;
}

Result<LotFolder> lot_of_names(const std::string& path, std::span<const std::string_view> tests) {
  std::error_code trouble;
  fs::directory_iterator entries(path, trouble);
  if (trouble) {
    return failure(Problem::unreadable, path, "the folder of the lot cannot be read: " + trouble.message(),
                   "give the folder that holds the captures");
  }
  LotFolder lot;
  lot.path = path;
  fs::path whole = fs::weakly_canonical(path, trouble);
  if (trouble || whole.empty()) whole = path;
  lot.name = whole.filename().string();
  std::map<std::string, std::map<std::string, Numbered>> found;
  std::size_t count = 0;
  for (const fs::directory_entry& entry : entries) {
    if (++count > kMostFiles) {
      return failure(Problem::unreadable, path, "there are more than a million files in the folder",
                     "give the folder of one lot");
    }
    if (passed_over(entry)) continue;
    const std::string file = entry.path().filename().string();
    if (const auto name = capture_name(file, tests)) {
      found[name->serial][name->test].emplace(Place{name->number, name->item}, entry.path().string());
    } else {
      lot.strays.push_back(file);
    }
  }
  std::sort(lot.strays.begin(), lot.strays.end());
  for (const auto& [serial, by_test] : found) {
    LotUnit unit{serial, {}, std::nullopt};
    for (const auto& [test, numbered] : by_test) unit.tests.push_back(captures_of(serial, test, numbered));
    lot.units.push_back(std::move(unit));
  }
  std::sort(lot.units.begin(), lot.units.end(),
            [](const LotUnit& a, const LotUnit& b) { return serial_before(a.serial, b.serial); });
  tell_strays(lot, tests);
  return lot;
}

Result<LotUnit> listed_unit(const SheetTable& row, const fs::path& folder, std::span<const std::string_view> tests) {
  const auto serial = row.text("serial");
  if (!serial) return failure(serial);
  if (!*serial || (*serial)->empty()) {
    return failure(Problem::bad_sheet, row.place("serial"), "a unit has no serial", "add it, as in serial = \"0017\"");
  }
  LotUnit unit{**serial, {}, std::nullopt};
  const auto reason = row.text("reason");
  if (!reason) return failure(reason);
  unit.reason = *reason;
  for (const std::string_view test : tests) {
    if (!row.has(test)) {
      (void)row.text(test);  // asked for: a key that may be there
      continue;
    }
    UnitCaptures captures{std::string(test), {}, std::nullopt};
    if (const auto one = row.text(test); one && *one) {
      captures.files = {**one};
    } else {
      const auto several = row.texts(test);
      if (!several) return failure(several);
      captures.files = several->value_or(std::vector<std::string>{});
    }
    for (std::string& file : captures.files) {
      file = (folder / file).string();
      std::error_code ignored;
      if (!fs::is_regular_file(file, ignored)) {
        return failure(Problem::bad_sheet, row.place(test), "there is no file '" + shown(file) + "'",
                       "paths in the list are relative to it");
      }
    }
    unit.tests.push_back(std::move(captures));
  }
  std::sort(unit.tests.begin(), unit.tests.end(),
            [](const UnitCaptures& a, const UnitCaptures& b) { return a.test < b.test; });
  return unit;
}

Result<LotFolder> lot_of_list(const fs::path& list, std::span<const std::string_view> tests) {
  const Result<SheetTable> sheet = read_sheet(list.string());
  if (!sheet) return failure(sheet);
  LotFolder lot;
  lot.path = list.string();
  const auto name = sheet->text("lot");
  if (!name) return failure(name);
  std::error_code ignored;
  lot.name = *name ? **name : fs::weakly_canonical(list, ignored).parent_path().filename().string();
  const auto rows = sheet->tables("unit");
  if (!rows) return failure(rows);
  for (const SheetTable& row : *rows) {
    Result<LotUnit> unit = listed_unit(row, list.parent_path(), tests);
    if (!unit) return failure(unit);
    for (const LotUnit& other : lot.units) {
      if (other.serial != unit->serial) continue;
      return failure(Problem::bad_sheet, row.place("serial"),
                     "the serial '" + shown(unit->serial, 60) + "' stands in the list twice",
                     "every unit has one entry with all its captures");
    }
    lot.units.push_back(std::move(*unit));
  }
  if (const auto known = sheet->refuse_unknown_keys(); !known) return failure(known);
  return lot;
}

}  // namespace

const UnitCaptures* LotUnit::find(std::string_view test) const {
  const auto it = std::find_if(tests.begin(), tests.end(), [&](const UnitCaptures& c) { return c.test == test; });
  return it == tests.end() ? nullptr : &*it;
}

bool serial_before(std::string_view a, std::string_view b) {
  const auto digit = [](char c) { return c >= '0' && c <= '9'; };
  const std::string_view whole_a = a, whole_b = b;
  while (!a.empty() && !b.empty()) {
    if (digit(a[0]) && digit(b[0])) {
      const auto number = [&](std::string_view& text) {
        std::size_t zeros = 0;
        while (zeros + 1 < text.size() && text[zeros] == '0' && digit(text[zeros + 1])) ++zeros;
        std::size_t end = zeros;
        while (end < text.size() && digit(text[end])) ++end;
        const std::string_view digits = text.substr(zeros, end - zeros);
        text.remove_prefix(end);
        return digits;
      };
      const std::string_view x = number(a), y = number(b);
      if (x.size() != y.size()) return x.size() < y.size();
      if (x != y) return x < y;
    } else {
      if (a[0] != b[0]) return static_cast<unsigned char>(a[0]) < static_cast<unsigned char>(b[0]);
      a.remove_prefix(1);
      b.remove_prefix(1);
    }
  }
  return a.empty() != b.empty() ? a.empty() : whole_a < whole_b;
}

Result<LotFolder> read_lot_folder(const std::string& path, std::span<const std::string_view> tests) {
  std::error_code ignored;
  const fs::path list = path.ends_with(".toml") ? fs::path(path) : fs::path(path) / "lot.toml";
  Result<LotFolder> lot = path.ends_with(".toml") || fs::is_regular_file(list, ignored) ? lot_of_list(list, tests)
                                                                                          : lot_of_names(path, tests);
  if (!lot) return lot;
  if (lot->units.empty()) {
    return failure(Problem::unreadable, path, "there is no unit in it",
                   "name the captures SERIAL.TEST.ENDING, as in 0017.ringdown.csv, or list them in a lot.toml");
  }
  // Two serials that differ only in the case of letters are one label typed twice, more often than two units.
  std::map<std::string, std::string> by_small_letters;
  for (const LotUnit& unit : lot->units) {
    std::string small = unit.serial;
    for (char& c : small) c = static_cast<char>(std::tolower(static_cast<unsigned char>(c)));
    const auto [other, is_new] = by_small_letters.emplace(small, unit.serial);
    if (is_new) continue;
    lot->findings.push_back({"duplicate_serial", Severity::caution,
                             "the serials " + shown(other->second, 60) + " and " + shown(unit.serial, 60) +
                                 " differ only in capitals: look whether they are one unit",
                             unit.serial, 1, Unit::one});
  }
  return lot;
}

Result<std::string> digest_of_file(const std::string& path) {
  auto bytes = open_bytes(path);
  if (!bytes) return failure(bytes);
  Sha256 sha;
  std::vector<char> block(std::size_t{1} << 18);
  for (;;) {
    const Result<std::size_t> got = (*bytes)->read(block);
    if (!got) return failure(got);
    if (*got == 0) return sha.finish();
    sha.add({block.data(), *got});
  }
}

namespace {

/// Its last bytes: captures of one bench often have one size, and differ here already.
std::string end_of_file(const std::string& path) {
  constexpr std::streamoff kEnd = 4096;
  std::ifstream in(path, std::ios::binary | std::ios::ate);
  const std::streamoff size = in.tellg();
  if (!in || size < 0) return {};
  in.seekg(std::max<std::streamoff>(0, size - kEnd));
  std::string end(static_cast<std::size_t>(std::min(size, kEnd)), '\0');
  in.read(end.data(), static_cast<std::streamsize>(end.size()));
  return in ? end : std::string();
}

}  // namespace

Result<void> find_same_captures(LotFolder& lot) {
  struct SeenCapture {
    LotUnit* unit;
    UnitCaptures* captures;
    std::string file;
  };
  std::map<std::uintmax_t, std::vector<SeenCapture>> by_size;
  for (LotUnit& unit : lot.units) {
    for (UnitCaptures& captures : unit.tests) {
      for (const std::string& file : captures.files) {
        std::error_code trouble;
        const std::uintmax_t size = fs::file_size(file, trouble);
        // A file that cannot be asked tells its story when it is measured.
        if (!trouble) by_size[size].push_back({&unit, &captures, file});
      }
    }
  }
  for (auto& [size, places] : by_size) {
    if (places.size() < 2) continue;
    std::map<std::string, std::vector<SeenCapture>> by_end, by_digest;
    for (const SeenCapture& place : places) by_end[end_of_file(place.file)].push_back(place);
    for (const auto& [end, alike] : by_end) {
      if (alike.size() < 2) continue;
      for (const SeenCapture& place : alike) {
        if (const Result<std::string> digest = digest_of_file(place.file)) by_digest[*digest].push_back(place);
      }
    }
    for (const auto& [digest, same] : by_digest) {
      if (same.size() < 2) continue;
      for (const SeenCapture& place : same) {
        const SeenCapture& other = place.file == same[0].file ? same[1] : same[0];
        if (other.unit == place.unit && same.size() == 2) {
          place.captures->trouble =
              Error{Problem::ambiguous, place.file,
                    "the same capture stands for unit " + shown(place.unit->serial, 60) + " twice, as " +
                        shown(fs::path(other.file).filename().string(), 80),
                    "capture the unit again for the other test or repeat"};
          continue;
        }
        place.captures->trouble =
            Error{Problem::ambiguous, place.file,
                  "the same capture stands under another serial as well, " +
                      shown(fs::path(other.file).filename().string(), 80) +
                      ", and nobody can tell which unit it shows",
                  "capture both units again"};
      }
      if (same[0].unit == same[1].unit && same.size() == 2) continue;
      std::string names;
      for (const SeenCapture& place : same) names += (names.empty() ? "" : " and ") + shown(place.unit->serial, 60);
      lot.findings.push_back({"duplicate_serial", Severity::caution,
                              "one capture stands under the serials " + names +
                                  ": none of them is judged by it; capture them again",
                              same[0].unit->serial, static_cast<double>(same.size()), Unit::one});
    }
  }
  return {};
}

}  // namespace coilassay
