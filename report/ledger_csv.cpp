#include "report/ledger_csv.h"

#include <algorithm>
#include <cmath>
#include <map>
#include <nlohmann/json.hpp>
#include <vector>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

constexpr std::string_view kOfALimit[] = {"value", "U", "min", "max", "verdict"};

/// The limits of an entry by label: "L_s [H]", and "L_s [H] 2" for the second limit on the same quantity.
std::vector<std::pair<std::string, Json>> limits_of(const Entry& entry) {
  std::vector<std::pair<std::string, Json>> found;
  const Json details = Json::parse(entry.content.details, nullptr, false);
  if (!details.is_object() || !details.contains("limits") || !details["limits"].is_array()) return found;
  std::map<std::string, int> count;
  for (const Json& limit : details["limits"]) {
    if (!limit.is_object() || !limit.contains("quantity") || !limit["quantity"].is_string()) continue;
    std::string label = limit["quantity"].get<std::string>();
    if (const auto unit = limit.find("unit"); unit != limit.end() && unit->is_string() && *unit != "1" && *unit != "") {
      label += " [" + unit->get<std::string>() + "]";
    }
    if (const int n = ++count[label]; n > 1) label += " " + std::to_string(n);
    found.emplace_back(std::move(label), limit);
  }
  return found;
}

std::string cell_of(const Json& limit, std::string_view member) {
  const auto value = limit.find(std::string(member));
  if (value == limit.end()) return {};
  if (value->is_number()) return to_shortest(value->get<double>());
  return value->is_string() ? value->get<std::string>() : std::string();
}

std::string files_of(const EntryContent& content) {
  std::string files;
  for (const EntrySource& source : content.sources) files += (files.empty() ? "" : "; ") + source.file + " " + source.sha256;
  return files;
}

void add_row(const std::vector<std::string>& cells, std::string& table) {
  for (std::size_t i = 0; i < cells.size(); ++i) table += (i == 0 ? "" : ",") + csv_cell(cells[i]);
  table += "\r\n";  // RFC 4180
}

}  // namespace

std::string ledger_csv(std::span<const Entry> entries) {
  std::vector<std::string> labels;  // in the order of their first appearance
  for (const Entry& entry : entries) {
    for (const auto& [label, limit] : limits_of(entry)) {
      if (std::find(labels.begin(), labels.end(), label) == labels.end()) labels.push_back(label);
    }
  }
  std::vector<std::string> head{"id", "time", "kind", "part", "revision", "supplier", "lot", "serial", "attempt", "verdict",
                                "corrects", "corrected by", "reason", "operator", "instrument", "program"};
  for (const std::string& label : labels) {
    for (const std::string_view member : kOfALimit) head.push_back(label + " " + std::string(member));
  }
  head.insert(head.end(), {"part sheet SHA-256", "files", "previous", "hash"});
  std::string table;
  add_row(head, table);

  for (const Entry& entry : entries) {
    const EntryContent& c = entry.content;
    std::vector<std::string> row{std::to_string(entry.id), to_text(c.time), std::string(name(c.kind)), c.part, c.revision, c.supplier,
                                 c.lot, c.serial, c.attempt > 0 ? std::to_string(c.attempt) : "", c.verdict,
                                 c.corrects ? std::to_string(*c.corrects) : "",
                                 entry.corrected_by ? std::to_string(*entry.corrected_by) : "", c.reason, c.operator_name,
                                 c.instrument, c.program};
    const auto limits = limits_of(entry);
    for (const std::string& label : labels) {
      const auto limit = std::find_if(limits.begin(), limits.end(), [&](const auto& each) { return each.first == label; });
      for (const std::string_view member : kOfALimit) row.push_back(limit == limits.end() ? "" : cell_of(limit->second, member));
    }
    row.insert(row.end(), {c.sheet_sha256, files_of(c), entry.previous, entry.hash});
    add_row(row, table);
  }
  return table;
}

}  // namespace coilassay
