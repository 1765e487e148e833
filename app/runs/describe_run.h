// Files in, what they are and how they were read out; a reading key for a bench sheet.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "analysis/describe.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct DescribeJob {
  std::vector<std::string> files;          // "-" is standard input, once
  std::optional<std::string> bench_sheet;  // path; its reading key is used
  ReadOptions stated;                      // replaces what the sheet says
  DescribeOptions options;
  std::optional<std::string> bench_out;  // path of a new bench sheet
};

/// Every file, in order; one that cannot be read is an error in its place. usage: standard input twice, a sheet to be
/// written that exists or that would be for several files. Failures of the bench sheets, to read or to write, are
/// failures of the whole.
Result<std::vector<DescribedFile>> run_describe(const DescribeJob& job, const RunContext& context);

/// The sheet that makes the next files be read as this one: [file] with what was found and what was stated, and the
/// likely columns as comments, to be completed by hand. usage for a format that has no reading key.
/// @param columns  headings of the file; not needed when the options state them, empty when they are not known
Result<std::string> reading_key(const Description& description, const ReadOptions& reading,
                                const std::vector<std::string>& columns = {});

}  // namespace coilassay
