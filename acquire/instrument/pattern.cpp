#include "acquire/instrument/pattern.h"

#include <re2/re2.h>

#include "base/outside_text.h"

namespace coilassay {

struct Pattern::Machine {
  Machine(const std::string& text, const RE2::Options& options) : expression(text, options) {}
  RE2 expression;
};

Pattern::Pattern(std::unique_ptr<Machine> machine) : machine_(std::move(machine)) {}
Pattern::~Pattern() = default;
Pattern::Pattern(Pattern&&) noexcept = default;
Pattern& Pattern::operator=(Pattern&&) noexcept = default;

Result<Pattern> Pattern::compile(const std::string& text, const std::string& place) {
  RE2::Options options(RE2::Latin1);  // replies are bytes
  options.set_log_errors(false);
  options.set_max_mem(std::int64_t{1} << 22);
  auto machine = std::make_unique<Machine>(text, options);
  if (!machine->expression.ok()) {
    return failure(Problem::bad_sheet, place, "the pattern '" + shown(text, 60) + "' cannot be used: " + shown(machine->expression.error()),
                   "write a regular expression; a sign such as ( or * that means itself has a backslash before it");
  }
  return Pattern(std::move(machine));
}

bool Pattern::found_in(std::string_view text) const {
  return RE2::PartialMatch(re2::StringPiece(text.data(), text.size()), machine_->expression);
}

bool Pattern::is_all_of(std::string_view text) const {
  return RE2::FullMatch(re2::StringPiece(text.data(), text.size()), machine_->expression);
}

std::size_t Pattern::groups() const { return static_cast<std::size_t>(machine_->expression.NumberOfCapturingGroups()); }

std::optional<std::vector<std::string>> Pattern::groups_in(std::string_view text) const {
  std::vector<re2::StringPiece> found(groups() + 1);
  const re2::StringPiece all(text.data(), text.size());
  if (!machine_->expression.Match(all, 0, text.size(), RE2::UNANCHORED, found.data(), static_cast<int>(found.size()))) {
    return std::nullopt;
  }
  std::vector<std::string> texts;
  for (std::size_t i = 1; i < found.size(); ++i) texts.emplace_back(found[i].data() == nullptr ? "" : found[i].as_string());
  return texts;
}

}  // namespace coilassay
