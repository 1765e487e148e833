// Tables of a simulator that put two numbers into one cell.
#pragma once

#include <memory>

#include "acquire/reader.h"

namespace coilassay {

/// Tab-separated tables whose cells hold "(-3.5dB,45.1°)" or "1.5e+1,2.5e-2" (real and imaginary part). Each such cell becomes
/// two, with headings that say what they are; the rest is the business of the table reader.
std::unique_ptr<Reader> paired_table_reader();

}  // namespace coilassay
