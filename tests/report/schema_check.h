// Whether a document keeps to its JSON Schema in docs/schemas.
#pragma once

#include <string>

namespace coilassay::test {

/// Empty when the JSON text keeps to docs/schemas/<name>.schema.json; otherwise what is wrong, one line each.
std::string schema_trouble(const std::string& json, const std::string& name);

}  // namespace coilassay::test
