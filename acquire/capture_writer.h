// Writes captures in a format the readers read back, bit for bit.
#pragma once

#include <iosfwd>
#include <string>
#include <vector>

#include "acquire/capture.h"
#include "base/result.h"

namespace coilassay {

/// Writes a capture as a table: key,value rows for the settings, a names row with units "time [s],CH1 [V]", then samples as
/// shortest round-trip numbers. Several channels share the time column.
void write_capture_csv(std::ostream& out, const Capture& capture);

/// Writes text beside the target and renames it into place; cannot_write on any failure, the target then untouched.
/// "-" is standard output.
Result<void> write_file(const std::string& path, const std::string& contents);

}  // namespace coilassay
