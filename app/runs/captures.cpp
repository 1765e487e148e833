#include "app/runs/captures.h"

#include <algorithm>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

std::string labels_of(const std::vector<Capture>& captures) {
  constexpr std::size_t kMost = 8;
  std::string labels;
  for (std::size_t i = 0; i < captures.size() && i < kMost; ++i) {
    labels += (i == 0 ? "" : ", ") + std::to_string(i + 1);
    if (!captures[i].segment.empty()) labels += " '" + shown(captures[i].segment, 30) + "'";
  }
  return captures.size() > kMost ? labels + ", ..." : labels;
}

/// The segment a text names: a label first, then a position, as for columns.
Result<std::size_t> find_segment(const std::vector<Capture>& captures, const std::string& named,
                                 const std::string& file) {
  for (std::size_t i = 0; i < captures.size(); ++i) {
    if (captures[i].segment == named) return i;
  }
  const std::optional<double> position = parse_plain_number(named);
  for (std::size_t i = 0; position && i < captures.size(); ++i) {
    if (*position == static_cast<double>(i + 1)) return i;
  }
  const std::string count = captures.size() == 1 ? "one record" : std::to_string(captures.size()) + " records";
  return failure(Problem::usage, "--segment", file + " holds " + count + ", none of them is '" + shown(named, 60) + "'",
                 captures.size() == 1 ? "leave --segment out" : "choose one of " + labels_of(captures));
}

}  // namespace

Result<Capture> chosen_capture(Recording recording, const std::string& file, const CaptureRequest& request,
                               std::vector<std::string>& notes) {
  auto* captures = std::get_if<std::vector<Capture>>(&recording);
  if (captures == nullptr) {
    return failure(Problem::usage, file,
                   "the file holds impedance against frequency, and " + request.test + " needs a waveform over time",
                   "measure this file with coilassay sweep");
  }
  if (captures->empty()) {
    return failure(Problem::not_a_capture, file, "no record was found in the file",
                   "check that the export is complete");
  }
  std::size_t chosen = 0;
  if (request.segment) {
    const Result<std::size_t> found = find_segment(*captures, *request.segment, shown(file));
    if (!found) return failure(found);
    chosen = *found;
  } else if (captures->size() > 1) {
    notes.push_back(shown(file) + " holds " + std::to_string(captures->size()) + " records (" + labels_of(*captures) +
                    "): the first was measured, --segment takes another");
  }
  return std::move((*captures)[chosen]);
}

Result<CapturesRead> read_captures(const CaptureRequest& request, const RunContext& context) {
  if (std::count(request.files.begin(), request.files.end(), "-") > 1) {
    return failure(Problem::usage, "-", "standard input can be read only once",
                   "give '-' once and name the other files");
  }
  ReadOptions reading = request.reading;
  reading.threads = context.threads;
  reading.progress = context.progress;

  CapturesRead read;
  for (const std::string& file : request.files) {
    Result<Recording> recording = read_recording(file, reading);
    if (!recording) return failure(recording);
    Result<Capture> capture = chosen_capture(std::move(*recording), file, request, read.notes);
    if (!capture) return failure(capture);
    read.captures.push_back(std::move(*capture));
  }
  return read;
}

void tell_unused_fixture(const BenchSetup& bench, std::vector<std::string>& notes) {
  if (!bench.fixture_set) return;
  notes.push_back("the bench sheet names the fixture set " + shown(*bench.fixture_set, 80) +
                  ", which only sweeps use: here leads and contacts are part of the result");
}

}  // namespace coilassay
