// Words for people that several files of the room need.
#pragma once

#include <string>

namespace coilassay {

/// "5 %", "0.65 %", "99.9 %": a stated ratio, as people write it.
std::string percent_in_words(double ratio);

}  // namespace coilassay
