// Writes captures in a format the readers read back, bit for bit.
#pragma once

#include <iosfwd>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay {

/// Writes a capture as a table: key,value rows for the settings (step and start of the time axis, full scale and
/// resolution of the channels, then what the capture brought along), a row of names with units, "time [s],CH1 [V]",
/// then samples as the shortest text that reads back to the same double; a missing one is "nan". Several channels share
/// the time column; a capture whose time has no origin has no time column, one with no step neither column nor
/// interval. The caller looks at the stream's state.
void write_capture_csv(std::ostream& out, const Capture& capture);

/// Writes a file whole or not at all: a new file beside the target is written, brought to the disk and renamed into
/// place; on any failure it is removed and the target is as it was. A link is kept, its target replaced; what is no
/// regular file (/dev/null, a pipe) is written into; "-" is standard output. Mode 0644 less the umask, or that of the
/// file replaced.
/// @return cannot_write: no such folder, no permission, a read-only file, a full disk, a size limit, an unread pipe.
Result<void> write_file(const std::string& path, const std::string& contents);

}  // namespace coilassay
