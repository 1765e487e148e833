// Patterns of profiles, by RE2: no pattern and no reply makes them slow or large.
#pragma once

#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "base/result.h"

namespace coilassay {

class Pattern {
 public:
  /// bad_sheet at `place` for a pattern that cannot compile.
  static Result<Pattern> compile(const std::string& text, const std::string& place);
  ~Pattern();
  Pattern(Pattern&&) noexcept;
  Pattern& operator=(Pattern&&) noexcept;

  bool found_in(std::string_view text) const;
  bool is_all_of(std::string_view text) const;
  std::size_t groups() const;
  /// The text of each group where the pattern is found first; nullopt when it is not.
  std::optional<std::vector<std::string>> groups_in(std::string_view text) const;

 private:
  struct Machine;
  explicit Pattern(std::unique_ptr<Machine> machine);
  std::unique_ptr<Machine> machine_;
};

}  // namespace coilassay
