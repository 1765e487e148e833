// The list of formats, and the one door to them.
#include "acquire/byte_source_digest.h"
#include "acquire/reader.h"
#include "acquire/table_reader.h"

namespace coilassay {
namespace {

constexpr std::size_t kLookAhead = 4096;

std::vector<std::unique_ptr<Reader>> all_readers() {
  std::vector<std::unique_ptr<Reader>> list;
  list.push_back(table_reader());  // takes whatever text the others leave
  return list;
}

void set_source(Recording& recording, const Source& source) {
  if (auto* captures = std::get_if<std::vector<Capture>>(&recording)) {
    for (Capture& capture : *captures) capture.source = source;
  } else {
    std::get<Sweep>(recording).source = source;
  }
}

}  // namespace

const std::vector<std::unique_ptr<Reader>>& readers() {
  static const std::vector<std::unique_ptr<Reader>> list = all_readers();
  return list;
}

Result<Recording> read_recording(const std::string& path, const ReadOptions& options) {
  const auto opened = open_bytes(path);
  if (!opened) return failure(opened);
  DigestedBytes bytes(**opened);
  const auto head = bytes.look_ahead(kLookAhead);
  if (!head) return failure(head);
  if (head->empty()) return failure(Problem::not_a_capture, path, "the file is empty", "export the waveform again");
  for (const auto& reader : readers()) {
    if (!reader->recognises(path, *head)) continue;
    auto recording = reader->read(bytes, *head, options);
    if (!recording) return recording;
    if (const auto rest = bytes.drain(); !rest) return failure(rest);
    Source source;
    source.name = path;
    source.bytes = bytes.bytes();
    source.sha256 = bytes.digest();
    set_source(*recording, source);
    return recording;
  }
  return failure(Problem::not_a_capture, path, "it is of no known format", "export the waveform as CSV");
}

}  // namespace coilassay
