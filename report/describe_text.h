// What `describe` tells people.
#pragma once

#include <span>
#include <string>

#include "analysis/describe.h"
#include "report/result_text.h"

namespace coilassay {

/// One file on a page; with `verbose` also what stands in its head, all records and the digest.
std::string to_text(const Description& description, const TextStyle& style);

/// Many files, one line each; a file that could not be read is a line with its error.
std::string to_text(std::span<const DescribedFile> files, const TextStyle& style);

}  // namespace coilassay
