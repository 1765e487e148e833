#include "acquire/table_head.h"

#include <utf8cpp/utf8.h>

#include <algorithm>

#include "acquire/byte_source_head.h"
#include "acquire/byte_source_lines.h"
#include "acquire/byte_source_text.h"
#include "acquire/byte_source_unpack.h"
#include "acquire/table_units.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

/// Lines in which preamble and dialect are looked for.
constexpr std::size_t kLinesLookedAt = 4000;

constexpr std::size_t kLookAhead = 4096;
constexpr std::string_view kByteOrderMark = "\xEF\xBB\xBF";

/// A large-file store leaves a note in place of a file that was not fetched.
bool is_placeholder(std::string_view text) {
  return text.size() < 1024 && text.starts_with("version ") && text.find("\noid sha256:") != std::string_view::npos &&
         text.find("\nsize ") != std::string_view::npos;
}

std::string key_text(const ColumnHeading& heading) {
  return heading.unit ? heading.name + " [" + column_unit_text(*heading.unit) + "]" : heading.name;
}

/// Whether a key that says so is understood as this heading.
bool says_the_same(const std::string& key, const ColumnHeading& heading) {
  const Heading understood = understand_heading(key);
  return key != "-" && understood.name == heading.name && understood.unit == heading.unit && shown(key) == key;
}

}  // namespace

Result<TableHead> understand_head(const std::string& name, std::string_view text, const ReadOptions& options) {
  if (text.starts_with(kByteOrderMark)) text.remove_prefix(kByteOrderMark.size());
  if (text.empty()) return failure(Problem::not_a_capture, name, "the file is empty", "export the waveform again");
  if (text.find('\0') != std::string_view::npos) {
    return failure(Problem::not_a_capture, name, "it is a binary file, not a table in text", "export the waveform as CSV");
  }
  if (is_placeholder(text)) {
    return failure(Problem::not_a_capture, name, "it is the placeholder of a large-file store, not the data themselves",
                   "fetch the real file from the store it belongs to");
  }
  TableHead head;
  head.lines = lines_of(text, true);
  std::vector<TableLine>& lines = head.lines;
  if (lines.size() > kLinesLookedAt) lines.resize(kLinesLookedAt);
  lines.erase(lines.begin(), lines.begin() + static_cast<std::ptrdiff_t>(std::min(options.skip, lines.size())));
  const auto dialect = find_dialect(name, lines, options);
  if (!dialect) return failure(dialect);
  head.dialect = *dialect;
  const std::string_view preamble = text.substr(0, static_cast<std::size_t>(lines[dialect->first_row].text.data() - text.data()));
  head.utf8 = utf8::is_valid(preamble.begin(), preamble.end());
  head.header = understand_header(lines, head.dialect);
  return head;
}

Result<std::vector<std::string>> reading_key_columns(const std::string& path, const ReadOptions& options) {
  const auto opened = open_bytes(path);
  if (!opened) return failure(opened);
  HeadedBytes stored(**opened);
  const auto first = stored.look_ahead(kLookAhead);
  if (!first) return failure(first);
  const std::unique_ptr<ByteSource> plain = unpacked(stored, *first);
  HeadedBytes headed(plain ? *plain : stored);
  const auto plain_first = headed.look_ahead(kLookAhead);
  if (!plain_first) return failure(plain_first);
  const TextStream text = as_text(headed, *plain_first);
  LineBlocks blocks(text.bytes ? *text.bytes : headed);
  LineBlock block;
  if (const auto got = blocks.next(block); !got) return failure(got);
  const auto head = understand_head(path, block.text(), options);
  if (!head) return failure(head);

  std::vector<std::string> keys;
  for (const ColumnHeading& heading : head->header.columns) {
    const bool stateable = !heading.name.empty() && (!heading.unit || !column_unit_text(*heading.unit).empty());
    std::string key = stateable ? key_text(heading) : std::string();
    if (!stateable || !says_the_same(key, heading)) return std::vector<std::string>();
    keys.push_back(std::move(key));
  }
  return keys;
}

}  // namespace coilassay
