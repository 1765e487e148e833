// A lot of drum inductors for end-to-end tests: part sheet, bench sheet and simulated captures in a folder of their own.
#pragma once

#include <nlohmann/json.hpp>
#include <string>
#include <vector>

#include "tests/support/program.h"

namespace coilassay::test {

class LotBench {
 public:
  /// Sheets for L_s by ring-down, 37.6 to 56.4 µH at 230 kHz, every unit inspected; `more` is added to the part sheet.
  explicit LotBench(const std::string& more = "");

  /// <serial>.ringdown.csv of a coil of that inductance, in the lot's folder.
  void unit(const std::string& serial, double inductance_uh, std::uint64_t seed = 1,
            const std::vector<std::string>& parameters = {}) const;
  /// Serials 01, 02, ... around 47 µH.
  void good_units(int count) const;
  void remove(const std::string& serial) const;

  std::string sheet() const { return folder_ / "drum.toml"; }
  std::string lot() const { return folder_ / "lot"; }
  std::string ledger() const { return folder_ / "drum.ledger"; }
  const TemporaryFolder& folder() const { return folder_; }

  /// inspect with these options after sheet and folder.
  ProgramEnd inspect(std::vector<std::string> options = {}) const;
  /// The same with --json; the document has been checked against its schema.
  nlohmann::json inspected(std::vector<std::string> options = {}, int exit_code = 0) const;
  /// The same with --follow: a document for each line, checked against theirs.
  std::vector<nlohmann::json> followed(std::vector<std::string> options = {}, int exit_code = 0) const;

 private:
  TemporaryFolder folder_;
};

/// The unit of that serial in a lot's document.
nlohmann::json unit_of(const nlohmann::json& lot, const std::string& serial);

}  // namespace coilassay::test
