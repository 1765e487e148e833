// Captures of open, short and load into a dated fixture set.
#pragma once

#include <chrono>
#include <optional>
#include <string>
#include <vector>

#include "acquire/fixture_set.h"
#include "acquire/reader.h"
#include "analysis/fixture.h"
#include "app/runs/context.h"
#include "base/result.h"

namespace coilassay {

struct FixtureJob {
  std::string name;
  std::string open_file, short_file;
  std::optional<std::string> load_file;
  ReadOptions reading;
  Connection connection = Connection::reflect;
  std::optional<std::size_t> port;
  // What the standards really are.
  StatedValue short_inductance;
  std::optional<StatedValue> short_resistance, open_capacitance, load_value, load_inductance;
  std::optional<std::chrono::year_month_day> expires;
  std::optional<double> valid_for_s;       // instead of expires
  std::optional<double> part_h;            // an example part, to show what the correction does to it
  std::string file;                        // the set; must not exist yet; "-": standard output
};

struct FixtureMade {
  FixtureSet set;
  std::vector<FixtureEffect> effects;      // at each decade
  std::optional<double> part_h;
  std::vector<Finding> findings;           // fixture_residual for the example part
  std::string file;
};

/// Reads the standards, looks whether each is what it is called, and writes the set; its day is that of the context.
/// @return usage and the like in a sentence; cannot_write for a file that exists, for a set is never edited
Result<FixtureMade> run_fixture(const FixtureJob& job, const RunContext& context);

}  // namespace coilassay
