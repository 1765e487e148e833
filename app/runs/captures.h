// Captures from the files a command names.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "acquire/reader.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct CaptureRequest {
  std::vector<std::string> files;      // "-" is standard input, once
  std::optional<std::string> segment;  // label, or position counted from 1; absent: the first
  ReadOptions reading;
  std::string test;  // the command that asks, for the messages
};

struct CapturesRead {
  std::vector<Capture> captures;   // one per file
  std::vector<std::string> notes;  // what was chosen where a file left a choice
};

/// The capture to measure in what was read from `file`; a choice that was made for the user is added to `notes`. usage:
/// a sweep, a segment that is not there.
Result<Capture> chosen_capture(Recording recording, const std::string& file, const CaptureRequest& request,
                               std::vector<std::string>& notes);

/// One capture per file. usage: standard input twice, and what chosen_capture() refuses.
Result<CapturesRead> read_captures(const CaptureRequest& request, const RunContext& context);

/// A test that does without a fixture set says so when the bench sheet names one, in the notes.
void tell_unused_fixture(const BenchSetup& bench, std::vector<std::string>& notes);

}  // namespace coilassay
