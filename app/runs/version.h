// Which program this is.
#pragma once

#include <string>

namespace coilassay {

std::string version();       // "0.1.0"
std::string program_name();  // "coilassay 0.1.0"

}  // namespace coilassay
