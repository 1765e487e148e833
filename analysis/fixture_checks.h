// Standards of a fixture that are evidently something else.
#pragma once

#include <string>
#include <vector>

#include "acquire/fixture_set.h"
#include "base/finding.h"
#include "base/result.h"

namespace coilassay {

/// The kinds of the standards, after their sizes were found to be in order: the open is no coil, no resistor and not of the
/// other sign, the short is no coil and not of the other sign, and the load behind open and short is what was stated. Limits
/// and reasons: docs/howto-fixture.md. All are judged by medians over many points, so that noise about zero is no reason.
/// @return usage, its place the file of the standard
Result<void> check_kinds(const FixtureSet& set);

/// fixture_short as a caution: the short's series inductance is more, or less, than leads usually have, and not yet impossible.
std::vector<Finding> doubts_about(const FixtureSet& set);

}  // namespace coilassay
