// The result of every measuring command: values with intervals, where they come from, and what to watch out for.
#pragma once

#include <cmath>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "acquire/bench_sheet.h"
#include "acquire/capture.h"
#include "base/finding.h"
#include "base/quantity.h"

namespace coilassay {

/// A quantity that was established, with its 95 % interval.
struct Estimate {
  std::string symbol;            // of analysis/symbols.h
  Quantity quantity;
  double k = std::nan("");       // half-width over standard uncertainty
  double low = std::nan("");     // interval
  double high = std::nan("");
  double confidence = 0.95;
  std::optional<double> dof;     // absent: many
  std::optional<double> at_hz;
  std::optional<double> at_a;
  std::optional<double> reference_a;
  std::string definition;        // of a saturation current; else empty

  /// The larger half of the interval.
  double half_width() const { return std::fmax(high - quantity.value, quantity.value - low); }
};

/// A quantity of which only a limit is known.
struct Bound {
  std::string symbol;
  Unit unit = Unit::one;
  std::optional<double> at_least;
  std::optional<double> at_most;
  double confidence = 0.95;
};

/// One source of uncertainty of one quantity.
struct BudgetLine {
  std::string source;        // "capacitor", "fit", "time base", ...
  char kind = 'B';           // 'A' from the scatter of these data, 'B' from a stated tolerance or a default
  double u = 0;              // contribution to the quantity's standard uncertainty, in its unit
  double share = 0;          // of the variance, 0 .. 1
  bool common = false;       // the same error for every unit of a lot (standards, gains), not this unit's own
  std::string basis;         // "stated", "default: ...", "data"
};

struct SourceRecord {
  Source source;
  std::size_t samples = 0;
  double sample_interval_s = std::nan("");
};

struct Conditions {
  std::optional<double> frequency_hz, level_v, level_a, bias_a, peak_current_a, temperature_degc;
};

struct Correction {
  std::string name;
  double value = 0;
  Unit unit = Unit::one;
};

/// A caution about people and equipment, with the number from the user's own input.
struct Caution {
  std::string code;          // "stored_energy", "over_voltage", ...
  Severity severity = Severity::note;
  std::string message;
  double figure = 0;
  Unit unit = Unit::one;
  std::string basis;         // where the threshold comes from: "from memory", "read: ..."
};

struct ModelSummary {
  std::string name;
  std::map<std::string, Quantity> parameters;
  std::optional<std::string> runner_up;
  std::vector<std::string> left_out;
  std::optional<std::pair<double, double>> window_s;
  double residual_rms = std::nan("");
  double reduced_chi_square = std::nan("");
  bool converged = false;
};

/// Named columns of equal length: a curve, points, traces for figures.
struct TableColumn {
  std::string name;
  Unit unit = Unit::one;
  std::vector<double> values;
};
struct Table {
  std::string name;
  std::vector<TableColumn> columns;
};

/// One row of a table over frequency, level, bias or capacitor: estimates that hold there.
struct Point {
  std::optional<double> at_hz, level_a, bias_a, capacitance_f;
  std::vector<Estimate> estimates;
  std::string from;          // "model", "data" or a file name
  std::optional<std::size_t> index = std::nullopt;   // of a pulse, counted from 1
};

/// One measured input of a joint solution, beside what the solution says it should have been.
struct InputCheck {
  std::string item;                       // "primary_open", "ratio_forward", ...
  std::optional<double> at_hz;
  Quantity value;
  double predicted = std::nan("");
  double residual_u = std::nan("");       // (value - predicted) in standard uncertainties of the value
};

/// An equivalent circuit computed from the result: named elements with intervals ("T": L_a, L_b, L_m).
struct Equivalent {
  std::string name;
  std::vector<Estimate> elements;
  std::vector<std::vector<double>> correlation;   // between the elements, row by row
};

/// Inductances of several windings, row by row; U_h are half-widths of 95 % intervals.
struct InductanceMatrices {
  std::vector<std::string> ports;
  std::vector<std::vector<double>> inductance_h, U_h, coupling;
  bool positive_definite = false;
};

struct Measurement {
  std::string test;          // "ringdown"
  std::vector<SourceRecord> sources;
  Conditions conditions;
  std::vector<EquipmentItem> equipment;
  std::vector<Correction> corrections;
  std::vector<Estimate> estimates;
  std::vector<Bound> bounds;
  struct Correlation {
    std::string a, b;
    double value;
  };
  std::vector<Correlation> correlations;
  std::map<std::string, std::vector<BudgetLine>> budget;   // by symbol
  std::vector<Finding> findings;
  std::vector<Caution> cautions;
  std::optional<ModelSummary> model;
  std::vector<Point> points;
  std::vector<Point> pulses;         // of a ramp with several: what each one says
  std::vector<Table> tables;
  std::vector<InputCheck> inputs;            // of coupling
  std::vector<Equivalent> equivalents;       // of coupling
  std::optional<InductanceMatrices> matrices;
  std::vector<std::string> advice;   // sentences for people: what to try next

  const Estimate* find(std::string_view symbol) const;
  bool has_finding(std::string_view code) const;
};

/// The quantity whose presence means "measured" (exit 0): ringdown f_0, ramp L_0, sine Z, sweep L, coupling k,
/// resistance R_dc.
std::string_view leading_symbol(std::string_view test);

}  // namespace coilassay
