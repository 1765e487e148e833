// Everything the documents of a gauge study are made from.
#pragma once

#include <string>
#include <vector>

#include "base/finding.h"
#include "base/unit.h"
#include "inspection/gauge_study.h"

namespace coilassay {

struct GaugeRecord {
  std::string quantity;              // symbol; empty for readings that named none
  Unit unit = Unit::one;
  std::string conditions;            // "at 100.0 kHz", as the sheet states them; may be empty
  std::string input;                 // folder or table
  struct File {
    std::string file, sha256;
  };
  std::vector<File> files;           // captures in the order of their names, or the table
  std::vector<GaugeReading> readings;
  GaugeStudy study;
  std::optional<double> tolerance;   // max - min
  std::vector<Finding> findings;
};

/// The lines of a part sheet that bring the gauge's deviation into the uncertainty of units; empty without a symbol.
std::string gauge_sheet_lines(const GaugeRecord& record);

}  // namespace coilassay
