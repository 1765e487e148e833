// The tables of a joint solution, the same in text and on a page.
#pragma once

#include <string>
#include <vector>

#include "analysis/measurement.h"
#include "base/number_text.h"

namespace coilassay {

struct TitledTable {
  std::string title;
  std::vector<std::vector<std::string>> rows;   // the first has the headings
};

/// What each input should have been, the equivalent circuits, and the matrices of several windings; only what is there.
std::vector<TitledTable> coupling_tables(const Measurement& measurement, Script script);

}  // namespace coilassay
