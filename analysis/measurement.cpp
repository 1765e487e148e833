#include "analysis/measurement.h"

namespace coilassay {

const Estimate* Measurement::find(std::string_view symbol) const {
  for (const Estimate& estimate : estimates) {
    if (estimate.symbol == symbol) return &estimate;
  }
  return nullptr;
}

bool Measurement::has_finding(std::string_view code) const {
  for (const Finding& finding : findings) {
    if (finding.code == code) return true;
  }
  return false;
}

std::string_view leading_symbol(std::string_view test) {
  if (test == "ringdown") return "f_0";
  if (test == "ramp") return "L_0";
  if (test == "sine") return "Z";
  if (test == "sweep") return "L";
  if (test == "coupling") return "k";
  if (test == "resistance") return "R_dc";
  return "";
}

}  // namespace coilassay
