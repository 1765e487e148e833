// What `fixture` says about the set it made.
#pragma once

#include <optional>
#include <span>
#include <string>
#include <string_view>

#include "analysis/fixture.h"
#include "report/result_text.h"

namespace coilassay {

/// What the set holds, and what it corrects at each decade.
std::string to_text(const FixtureSet& set, std::span<const FixtureEffect> effects, std::optional<double> part_h,
                    std::span<const Finding> findings, const TextStyle& style);

/// The document coilassay.fixture/1.
std::string to_json(const FixtureSet& set, std::span<const FixtureEffect> effects, std::optional<double> part_h,
                    std::span<const Finding> findings, std::string_view file, std::string_view program);

}  // namespace coilassay
