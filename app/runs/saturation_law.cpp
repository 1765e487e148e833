#include "app/runs/saturation_law.h"

#include <algorithm>
#include <cmath>
#include <fstream>
#include <nlohmann/json.hpp>
#include <sstream>

namespace coilassay {

namespace {

constexpr std::streamoff kMostBytes = 16 << 20;   // a result with its curve has some ten thousand

std::vector<double> numbers_of(const nlohmann::json& curve, const char* key) {
  std::vector<double> list;
  const auto at = curve.find(key);
  if (at == curve.end() || !at->is_array()) return list;
  for (const auto& each : *at) list.push_back(each.is_number() ? each.get<double>() : std::nan(""));
  return list;
}

bool rises(const std::vector<double>& list) {
  return std::all_of(list.begin(), list.end(), [](double v) { return std::isfinite(v); }) &&
         std::adjacent_find(list.begin(), list.end(), [](double a, double b) { return !(b > a); }) == list.end();
}

}  // namespace

Result<SaturationLaw> read_saturation_law(const std::string& path) {
  std::ifstream in(path, std::ios::binary | std::ios::ate);
  const std::streamoff size = in ? static_cast<std::streamoff>(in.tellg()) : -1;
  if (size < 0) return failure(Problem::unreadable, path, "the result of the ramp cannot be read", "check the name given to --saturation");
  const auto refused = [&](const std::string& finding) {
    return failure(Problem::not_a_capture, path, finding, "write it with coilassay ramp pulse.csv --json > ramp.json");
  };
  if (size > kMostBytes) return refused("the file is too large for a result");
  in.seekg(0);
  std::ostringstream bytes;
  bytes << in.rdbuf();
  const nlohmann::json document = nlohmann::json::parse(bytes.str(), nullptr, false);
  const auto says = [&document](const char* key, const char* word) {
    const auto member = document.find(key);
    return member != document.end() && member->is_string() && *member == word;
  };
  if (!document.is_object() || !says("schema", "coilassay.result/1") || !says("test", "ramp")) {
    return refused("it is no JSON result of a ramp");
  }
  const auto curve = document.find("curve");
  if (curve == document.end() || !curve->is_object()) return refused("this ramp has no curve L(i)");
  SaturationLaw law{path, numbers_of(*curve, "current_A"), numbers_of(*curve, "flux_Wb")};
  const bool usable = law.current_a.size() >= 2 && law.current_a.size() == law.flux_wb.size() && rises(law.current_a) && rises(law.flux_wb);
  if (!usable || law.current_a.front() != 0) return refused("its curve L(i) does not begin at zero current");
  // Flux from zero on, wherever the ramp counted it from.
  const double start = law.flux_wb.front();
  for (double& flux : law.flux_wb) flux -= start;
  return law;
}

}  // namespace coilassay
