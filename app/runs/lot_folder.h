// A lot as it lies on a disk: which captures belong to which unit.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "base/finding.h"
#include "base/result.h"

namespace coilassay {

/// The captures of one test of one unit, in their order.
struct UnitCaptures {
  std::string test;
  std::vector<std::string> files;  // paths
  std::optional<Error> trouble;    // why they cannot be measured: two captures for one place, the same under two serials
};

struct LotUnit {
  std::string serial;                // outside text
  std::vector<UnitCaptures> tests;   // by name of the test
  std::optional<std::string> reason; // of a lot.toml: why this unit is measured again

  const UnitCaptures* find(std::string_view test) const;
};

struct LotFolder {
  std::string path;
  std::string name;                  // of the lot: what the list says, or the folder's own name
  std::vector<LotUnit> units;        // by serial, numbers in their own order; a list keeps its order
  std::vector<std::string> strays;   // files that belong to no unit, by name
  std::vector<Finding> findings;     // stray_file, duplicate_serial
};

/// Reads the names in a folder: `<serial>.<test>.<ext>`, or `<serial>.<test>.<n>.<ext>` where a test takes several captures
/// (`0017.ramp.csv`, `0017.ringdown.2.csv.gz`), and of coupling what it shows (`0017.coupling.primary_open.csv`); a file `lot.toml` in it (or given in place of the folder) lists the units
/// instead. No capture is opened. Hidden files, folders and sheets are passed over without a word; every other file that fits no unit is a stray.
///
/// @param tests  the kinds of test a name may have
/// @return unreadable for a folder that is not there or holds no unit; bad_sheet for a list that names a serial twice, an
///         unknown test or a file that is not there.
Result<LotFolder> read_lot_folder(const std::string& path, std::span<const std::string_view> tests);

/// Finds captures whose bytes are the same under two serials (SHA-256; only files of the same size are opened): each gets a
/// trouble that names the other, and the lot a finding duplicate_serial. Nobody can tell which unit such a capture shows.
Result<void> find_same_captures(LotFolder& lot);

/// SHA-256 of a file's bytes as they are stored; unreadable.
Result<std::string> digest_of_file(const std::string& path);

/// Whether one serial comes before another: digits by the number they make, everything else by its bytes.
bool serial_before(std::string_view a, std::string_view b);

}  // namespace coilassay
