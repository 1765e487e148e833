// The process the program runs in: its streams, signals, environment and clock.
#pragma once

#include "app/commands/console.h"

namespace coilassay {

/// Before anything else: a reader that goes away ends no one, and a standard stream that is closed stays so, rather
/// than becoming the next file that is opened.
void prepare_process();

Surroundings surroundings_of_process();

UtcTime system_clock_now();

}  // namespace coilassay
