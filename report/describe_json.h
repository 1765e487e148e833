// The documents of `describe`: coilassay.describe/1 and coilassay.describe-list/1.
#pragma once

#include <span>
#include <string>

#include "analysis/describe.h"

namespace coilassay {

std::string to_json(const Description& description);

/// A list in the order given; a file that could not be read stands in it as its coilassay.error/1 document.
std::string to_json(std::span<const DescribedFile> files);

}  // namespace coilassay
