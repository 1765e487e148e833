// An input as a file, for what is read by path.
#pragma once

#include <string>
#include <string_view>

namespace coilassay::fuzz {

/// Writes the bytes to a file of that name in a folder of this process, in place of what stood there.
std::string input_file(const std::string& name, std::string_view bytes);

}  // namespace coilassay::fuzz
