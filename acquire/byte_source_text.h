// Text in other encodings, as UTF-8 with line feeds.
#pragma once

#include <memory>
#include <string>
#include <string_view>

#include "acquire/reader.h"

namespace coilassay {

/// What has to be done to a stream so that it is UTF-8 with line feeds.
struct TextStream {
  std::unique_ptr<ByteSource> bytes;  // null when it is so already, or is no text
  std::string encoding;               // "utf-16le", "utf-16be"; empty when it is the stream's own
};

/// UTF-16 of both orders (told by the byte order mark, or by the zeros between the letters) and lines that end with a
/// carriage return alone. A lone surrogate is damaged, with its line.
/// @param inner  not owned, must live as long
TextStream as_text(ByteSource& inner, std::string_view first_bytes);

}  // namespace coilassay
