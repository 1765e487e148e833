// Captures for end-to-end tests, made by the program itself.
#pragma once

#include <gtest/gtest.h>

#include <nlohmann/json.hpp>
#include <string>
#include <vector>

#include "tests/report/schema_check.h"
#include "tests/support/program.h"

namespace coilassay::test {

/// Simulates a ring-down into `file` and gives its truth document.
nlohmann::json simulate_into(const std::string& file, const std::vector<std::string>& parameters = {});

/// Runs a measuring command with --json, checks the document against its schema and gives it; `exit_code` is expected.
nlohmann::json measured_json(std::vector<std::string> arguments, int exit_code = 0);

/// The interval of a quantity in a result document holds the true value.
testing::AssertionResult covers(const nlohmann::json& result, const std::string& symbol, double truth);

}  // namespace coilassay::test
