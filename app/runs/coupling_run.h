// Values, files and a bench in, a measured coupling, or advice on how to measure it, out.
#pragma once

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "analysis/coupling.h"
#include "analysis/coupling_advice.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct CouplingJob {
  struct Item {
    CouplingItem item;
    std::string given;                       // a value such as "100uH±1%@10kHz", or the name of a file
  };
  std::vector<Item> items;
  std::optional<std::string> ports_file;     // of two ports or more
  std::optional<std::string> matrix_file;    // inductances of several windings, typed
  std::pair<std::size_t, std::size_t> pair{0, 1};
  std::vector<double> at_hz;
  std::optional<Dots> dots;
  std::optional<StatedValue> link_inductance, link_resistance;
  std::optional<std::pair<StatedValue, StatedValue>> winding_resistance;
  std::optional<double> accuracy, common_accuracy;   // of the impedances in files; shared by all
  std::optional<std::string> segment;
  std::optional<std::string> bench_sheet;    // path
  BenchSetup stated;                         // replaces what the sheet says
  std::optional<double> from_s, to_s;        // window of sine captures
  PropagationOptions propagation;
  bool traces = false;
  std::optional<std::string> netlist_file;
};

/// Reads what the items name and measures. Each item is read as a value first, and else as a file.
Result<Measurement> run_coupling(const CouplingJob& job, const RunContext& context);

struct CouplingAdviceJob {
  std::optional<CouplingAdviceRequest> rough;   // absent: what the items of the job give
  std::optional<double> ratio_accuracy, wanted;
};

/// Advice from rough values or, without them, from what was measured so far. usage when neither tells L_1, L_2 and k.
Result<CouplingAdvice> run_coupling_advice(const CouplingJob& job, const CouplingAdviceJob& ask, const RunContext& context);

/// "100uH±1%@10kHz": a value with its tolerance and, behind @, the frequency at which it was read.
Result<CouplingValue> parse_coupling_value(const std::string& text, Unit unit, std::string_view place);

}  // namespace coilassay
