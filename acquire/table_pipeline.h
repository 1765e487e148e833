// Blocks of a table read by several threads and joined in the order of the file.
#pragma once

#include <cstddef>
#include <functional>

#include "acquire/byte_source_lines.h"
#include "acquire/table_block.h"

namespace coilassay {

/// Reads `first` from byte `from` on, then every block of `rest`, and hands the columns to `join` in the order of the
/// file, from the calling thread. The blocks do not depend on the number of threads, so neither does the result. The
/// first failure of reading or joining ends it.
Result<void> read_blocks(LineBlock first, std::size_t from, LineBlocks& rest, const TableLayout& layout, unsigned threads,
                         const std::function<Result<void>(const BlockColumns&)>& join);

}  // namespace coilassay
