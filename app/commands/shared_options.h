// Options that several commands share, declared once.
#pragma once

#include "app/commands/option_table.h"

namespace coilassay {

// One function per group; later commands pick the groups that mean something to them.
OptionGroup reading_options();     // how a file is laid out
OptionGroup ring_down_options();   // what is connected across the coil
OptionGroup window_options();      // which part of the record
OptionGroup conditions_options();  // what the file cannot say
OptionGroup uncertainty_options();
OptionGroup output_options();      // --json, --figure, --report
OptionGroup measuring_options();   // everywhere, for commands that measure
OptionGroup everywhere_options();  // for all others

// Single options that stand in groups of their own.
Option voltage_column();
Option voltage_low_column();
Option voltage_gain();
Option bench_file();
Option segment();
Option delimiter_sign();
Option decimal_sign();
Option timebase();

}  // namespace coilassay
