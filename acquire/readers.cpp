// The list of formats, and the one door to them.
#include "acquire/byte_source_digest.h"
#include "acquire/byte_source_head.h"
#include "acquire/byte_source_text.h"
#include "acquire/byte_source_unpack.h"
#include "acquire/reader.h"
#include "acquire/table_paired.h"
#include "acquire/table_reader.h"
#include "acquire/touchstone_reader.h"
#include "acquire/wav_reader.h"

namespace coilassay {
namespace {

constexpr std::size_t kLookAhead = 4096;

std::vector<std::unique_ptr<Reader>> all_readers() {
  std::vector<std::unique_ptr<Reader>> list;
  list.push_back(wav_reader());
  list.push_back(touchstone_reader());
  list.push_back(paired_table_reader());
  list.push_back(table_reader());  // takes whatever text the others leave
  return list;
}

void describe_source(Recording& recording, const Source& source, const std::string& encoding) {
  if (auto* captures = std::get_if<std::vector<Capture>>(&recording)) {
    for (Capture& capture : *captures) {
      capture.source = source;
      if (!encoding.empty()) capture.dialect.encoding = encoding;
    }
  } else {
    auto& sweep = std::get<Sweep>(recording);
    sweep.source = source;
    if (!encoding.empty()) sweep.dialect.encoding = encoding;
  }
}

/// "ring.csv.gz" is a "ring.csv" for the readers that look at the ending.
std::string without_packing(std::string name) {
  for (const std::string_view ending : {".gz", ".zst"}) {
    if (name.ends_with(ending)) name.resize(name.size() - ending.size());
  }
  return name;
}

/// The first reader that recognises the stream, on it.
Result<Recording> read_stream(ByteSource& bytes, const ReadOptions& options) {
  HeadedBytes headed(bytes);
  const auto head = headed.look_ahead(kLookAhead);
  if (!head) return failure(head);
  const TextStream text = as_text(headed, *head);
  HeadedBytes text_headed(text.bytes ? *text.bytes : headed);
  const auto text_head = text_headed.look_ahead(kLookAhead);
  if (!text_head) return failure(text_head);
  for (const auto& reader : readers()) {
    if (!reader->recognises(without_packing(bytes.name()), *text_head)) continue;
    auto recording = reader->read(text_headed, *text_head, options);
    if (recording) describe_source(*recording, {}, text.encoding);
    return recording;
  }
  return failure(Problem::not_a_capture, bytes.name(), "it is of no known format", "export the waveform as CSV");
}

}  // namespace

const std::vector<std::unique_ptr<Reader>>& readers() {
  static const std::vector<std::unique_ptr<Reader>> list = all_readers();
  return list;
}

Result<Recording> read_recording(const std::string& path, const ReadOptions& options) {
  const auto opened = open_bytes(path);
  if (!opened) return failure(opened);
  DigestedBytes stored(**opened);
  HeadedBytes headed(stored);
  const auto head = headed.look_ahead(kLookAhead);
  if (!head) return failure(head);
  if (head->empty()) return failure(Problem::not_a_capture, path, "the file is empty", "export the waveform again");
  const std::unique_ptr<ByteSource> plain = unpacked(headed, *head);
  auto recording = read_stream(plain ? *plain : headed, options);
  if (!recording) return recording;
  if (const auto rest = stored.drain(); !rest) return failure(rest);
  Source source;
  source.name = path;
  source.bytes = stored.bytes();
  source.sha256 = stored.digest();
  describe_source(*recording, source, {});
  return recording;
}

}  // namespace coilassay
