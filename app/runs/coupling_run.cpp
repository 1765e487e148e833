#include "app/runs/coupling_run.h"

#include <algorithm>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "analysis/coupling_contradiction.h"
#include "analysis/coupling_matrix.h"
#include "analysis/sine.h"
#include "app/runs/captures.h"
#include "app/runs/version.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "report/coupling_netlist.h"

namespace coilassay {

namespace {

constexpr std::size_t kLargestMatrixFile = 1 << 16;

bool looks_like_a_value(const std::string& text) {
  return !text.empty() && (std::isdigit(static_cast<unsigned char>(text[0])) != 0 || (text.size() > 1 && (text[0] == '.' || text[0] == '+' || text[0] == '-')));
}

/// The bench of a capture of two voltages: the channel that usually shows a current shows the open winding, as across 1 ohm.
BenchSetup ratio_bench(BenchSetup bench) {
  bench.current.shunt = StatedValue::exact(1, Unit::ohm);
  bench.current.shunt_inductance = StatedValue::exact(0, Unit::henry);
  bench.current.probe_corner.reset();
  return bench;
}

class Reading {
 public:
  Reading(const CouplingJob& job, const BenchSetup& bench, const RunContext& context) : job_(job), bench_(bench), context_(context) {}

  Result<CouplingInput> item(const CouplingJob::Item& item) {
    const Unit unit = is_ratio(item.item) ? Unit::one : Unit::henry;
    const std::string place(option_of(item.item));
    std::error_code ignored;
    const Result<CouplingValue> value = parse_coupling_value(item.given, unit, place);
    if (value) return CouplingInput{item.item, *value};
    const bool there = item.given == "-" || std::filesystem::exists(item.given, ignored);
    if (!there && looks_like_a_value(item.given)) return failure(value);
    Result<Recording> recording = read(item.given);
    if (!recording) return failure(recording);
    if (auto* sweep = std::get_if<Sweep>(&*recording)) return CouplingInput{item.item, std::move(*sweep)};
    Result<Capture> capture =
        chosen_capture(std::move(*recording), item.given,
                       {.files = {item.given}, .segment = job_.segment, .reading = bench_.reading, .test = "coupling"}, notes);
    if (!capture) return failure(capture);
    SineRequest request;
    request.bench = is_ratio(item.item) ? ratio_bench(bench_) : bench_;
    request.from_s = job_.from_s;
    request.to_s = job_.to_s;
    request.propagation = job_.propagation;
    request.propagation.by_trials = false;   // only slopes are taken over
    Result<Measurement> sine = measure_sine(*capture, request);
    if (!sine) return failure(sine);
    return CouplingInput{item.item, std::move(*sine)};
  }

  Result<Sweep> ports(const std::string& file) {
    Result<Recording> recording = read(file);
    if (!recording) return failure(recording);
    auto* sweep = std::get_if<Sweep>(&*recording);
    if (sweep != nullptr && sweep->ports >= 2) return std::move(*sweep);
    return failure(Problem::usage, file,
                   sweep != nullptr ? "the file has one port, and a coupling needs two" : "the file is a waveform, and it is not said of which connection",
                   "say what it is: --primary-open " + shown(file, 60) + ", or another of the items");
  }

  std::vector<std::string> notes;

 private:
  Result<Recording> read(const std::string& file) const {
    ReadOptions options = bench_.reading;
    options.threads = context_.threads;
    options.progress = context_.progress;
    return read_recording(file, options);
  }

  const CouplingJob& job_;
  const BenchSetup& bench_;
  const RunContext& context_;
};

/// A matrix of inductances as people type it: one row a line, commas or semicolons between; what lies below the diagonal may
/// be left out.
Result<std::vector<std::vector<StatedValue>>> read_matrix(const std::string& file) {
  std::ifstream in(file, std::ios::binary);
  std::string text(kLargestMatrixFile + 1, '\0');
  in.read(text.data(), static_cast<std::streamsize>(text.size()));
  text.resize(static_cast<std::size_t>(in.gcount()));
  if (text.empty()) return failure(Problem::unreadable, file, "the matrix cannot be read or is empty", "check the file's name");
  if (text.size() > kLargestMatrixFile) return failure(Problem::damaged, file, "the file is too large for a matrix of inductances", "one row a line: 100uH,50uH");
  std::vector<std::vector<StatedValue>> rows;
  std::istringstream lines(text);
  std::string line;
  for (std::size_t number = 1; std::getline(lines, line); ++number) {
    if (line.find_first_not_of(" \t\r") == std::string::npos || line.starts_with('#')) continue;
    std::vector<StatedValue> row;
    std::string cell;
    std::istringstream cells(line);
    const char separator = line.find(';') != std::string::npos ? ';' : ',';
    while (std::getline(cells, cell, separator)) {
      while (!cell.empty() && std::isspace(static_cast<unsigned char>(cell.back())) != 0) cell.pop_back();
      if (cell.find_first_not_of(" \t") == std::string::npos) {
        row.push_back(StatedValue::unstated(std::nan(""), Unit::henry));
        continue;
      }
      const Result<StatedValue> value = parse_value(cell, Unit::henry, file + ":" + std::to_string(number));
      if (!value) return failure(value);
      row.push_back(*value);
    }
    rows.push_back(std::move(row));
  }
  const std::size_t n = rows.size();
  for (std::size_t i = 0; i < n; ++i) {
    for (std::size_t j = i; j < n; ++j) {
      if (n >= 2 && j < rows[i].size() && std::isfinite(rows[i][j].value)) continue;
      return failure(Problem::damaged, file, "row " + std::to_string(i + 1) + " has no inductance in column " + std::to_string(j + 1),
                     "give one row for each winding, at least from the diagonal on: 100uH,50uH,20uH then ,200uH,30uH then ,,50uH");
    }
  }
  return rows;
}

InductanceMatrices matrices_of(const std::vector<std::vector<StatedValue>>& rows) {
  InductanceMatrices m;
  const std::size_t n = rows.size();
  for (std::size_t i = 0; i < n; ++i) {
    m.ports.push_back(std::to_string(i + 1));
    std::vector<double> l, u, k;
    for (std::size_t j = 0; j < n; ++j) {
      const StatedValue& v = rows[std::min(i, j)][std::max(i, j)];
      l.push_back(v.value);
      // A tolerance is its own half-width; a normal law reaches 1.96 standard uncertainties.
      u.push_back(v.law == Law::rectangular ? 0.95 * v.half_width : v.law == Law::normal ? 1.96 * v.standard_uncertainty
                  : v.law == Law::exact     ? 0.0
                                            : 0.95 * coupling_defaults::kValueRatio * std::fabs(v.value));
      k.push_back(i == j ? 1 : v.value / std::sqrt(rows[i][i].value * rows[j][j].value));
    }
    m.inductance_h.push_back(std::move(l));
    m.U_h.push_back(std::move(u));
    m.coupling.push_back(std::move(k));
  }
  return m;
}

Result<void> check_pair(const CouplingJob& job, std::size_t ports, const std::string& file) {
  if (job.pair.first < ports && job.pair.second < ports && job.pair.first != job.pair.second) return {};
  return failure(Problem::usage, "--pair", "there are no such two windings; " + shown(file) + " has " + std::to_string(ports),
                 "give two different numbers from 1 to " + std::to_string(ports));
}

}  // namespace

Result<CouplingValue> parse_coupling_value(const std::string& text, Unit unit, std::string_view place) {
  CouplingValue value;
  const std::size_t at = text.find('@');
  const Result<StatedValue> stated = parse_value(text.substr(0, at), unit, place);
  if (!stated) return failure(stated);
  value.value = *stated;
  if (stated->value == 0 || (unit == Unit::henry && stated->value < 0)) {
    return failure(Problem::bad_number, std::string(place), "an inductance or ratio of zero, or a negative inductance, says nothing about windings",
                   "a winding that resonates reads negative: measure at a lower frequency");
  }
  if (at != std::string::npos) {
    const Result<StatedValue> frequency = parse_value(text.substr(at + 1), Unit::hertz, place);
    if (!frequency) return failure(frequency);
    if (!(frequency->value > 0)) return failure(Problem::bad_number, std::string(place), "the frequency must be above zero", "write it like 100uH±1%@10kHz");
    value.frequency_hz = frequency->value;
  }
  return value;
}

Result<Measurement> run_coupling(const CouplingJob& job, const RunContext& context) {
  if (job.items.empty() && !job.ports_file && !job.matrix_file) {
    return failure(Problem::usage, "coupling", "nothing is said of what was measured",
                   "give items such as --primary-open 100uH±1% --primary-short 19uH±1%, or a two-port file");
  }
  if (job.from_s && job.to_s && *job.from_s >= *job.to_s) {
    return failure(Problem::usage, "--to", "the window ends before it begins", "give a time after that of --from");
  }
  if (job.ports_file && job.matrix_file) {
    return failure(Problem::usage, "--matrix", "a file of ports and a matrix are two sources of the same", "leave one of them out");
  }
  CouplingRequest request;
  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    request.bench = std::move(*sheet);
  }
  request.bench = overridden(std::move(request.bench), job.stated);
  if (job.accuracy) request.bench.impedance.ratio = StatedValue::unstated(*job.accuracy, Unit::one);
  request.at_hz = job.at_hz;
  request.dots = job.dots;
  request.pair = job.pair;
  request.link_inductance = job.link_inductance;
  request.link_resistance = job.link_resistance;
  if (job.winding_resistance) {
    request.winding_resistance_1 = job.winding_resistance->first;
    request.winding_resistance_2 = job.winding_resistance->second;
  }
  request.common_accuracy = job.common_accuracy;
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.traces = job.traces;
  Reading reading(job, request.bench, context);
  for (const CouplingJob::Item& item : job.items) {
    Result<CouplingInput> input = reading.item(item);
    if (!input) return failure(input);
    request.inputs.push_back(std::move(*input));
  }
  if (job.ports_file) {
    Result<Sweep> sweep = reading.ports(*job.ports_file);
    if (!sweep) return failure(sweep);
    if (auto fine = check_pair(job, sweep->ports, *job.ports_file); !fine) return failure(fine);
    request.ports = std::move(*sweep);
  }
  std::optional<InductanceMatrices> typed;
  std::vector<std::vector<StatedValue>> stated_rows;
  if (job.matrix_file) {
    const auto rows = read_matrix(*job.matrix_file);
    if (!rows) return failure(rows);
    if (auto fine = check_pair(job, rows->size(), *job.matrix_file); !fine) return failure(fine);
    typed = matrices_of(*rows);
    stated_rows = *rows;
    const auto [a, b] = job.pair;
    request.inputs.push_back({CouplingItem::primary_open, CouplingValue{(*rows)[a][a], std::nullopt}});
    request.inputs.push_back({CouplingItem::secondary_open, CouplingValue{(*rows)[b][b], std::nullopt}});
    request.inputs.push_back({CouplingItem::mutual_21, CouplingValue{(*rows)[std::min(a, b)][std::max(a, b)], std::nullopt}});
  }
  Result<Measurement> measured = measure_coupling(request);
  if (!measured) return measured;
  const bool reciprocal = !typed || judge_reciprocity(*measured, stated_rows, job.pair);
  if (typed && typed->ports.size() > 2 && reciprocal) judge_matrices(*measured, std::move(*typed));
  measured->advice.insert(measured->advice.end(), reading.notes.begin(), reading.notes.end());
  if (job.netlist_file) {
    if (const std::optional<std::string> netlist = coupling_netlist(*measured, program_name())) {
      if (const Result<void> written = context.write(*job.netlist_file, *netlist); !written) return failure(written);
    } else {
      measured->advice.push_back("no netlist was written: it needs L_1, L_2 and k");
    }
  }
  return measured;
}

Result<CouplingAdvice> run_coupling_advice(const CouplingJob& job, const CouplingAdviceJob& ask, const RunContext& context) {
  CouplingAdviceRequest request;
  if (ask.rough) {
    request = *ask.rough;
  } else {
    const bool anything = !job.items.empty() || job.ports_file;
    if (!anything) {
      return failure(Problem::usage, "--advise", "it is not said what the windings are like",
                     "give rough values, --rough 100uH,400uH,0.9, or what was measured so far");
    }
    CouplingJob so_far = job;
    so_far.netlist_file.reset();
    const Result<Measurement> measured = run_coupling(so_far, context);
    if (!measured) return failure(measured);
    const Estimate* l1 = measured->find("L_1");
    const Estimate* l2 = measured->find("L_2");
    const Estimate* k = measured->find("k");
    double coupling = k != nullptr ? std::fabs(k->quantity.value) : std::nan("");
    for (const Bound& bound : measured->bounds) {
      if (bound.symbol != "k") continue;
      coupling = bound.at_most ? *bound.at_most / 2 : (1 + bound.at_least.value_or(0)) / 2;
    }
    if (l1 == nullptr || l2 == nullptr || !std::isfinite(coupling)) {
      return failure(Problem::usage, "--advise", "what was measured so far does not tell L_1, L_2 and k", "give rough values: --rough 100uH,400uH,0.9");
    }
    request.l1_h = l1->quantity.value;
    request.l2_h = l2->quantity.value;
    request.k = coupling;
  }
  request.accuracy = job.accuracy.value_or(coupling_defaults::kValueRatio);
  request.ratio_accuracy = ask.ratio_accuracy.value_or(request.accuracy);
  request.wanted = ask.wanted;
  return advise_coupling(request);
}

}  // namespace coilassay
