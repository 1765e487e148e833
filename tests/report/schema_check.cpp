#include "tests/report/schema_check.h"

#include <fstream>
#include <nlohmann/json.hpp>
#include <valijson/adapters/nlohmann_json_adapter.hpp>
#include <valijson/schema.hpp>
#include <valijson/schema_parser.hpp>
#include <valijson/validation_results.hpp>
#include <valijson/validator.hpp>

#include "tests/support/paths.h"

namespace coilassay::test {

std::string schema_trouble(const std::string& json, const std::string& name) {
  using Adapter = valijson::adapters::NlohmannJsonAdapter;
  const std::string path = project_file("docs/schemas/" + name + ".schema.json");
  std::ifstream file(path);
  if (!file) return path + " cannot be read";
  const nlohmann::json rules = nlohmann::json::parse(file, nullptr, false);
  const nlohmann::json document = nlohmann::json::parse(json, nullptr, false);
  if (rules.is_discarded()) return path + " is no JSON";
  if (document.is_discarded()) return "the document is no JSON";

  valijson::Schema schema;
  valijson::SchemaParser(valijson::SchemaParser::kDraft7).populateSchema(Adapter(rules), schema);
  valijson::ValidationResults results;
  valijson::Validator validator(valijson::Validator::kStrongTypes);
  if (validator.validate(schema, Adapter(document), &results)) return {};
  std::string trouble;
  valijson::ValidationResults::Error error;
  while (results.popError(error)) {
    for (const std::string& step : error.context) trouble += step;
    trouble += ": " + error.description + '\n';
  }
  return trouble.empty() ? "refused without a reason" : trouble;
}

}  // namespace coilassay::test
