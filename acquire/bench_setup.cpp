// What the command line says over a bench sheet, and the channels both name.
#include <fmt/format.h>

#include <cmath>

#include "acquire/bench_sheet.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

template <class T>
void replace(std::optional<T>& base, const std::optional<T>& over) {
  if (over) base = over;
}

void replace(ChannelSetup& base, const ChannelSetup& over) {
  replace(base.column, over.column);
  replace(base.low_column, over.low_column);
  replace(base.gain, over.gain);
  replace(base.full_scale, over.full_scale);
  replace(base.input_capacitance, over.input_capacitance);
  replace(base.input_resistance, over.input_resistance);
  replace(base.shunt, over.shunt);
  replace(base.shunt_inductance, over.shunt_inductance);
  replace(base.skew, over.skew);
  replace(base.probe_corner, over.probe_corner);
}

}  // namespace

BenchSetup overridden(BenchSetup base, const BenchSetup& over) {
  replace(base.voltage, over.voltage);
  replace(base.current, over.current);
  replace(base.timebase, over.timebase);
  if (!over.capacitors.empty()) base.capacitors = over.capacitors;
  replace(base.across_resistance, over.across_resistance);
  replace(base.across_capacitance, over.across_capacitance);
  replace(base.winding_resistance, over.winding_resistance);
  replace(base.level, over.level);
  replace(base.bias, over.bias);
  replace(base.temperature, over.temperature);
  replace(base.fixture_set, over.fixture_set);
  replace(base.impedance.ratio, over.impedance.ratio);
  replace(base.impedance.series_floor, over.impedance.series_floor);
  replace(base.impedance.parallel_floor, over.impedance.parallel_floor);
  replace(base.impedance.scattering, over.impedance.scattering);
  if (!over.equipment.empty()) base.equipment = over.equipment;
  // How the reading is done (threads, progress) is not on the sheet: the caller's stands.
  ReadOptions reading = over.reading;
  if (!reading.delimiter) reading.delimiter = base.reading.delimiter;
  if (!reading.decimal) reading.decimal = base.reading.decimal;
  if (!reading.sample_interval_s) reading.sample_interval_s = base.reading.sample_interval_s;
  if (reading.columns.empty()) reading.columns = base.reading.columns;
  if (reading.skip == 0) reading.skip = base.reading.skip;
  base.reading = reading;
  return base;
}

namespace {

/// "1: time, 2: CH1 [V], 3: CH2 [V]".
std::string columns_of(const Capture& capture) {
  constexpr std::size_t kMost = 12;
  std::string list;
  const bool has_time = !std::isnan(capture.time.step_s) || !capture.time.uniform();
  bool first_taken = false;
  for (const Channel& channel : capture.channels) first_taken = first_taken || channel.column == 1;
  if (has_time && !first_taken) list = "1: time";
  std::size_t named = 0;
  for (const Channel& channel : capture.channels) {
    if (++named > kMost) {
      list += fmt::format(" and {} more", capture.channels.size() - kMost);
      break;
    }
    if (!list.empty()) list += ", ";
    list += fmt::format("{}: {}", channel.column, shown(channel.name, 40));
    if (channel.unit_stated) list += fmt::format(" [{}]", symbol(channel.unit));
  }
  return list.empty() ? "no channel" : list;
}

}  // namespace

Result<std::size_t> find_channel(const Capture& capture, const std::string& column, const std::string& option) {
  std::vector<std::size_t> named;
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (capture.channels[i].name == column) named.push_back(i);
  }
  if (named.size() == 1) return named.front();
  if (named.size() > 1) {
    return failure(
        Problem::ambiguous, capture.source.name,
        fmt::format("{} columns are called '{}'; the file has {}", named.size(), shown(column), columns_of(capture)),
        fmt::format("give the position: {} {}", option, capture.channels[named.front()].column));
  }
  for (std::size_t i = 0; i < capture.channels.size(); ++i) {
    if (capture.channels[i].column != 0 && std::to_string(capture.channels[i].column) == column) return i;
  }
  std::vector<std::string_view> names;
  for (const Channel& channel : capture.channels) names.push_back(channel.name);
  const std::string_view near = nearest(column, names);
  std::string remedy;
  if (!near.empty()) {
    const std::string name = shown(near, 40);
    const bool plain = name.find_first_not_of("abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_-.:/") ==
                       std::string::npos;
    remedy = fmt::format("did you mean {} {}?", option, plain ? name : "\"" + name + "\"");
  } else if (!capture.channels.empty()) {
    remedy = fmt::format("name a column, or give its position: {} {}", option, capture.channels.front().column);
  } else {
    remedy = "check that the export has a column of samples";
  }
  return failure(Problem::missing_column, capture.source.name,
                 fmt::format("no column '{}'; the file has {}", shown(column), columns_of(capture)), std::move(remedy));
}

}  // namespace coilassay
