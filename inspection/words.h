// Words for people that several files of the room need.
#pragma once

#include <string>

#include "base/unit.h"

namespace coilassay {

/// "5 %", "0.65 %", "99.9 %": a stated ratio, as people write it.
std::string percent_in_words(double ratio);

/// "37.6 µH", "100 kHz": a stated value with the digits it was stated with, up to seven.
std::string stated_in_words(double value, Unit unit);

}  // namespace coilassay
