// A file that is read must not be replaced by a document that is written.
#pragma once

#include <span>
#include <string>
#include <vector>

#include "base/result.h"

namespace coilassay {

/// A path as it was given; `given_as` is the option's name, or "" for a word without an option.
struct GivenFile {
  std::string given_as, path;
};

/// Whether two paths lead to one file, whatever links and points are in them; also for two that are not there yet. "-" and
/// what is no regular file (/dev/null) is nobody's.
bool same_file(const std::string& a, const std::string& b);

/// cannot_write, with the option of the first output that would take the place of an input or of another output.
Result<void> spare_files(std::span<const GivenFile> outputs, std::span<const GivenFile> inputs);

/// Adds a bench sheet and the file of the fixture it names.
void add_bench_files(std::vector<GivenFile>& inputs, const std::string& bench_sheet);

}  // namespace coilassay
