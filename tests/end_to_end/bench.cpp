#include "tests/end_to_end/bench.h"

namespace coilassay::test {

nlohmann::json simulate_into(const std::string& file, const std::vector<std::string>& parameters) {
  std::vector<std::string> arguments = {"simulate", "ringdown", "-o", file, "--truth", file + ".json"};
  arguments.insert(arguments.end(), parameters.begin(), parameters.end());
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, 0) << end.error;
  EXPECT_EQ(end.out, "");
  const std::string truth = contents_of(file + ".json");
  EXPECT_EQ(schema_trouble(truth, "truth"), "");
  return nlohmann::json::parse(truth);
}

nlohmann::json measured_json(std::vector<std::string> arguments, int exit_code) {
  arguments.push_back("--json");
  const ProgramEnd end = run_program_process(arguments);
  EXPECT_EQ(end.exit_code, exit_code) << end.out << end.error;
  EXPECT_EQ(end.signal, 0);
  EXPECT_EQ(schema_trouble(end.out, exit_code == 2 || exit_code == 4 ? "error" : "result"), "") << end.out;
  const nlohmann::json document = nlohmann::json::parse(end.out, nullptr, false);
  return document.is_discarded() ? nlohmann::json::object() : document;
}

testing::AssertionResult covers(const nlohmann::json& result, const std::string& symbol, double truth) {
  if (!result.contains("quantities") || !result["quantities"].contains(symbol)) {
    return testing::AssertionFailure() << "there is no " << symbol;
  }
  const auto& interval = result["quantities"][symbol]["interval"];
  const double low = interval[0].get<double>(), high = interval[1].get<double>();
  if (low <= truth && truth <= high) return testing::AssertionSuccess();
  return testing::AssertionFailure() << symbol << ": " << truth << " is outside " << low << " to " << high;
}

}  // namespace coilassay::test
