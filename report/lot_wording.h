// What text and page say about a lot, in the same words.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "base/number_text.h"
#include "report/lot_record.h"

namespace coilassay {

/// "Accepted", "Rejected", "Undecided".
std::string_view decision_in_words(LotResult decision);
/// "passes", "fails", "undecided", "not comparable".
std::string_view verdict_in_words(Verdict verdict);

/// "lot 0412 of drum-47, revision C, from Reel Hall"; outside text is made safe.
std::string lot_in_words(const LotRecord& lot);

/// "36.10 µH ± 0.20 µH", "no value".
std::string value_in_words(const LimitVerdict& limit, Script script);
/// "37.60 µH to 56.40 µH", "at least 1.2 A".
std::string limits_in_words(const LimitVerdict& limit, Script script);
/// "99.2 %", "under 0.1 %", "over 99.9 %"; empty when it is not known.
std::string probability_in_words(const LimitVerdict& limit);

/// Units that do not pass: failing ones first, in the order of the lot among equals.
std::vector<const LotUnitRecord*> not_passing(const LotRecord& lot);

/// "47.02 µH on average (± 0.31 µH), from 45.10 µH to 48.90 µH; parts spread by 0.82 µH; ...".
std::string values_in_words(const LotValues& values, Script script);

/// "Cpk 1.31 (0.95 to 1.67), Ppk 1.10 (0.80 to 1.40)", and what shows that the process is not steady; empty when nothing can be said.
std::string capability_in_words(const LotValues& values);

/// "a lot with 5 % bad passes 66 times in 100, one with 10 % bad 43 times"; empty for a plan that looks at every unit.
std::string protection_in_words(const LotRecord& lot);

/// What to watch out for, the weightiest first: findings of the lot, and those of its units that their reasons do not tell, one
/// of a kind with the number of the others.
std::vector<Finding> findings_to_tell(const LotRecord& lot);

/// Where the record is, or that there is none.
std::string record_in_words(const LotRecord& lot);

}  // namespace coilassay
