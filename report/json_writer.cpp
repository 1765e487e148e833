#include "report/json_writer.h"

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

std::string number_text(double value) {
  if (!std::isfinite(value)) return "null";
  std::string text = to_shortest(value);
  if (text.find_first_of(".e") == std::string::npos) text += ".0";
  return text;
}

void write(const Json& node, std::size_t depth, std::string& out) {
  const auto line = [&out](std::size_t levels) { out.append(1, '\n').append(2 * levels, ' '); };
  if (node.is_number_float()) {
    out += number_text(node.get<double>());
  } else if (!node.is_structured()) {
    out += node.dump();
  } else if (node.empty()) {
    out += node.is_array() ? "[]" : "{}";
  } else if (node.is_array()) {
    const bool one_line = std::none_of(node.begin(), node.end(), [](const Json& item) { return item.is_structured(); });
    out += '[';
    for (std::size_t i = 0; i < node.size(); ++i) {
      if (i > 0) out += one_line ? ", " : ",";
      if (!one_line) line(depth + 1);
      write(node[i], depth + 1, out);
    }
    if (!one_line) line(depth);
    out += ']';
  } else {
    out += '{';
    bool first = true;
    for (const auto& [key, value] : node.items()) {
      if (!first) out += ',';
      first = false;
      line(depth + 1);
      out += Json(key).dump();
      out += ": ";
      write(value, depth + 1, out);
    }
    line(depth);
    out += '}';
  }
}

}  // namespace

std::string json_text(const Json& document) {
  std::string out;
  write(document, 0, out);
  out += '\n';
  return out;
}

std::string json_safe(std::string_view outside) {
  return shown(outside, 4096);
}

}  // namespace coilassay
