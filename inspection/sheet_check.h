// A part sheet explained in plain words, and what in it cannot work.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "inspection/part_sheet.h"
#include "inspection/sampling.h"

namespace coilassay {

/// Something legal that will not do what its writer wants.
struct SheetProblem {
  std::string place;    // "drum.toml:12"
  bool contradiction = false;  // true: can never work; false: worth a look
  std::string finding, remedy;
};

struct SheetCheck {
  std::string path, sha256, part, revision;
  std::vector<std::string> sentences;  // what the sheet demands, line by line
  std::vector<SheetProblem> problems;
  bool usable() const;                 // no contradiction among them
};

/// @param lot_size  for the words about sampling; absent: said for lots of 50, 500 and 5000
SheetCheck check_sheet(const PartSheet& sheet, std::optional<std::uint64_t> lot_size);

}  // namespace coilassay
