// Text that comes from outside (file names, channel names, replies, serials) before it is shown or stored.
#pragma once

#include <cstddef>
#include <string>
#include <string_view>

namespace coilassay {

/// Makes outside text safe to show: control, escape, bidirectional and invalid bytes become visible escapes (\x1b,
/// \u202e), everything else stays, and what is longer than `limit` characters ends in "…".
std::string shown(std::string_view outside, std::size_t limit = 200);

/// A cell for a CSV file: quoted when needed; = + - @ tab or CR at the start get a leading apostrophe unless the whole
/// cell is a number, so that no spreadsheet takes it for a formula.
std::string csv_cell(std::string_view outside);

/// A name reduced to letters, digits and underscore, never empty, never starting with a digit (netlists).
std::string identifier(std::string_view outside);

/// The known name nearest to what was typed, for "did you mean"; empty when none is near.
template <class Range>
std::string_view nearest(std::string_view typed, const Range& known);

/// Edit distance (insert, delete, replace, swap of neighbours each cost 1).
std::size_t edit_distance(std::string_view a, std::string_view b);

template <class Range>
std::string_view nearest(std::string_view typed, const Range& known) {
  std::string_view best;
  std::size_t least = typed.size() / 3 + 2;  // further away than this is another word
  for (const auto& candidate : known) {
    const std::size_t d = edit_distance(typed, candidate);
    if (d < least) {
      least = d;
      best = candidate;
    }
  }
  return best;
}

}  // namespace coilassay
