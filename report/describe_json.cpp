#include "report/describe_json.h"

#include <cmath>
#include <nlohmann/json.hpp>

#include "report/json_writer.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

Json number(double value) {
  return std::isfinite(value) ? Json(value) : Json(nullptr);
}
Json text_or_null(const std::string& outside) {
  return outside.empty() ? Json(nullptr) : Json(json_safe(outside));
}

Json dialect(const Dialect& read) {
  Json object = {{"format", json_safe(read.format)}, {"encoding", json_safe(read.encoding)}};
  // A format without columns has neither sign.
  if (!read.delimiter.empty()) object["delimiter"] = json_safe(read.delimiter);
  if (!read.decimal.empty()) object["decimal"] = json_safe(read.decimal);
  if (read.first_data_line > 0) object["first_data_line"] = read.first_data_line;
  Json settings = Json::object();
  for (const auto& [key, value] : read.settings) settings[json_safe(key)] = json_safe(value);
  object["settings"] = std::move(settings);
  return object;
}

Json channel(const ChannelDescription& c) {
  return {{"name", json_safe(c.name)},
          {"unit", c.unit_stated || c.unit != Unit::one ? Json(symbol(c.unit)) : Json(nullptr)},
          {"column", c.column},
          {"first", number(c.first)},
          {"last", number(c.last)},
          {"min", number(c.min)},
          {"max", number(c.max)},
          {"missing", c.missing},
          {"noise", number(c.noise)},
          {"noise_is_rounding", c.noise_is_rounding},
          {"effective_bits", number(c.effective_bits)},
          {"range_used", number(c.range_used)},
          {"clipped", c.clipped},
          {"resolution", number(c.resolution)}};
}

Json findings(const std::vector<Finding>& raised) {
  Json list = Json::array();
  for (const Finding& each : raised) {
    Json item = {{"code", each.code},
                 {"severity", name(each.severity)},
                 {"message", json_safe(each.message)},
                 {"figure", number(each.figure)}};
    if (each.unit != Unit::one) item["unit"] = symbol(each.unit);
    if (!each.about.empty()) item["about"] = json_safe(each.about);
    list.push_back(std::move(item));
  }
  return list;
}

void add_waveform(const Description& d, Json& document) {
  document["start_s"] = number(d.start_s);
  document["sample_interval_s"] = number(d.sample_interval_s);
  document["uniform"] = d.uniform;
  document["span_s"] = number(d.span_s);
  document["channels"] = Json::array();
  for (const ChannelDescription& each : d.channels) document["channels"].push_back(channel(each));
  document["segments"] = Json::array();
  for (const SegmentDescription& each : d.segments) {
    document["segments"].push_back(
        {{"label", json_safe(each.label)}, {"samples", each.samples}, {"start_s", number(each.start_s)}});
  }
}

void add_sweep(const Description& d, Json& document) {
  document["frequency_first_Hz"] = number(d.frequency_first_hz);
  document["frequency_last_Hz"] = number(d.frequency_last_hz);
  document["parameter"] = json_safe(d.parameter);
  document["ports"] = d.ports;
  // Without S parameters there is no reference.
  document["reference_ohm"] = nullptr;
  if (!d.reference_ohm.empty()) {
    document["reference_ohm"] = Json::array();
    for (const double each : d.reference_ohm) document["reference_ohm"].push_back(number(each));
  }
  document["bad_points"] = d.bad_points;
}

Json document_of(const Description& d) {
  Json document = {{"schema", "coilassay.describe/1"},
                   {"file", json_safe(d.source.name)},
                   {"sha256", d.source.sha256},
                   {"bytes", d.source.bytes},
                   {"kind", d.kind},
                   {"samples", d.samples}};
  document["dialect"] = dialect(d.dialect);
  d.kind == "sweep" ? add_sweep(d, document) : add_waveform(d, document);
  document["findings"] = findings(d.findings);
  document["suggestion"] = {{"test", text_or_null(d.suggestion.test)},
                            {"command", text_or_null(d.suggestion.command)},
                            {"looks_like", text_or_null(d.suggestion.looks_like)},
                            {"note", text_or_null(d.suggestion.note)}};
  return document;
}

Json document_of(const Error& error) {
  return {{"schema", "coilassay.error/1"},
          {"problem", name(error.problem)},
          {"place", json_safe(error.place)},
          {"finding", json_safe(error.finding)},
          {"remedy", json_safe(error.remedy)}};
}

}  // namespace

std::string to_json(const Description& description) {
  return json_text(document_of(description));
}

std::string to_json(std::span<const DescribedFile> files) {
  Json list = Json::array();
  for (const DescribedFile& each : files) {
    Json item = each.description ? document_of(*each.description) : document_of(each.description.error());
    item["file"] = json_safe(each.file);
    list.push_back(std::move(item));
  }
  return json_text({{"schema", "coilassay.describe-list/1"}, {"files", std::move(list)}});
}

}  // namespace coilassay
