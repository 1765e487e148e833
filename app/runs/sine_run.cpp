#include "app/runs/sine_run.h"

#include <cmath>
#include <filesystem>
#include <fstream>
#include <sstream>

#include "analysis/sine.h"
#include "analysis/skew.h"
#include "app/runs/captures.h"
#include "base/number_text.h"

namespace coilassay {

namespace {

/// A value as a bench sheet has it: "0.1 ohm ± 0.001 ohm".
std::string sheet_text(const StatedValue& v) {
  const std::string unit = v.unit == Unit::one ? "" : " " + std::string(symbol(v.unit));
  std::string text = to_shortest(v.value) + unit;
  if (v.law == Law::exact) text += " ± 0 %";
  if (v.law == Law::rectangular) text += " ± " + to_shortest(v.half_width) + unit;
  if (v.law == Law::normal) text += " ± " + to_shortest(2 * v.standard_uncertainty) + unit + " (k=2)";
  return text;
}

std::string quoted(const std::string& text) {
  std::string safe;
  for (const char c : text) {
    if (c == '"' || c == '\\') safe += '\\';
    safe += c;
  }
  return "\"" + safe + "\"";
}

/// What the command line said, as a sheet: for a bench that has none yet.
std::string sheet_of(const BenchSetup& bench) {
  std::string text;
  const auto line = [&](const std::string& key, const std::optional<StatedValue>& value) {
    if (value) text += key + " = " + quoted(sheet_text(*value)) + "\n";
  };
  const auto columns = [&](const ChannelSetup& channel) {
    if (channel.column) text += "column = " + quoted(*channel.column) + "\n";
    if (channel.low_column) text += "low_column = " + quoted(*channel.low_column) + "\n";
    line("gain", channel.gain);
  };
  text += "[voltage]\n";
  columns(bench.voltage);
  text += "\n[current]\n";
  columns(bench.current);
  line("shunt", bench.current.shunt);
  line("shunt_inductance", bench.current.shunt_inductance);
  line("probe_corner", bench.current.probe_corner);
  if (bench.timebase) text += "\n[timebase]\ntolerance = " + quoted(sheet_text(*bench.timebase)) + "\n";
  return text;
}

/// "4.1e-09 s ± 1.2e-09 s (k=2)", to the digits the uncertainty leaves.
std::string skew_text(const Estimate& skew) {
  const double expanded = 2 * skew.quantity.standard_uncertainty;
  const double digit = std::pow(10.0, std::floor(std::log10(std::fmax(expanded, 1e-18))) - 1);
  const auto rounded = [digit](double v) { return to_shortest(std::stod(to_shortest(std::round(v / digit))) * digit); };
  // Rounding in steps of a power of ten leaves binary dust; nine digits of a nanosecond are enough.
  const auto in_ns = [&](double v) {
    std::ostringstream text;
    text.precision(6);
    text << std::stod(rounded(v)) * 1e9;
    return text.str();
  };
  return in_ns(skew.quantity.value) + " ns ± " + in_ns(std::ceil(expanded / digit) * digit) + " ns (k=2)";
}

Result<std::string> old_sheet(const SineJob& job) {
  if (!job.bench_sheet) return sheet_of(job.stated);
  std::ifstream in(*job.bench_sheet, std::ios::binary);
  std::ostringstream text;
  text << in.rdbuf();
  if (!in) return failure(Problem::unreadable, *job.bench_sheet, "the sheet cannot be read again", "check the file");
  return text.str();
}

Result<void> check_bench_out(const SineJob& job) {
  if (!job.bench_out || *job.bench_out == "-") return {};
  std::error_code ignored;
  if (!std::filesystem::exists(*job.bench_out, ignored)) return {};
  return failure(Problem::cannot_write, *job.bench_out, "the file exists, and a sheet is never edited",
                 "give the name of a new file to --bench-out");
}

Result<Measurement> run_skew(const SineJob& job, SineRequest request, const Capture& capture, const RunContext& context) {
  if (auto fine = check_bench_out(job); !fine) return failure(fine);
  Result<Measurement> measured = measure_skew(capture, {std::move(request), *job.of_resistor, job.resistor_inductance});
  if (!measured) return measured;
  const Estimate* skew = measured->find("skew");
  if (skew == nullptr) return measured;
  const std::string text = skew_text(*skew);
  measured->advice.push_back("state it on the bench sheet, section [current]: skew = \"" + text + "\"");
  if (!job.bench_out) return measured;
  const Result<std::string> sheet = old_sheet(job);
  if (!sheet) return failure(sheet);
  if (auto written = context.write(*job.bench_out, sheet_with_skew(*sheet, text)); !written) return failure(written);
  return measured;
}

}  // namespace

std::string sheet_with_skew(const std::string& sheet, const std::string& skew) {
  const std::string line = "skew = \"" + skew + "\"\n";
  std::string result, row, section;
  std::istringstream in(sheet);
  bool placed = false;
  while (std::getline(in, row)) {
    const std::size_t at = row.find_first_not_of(" \t");
    const std::string_view bare = at == std::string::npos ? std::string_view() : std::string_view(row).substr(at);
    if (bare.starts_with('[')) section = std::string(bare.substr(0, bare.find(']') + 1));
    const std::size_t end_of_key = bare.find_first_of(" \t=");
    if (section == "[current]" && bare.substr(0, end_of_key) == "skew") continue;
    result += row + "\n";
    if (section == "[current]" && bare.starts_with('[')) {
      result += line;
      placed = true;
    }
  }
  if (!placed) result += std::string(result.empty() ? "" : "\n") + "[current]\n" + line;
  return result;
}

Result<Measurement> run_sine(const SineJob& job, const RunContext& context) {
  if (job.from_s && job.to_s && *job.from_s >= *job.to_s) {
    return failure(Problem::usage, "--to", "the window ends before it begins", "give a time after that of --from");
  }
  if (!job.of_resistor && (job.bench_out || job.resistor_inductance)) {
    return failure(Problem::usage, job.bench_out ? "--bench-out" : "--resistor-inductance",
                   "it belongs to the capture of a resistor", "add --of-resistor 50ohm±1%, or leave it out");
  }
  if (job.of_resistor && (job.files.size() > 1 || !job.biases.empty())) {
    return failure(Problem::usage, "--of-resistor", "the skew is found from one capture without bias",
                   "give one file, and no --bias");
  }
  if (job.of_resistor && job.turns_ratio) {
    return failure(Problem::usage, "--turns-ratio", "a resistor has no sense winding", "leave out --turns-ratio");
  }
  BenchSetup bench;
  if (job.bench_sheet) {
    Result<BenchSetup> sheet = read_bench_sheet(*job.bench_sheet);
    if (!sheet) return failure(sheet);
    bench = std::move(*sheet);
  }
  SineRequest request;
  request.bench = overridden(std::move(bench), job.stated);
  request.from_s = job.from_s;
  request.to_s = job.to_s;
  request.turns_ratio = job.turns_ratio;
  request.propagation = job.propagation;
  request.propagation.threads = context.threads;
  request.traces = job.traces;
  if (job.files.size() > 1) {
    request.biases = job.biases;
  } else if (job.biases.size() == 1) {
    request.bench.bias = job.biases.front();
  } else if (job.biases.size() > 1) {
    return failure(Problem::usage, "--bias", std::to_string(job.biases.size()) + " bias currents were given for one file",
                   "give one for each file, in the same order");
  }
  Result<CapturesRead> read = read_captures(
      {.files = job.files, .segment = job.segment, .reading = request.bench.reading, .test = "sine"}, context);
  if (!read) return failure(read);
  tell_unused_fixture(request.bench, read->notes);
  Result<Measurement> measured = job.of_resistor               ? run_skew(job, request, read->captures.front(), context)
                                 : read->captures.size() == 1 ? measure_sine(read->captures.front(), request)
                                                              : measure_sine_points(read->captures, request);
  if (!measured) return measured;
  measured->advice.insert(measured->advice.end(), read->notes.begin(), read->notes.end());
  return measured;
}

}  // namespace coilassay
