// What is said about four-wire readings beside the numbers.
#pragma once

#include <vector>

#include "analysis/resistance.h"
#include "analysis/resistance_line.h"
#include "analysis/resistance_readings.h"

namespace coilassay {

void describe_readings(Measurement& result, const std::vector<Capture>& captures, const ResistanceReadings& readings,
                       const ResistanceRequest& request);

/// Whether there is a resistance to go on with; otherwise the refusal is among the findings.
bool note_refusals(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line);

/// Takes R_dc back when its uncertainty exceeds it; whether it stayed.
bool withhold_unresolved_resistance(Measurement& result);

void add_model(Measurement& result, const ResistanceLine& line, const ResistanceRequest& request);

/// thermal_offset, warming, temperature_unknown.
void note_readings(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line,
                   const ResistanceRequest& request);

/// Tables for a figure: readings and line (current_A, voltage_V), order (time_s or reading; resistance_ohm, trend_ohm).
void add_resistance_traces(Measurement& result, const ResistanceReadings& readings, const ResistanceLine& line);

}  // namespace coilassay
