// Resistance of a winding from four-wire readings of voltage and current.
#pragma once

#include <optional>
#include <string>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "analysis/budget.h"
#include "analysis/measurement.h"
#include "base/result.h"

namespace coilassay {

/// How the resistance of a winding's metal changes: R = R_20 (1 + coefficient (T - 20 degC)), and the same law seen from
/// where it would reach zero, R proportional to T + rise_constant, as the rules for a temperature rise write it.
struct WindingMetal {
  std::string name = "copper";
  StatedValue coefficient;      // per kelvin at 20 degC
  double rise_constant = 0;     // K
};

/// Copper: 0.00393/K (IEC 60028:1925, clause 1; from memory, 1/0.00393 - 20 = 234.45 computed); aluminium: 0.00403/K (hard
/// drawn, IEC 60889; from memory).
WindingMetal copper();
WindingMetal aluminium();
/// Any other: the rise constant follows as 1/coefficient - 20.
WindingMetal metal_of(const StatedValue& coefficient);

// Both constants for copper are in use (from memory): the rise they give differs by 0.2 %.
inline constexpr double kRiseConstantAppliances = 234.5;  // IEC 60335-1, IEC 61558-1, transformer standards of the IEEE
inline constexpr double kRiseConstantMachines = 235.0;    // IEC 60034-1, IEC 60076
inline constexpr double kRiseConstantAluminium = 225.0;

/// The same winding, cold and at rest.
struct ColdWinding {
  StatedValue resistance, temperature;
};

struct ResistanceRequest {
  BenchSetup bench;
  WindingMetal metal = copper();
  std::optional<ColdWinding> cold;   // then the readings are those of the hot winding
  PropagationOptions propagation;
  bool traces = false;               // add what a figure needs: readings, line, order
};

/// Default tolerances (docs/uncertainty.md): what enters when something was left unsaid.
namespace resistance_defaults {
inline constexpr double kMeterVoltageRatio = 0.005;      // a hand-held meter on its direct-voltage range
inline constexpr double kMeterCurrentRatio = 0.01;       // the same on its current range
inline constexpr double kScopeStep_s = 1e-3;             // readings closer than this come from an oscilloscope: ...
inline constexpr double kScopeZeroRatio = 0.02;          // ... its zero, of the largest reading; gains as in driven_defaults
inline constexpr double kThermalOffset_v = 10e-6;        // joints of unlike metals some kelvin apart
inline constexpr double kZeroSteps = 2;                  // of a meter: so many of its last digit
inline constexpr double kTemperature_k = 2;              // a room's thermometer, and a coil nearly as warm as the room
inline constexpr double kCoefficientRatio = 0.01;        // purity and drawing of the wire
inline constexpr double kColdRatio = 0.01;               // a cold resistance stated without tolerance
}  // namespace resistance_defaults

/// R_dc; with the winding's temperature stated also R_dc_20; with a cold resistance T_winding and T_rise instead.
///
/// Model: V = V_th + R I. With both polarities (or readings with the current off) R is the change of V over the change of I between the
/// groups, which the thermal offset and a zero error of either meter do not enter, nor the noise of I; readings weigh by the
/// scatter of their polarity. With one polarity R = V/I, the finding `thermal_offset` and an allowance in the budget.
/// A change of R while reading is fitted along; when chance does not explain it, it is the finding `warming` and both ends of
/// it are in the interval. Several captures are readings one after the other. Derivations: docs/formulas.md#resistance.
///
/// @return a Measurement without R_dc whose findings say why when there are too few readings, no current, or R comes out
///         negative; a failure for columns, units and options that cannot be used (see driven_record()).
Result<Measurement> measure_resistance(const std::vector<Capture>& captures, const ResistanceRequest& request);

}  // namespace coilassay
