#include "acquire/table_settings.h"

#include <algorithm>
#include <cmath>
#include <initializer_list>

#include "acquire/number_scan.h"

namespace coilassay {
namespace {

constexpr std::size_t kMostSettings = 1000;

void keep(std::map<std::string, std::string>& settings, const std::string& key, const std::string& value) {
  if (key.empty() || settings.size() >= kMostSettings) return;
  settings.emplace(key, value);  // the first of two equal keys stands
}

/// Letters and digits only, lower case: "Sample Interval", "SAMPLE_INTERVAL" and "sample-interval" are one.
std::string reduced(std::string_view text) {
  std::string out;
  for (const char c : lower_case(text)) {
    if ((c >= 'a' && c <= 'z') || (c >= '0' && c <= '9')) out += c;
  }
  return out;
}

bool one_of(std::string_view text, std::initializer_list<std::string_view> words) {
  return std::find(words.begin(), words.end(), text) != words.end();
}

struct Stated {
  double value;                    // in SI when a unit was given
  std::optional<ColumnUnit> unit;  // from the value or the key
};

/// "4e-09", "4 ns", "4.0,ns", "50 MSa/s", with the unit perhaps in the key: "Sample interval (us)".
std::optional<Stated> stated_value(std::string_view value, const std::optional<ColumnUnit>& key_unit, char decimal) {
  value = bare_cell(value);
  std::size_t end = 0;  // the number is the longest beginning that is one
  for (std::size_t n = 1; n <= value.size(); ++n) {
    if (read_cell(value.substr(0, n), decimal).kind == CellKind::number) end = n;
  }
  if (end == 0) return std::nullopt;
  std::string unit_text(bare_cell(value.substr(end)));
  for (const std::string_view per_sample : {"Sa/s", "S/s", "Sps", "sps", "SPS", "samples/s"}) {  // a rate: its prefix with hertz
    const std::size_t at = unit_text.find(per_sample);
    if (at != std::string::npos) unit_text = unit_text.substr(0, at) + "Hz";
  }
  std::optional<ColumnUnit> unit = key_unit;
  if (!unit_text.empty()) unit = understand_column_unit(unit_text);
  if (!unit_text.empty() && !unit) return std::nullopt;
  const CellValue number = read_cell(value.substr(0, end), decimal, unit ? unit->exponent : 0);
  if (number.kind != CellKind::number) return std::nullopt;
  return Stated{number.value, unit};
}

bool is_time(const Stated& stated) { return !stated.unit || stated.unit->unit == Unit::second; }
bool is_rate(const Stated& stated) { return !stated.unit || stated.unit->unit == Unit::hertz; }

}  // namespace

void read_setting(std::string_view line, char delimiter, std::map<std::string, std::string>& settings) {
  line = bare_cell(line);
  while (!line.empty() && (line.front() == '#' || line.front() == '!' || line.front() == '%')) {
    line = bare_cell(line.substr(1));
  }
  std::vector<std::string> cells;
  for (const std::string_view cell : cells_of(line, delimiter == ' ' ? '\t' : delimiter)) cells.push_back(cell_text(cell));
  while (!cells.empty() && cells.back().empty()) cells.pop_back();
  if (cells.empty()) return;
  if (cells.size() == 1) {
    const std::string& only = cells.front();
    const std::size_t at = only.find_first_of(":=");
    if (at == std::string::npos) return keep(settings, only, "");
    return keep(settings, std::string(bare_cell(std::string_view(only).substr(0, at))),
                std::string(bare_cell(std::string_view(only).substr(at + 1))));
  }
  std::string key = cells.front();
  while (key.ends_with(':') || key.ends_with('=') || key.ends_with(' ')) key.pop_back();
  if (cells.size() == 3 && understand_column_unit(cells[2])) return keep(settings, key, cells[1] + " " + cells[2]);
  keep(settings, key, cells[1]);
}

void interpret_settings(TableHeader& header, char decimal) {
  std::optional<double> rate_hz;
  for (const auto& [written_key, value] : header.settings) {
    // "CH1:full scale": the channel in front of the key.
    std::string key_text = written_key;
    std::string channel;
    if (const std::size_t at = key_text.find(':'); at != std::string::npos && at > 0 && at + 1 < key_text.size()) {
      channel = key_text.substr(0, at);
      key_text = key_text.substr(at + 1);
    }
    const Heading heading = understand_heading(std::string(bare_cell(key_text)));
    const std::string key = reduced(heading.name);
    if (key == "segment" && channel.empty()) header.segment = value;
    if (one_of(key, {"verticalunits", "verticalunit", "yunit", "yunits", "unity"})) header.vertical_unit = understand_column_unit(value);
    if (one_of(key, {"source", "trace", "waveformsource"}) && channel.empty()) header.source = value;
    const auto stated = stated_value(value, heading.unit, decimal);
    if (!stated) continue;
    if (one_of(key, {"interval", "sampleinterval", "samplinginterval", "sampletime", "samplingtime", "sampleperiod",
                     "samplingperiod", "increment", "xincrement", "xincr", "timeincrement", "timeinterval", "timestep", "dt",
                     "deltat", "tinc", "hresolution", "horizontalresolution"}) &&
        is_time(*stated) && stated->value > 0) {
      header.interval_s = stated->value;
    } else if (one_of(key, {"samplerate", "samplingrate", "samplefrequency", "samplingfrequency", "fs", "sps"}) &&
               is_rate(*stated) && stated->value > 0) {
      rate_hz = stated->value;
    } else if (one_of(key, {"start", "starttime", "xorigin", "xzero", "timeorigin", "origin", "firstsample", "triggeroffset",
                            "t0", "xstart", "timestart", "timezero", "firstpoint"}) &&
               is_time(*stated)) {
      header.start_s = stated->value;
    } else if (one_of(key, {"recordlength", "samples", "points", "numberofpoints", "numberofsamples", "samplecount", "length",
                            "memorylength", "waveformpoints", "npoints", "count"}) &&
               !stated->unit && stated->value == std::floor(stated->value)) {
      header.count = stated->value;
    } else if (one_of(key, {"fullscale", "fullscalevalue", "fsr"}) && stated->value > 0) {
      header.full_scale[channel] = stated->value;
    } else if (key == "resolution" && !channel.empty() && stated->value > 0) {
      header.resolution[channel] = stated->value;
    }
  }
  if (!header.interval_s && rate_hz) header.interval_s = 1 / *rate_hz;
}

}  // namespace coilassay
