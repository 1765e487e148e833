// Recordings of a sound card: the cheapest two-channel digitiser a bench has.
#pragma once

#include <memory>

#include "acquire/reader.h"

namespace coilassay {

/// RIFF/WAVE and RF64, through libsndfile. Samples are fractions of full scale (Unit::one, full_scale 1): what a volt is, the
/// bench sheet says. The origin of time is not known.
std::unique_ptr<Reader> wav_reader();

}  // namespace coilassay
