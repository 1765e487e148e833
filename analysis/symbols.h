// The symbol table: every quantity the program can report, once.
#pragma once

#include <span>
#include <string_view>

#include "base/unit.h"

namespace coilassay {

struct Symbol {
  std::string_view symbol;
  Unit unit;
  std::string_view words;   // for people: "series inductance"
};

std::span<const Symbol> symbols();
/// nullptr when there is no such symbol.
const Symbol* find_symbol(std::string_view symbol);

}  // namespace coilassay
