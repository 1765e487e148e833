// Settings of the instrument in the lines above the numbers.
#pragma once

#include <map>
#include <string>
#include <string_view>

#include "acquire/table_header.h"

namespace coilassay {

/// Takes "key,value[,unit]", several such pairs in a row, "key: value" or "key = value", with or without a comment sign.
void read_setting(std::string_view line, char delimiter, std::map<std::string, std::string>& settings);

/// Finds interval, start, number of samples and full scale among the settings.
void interpret_settings(TableHeader& header, char decimal);

}  // namespace coilassay
