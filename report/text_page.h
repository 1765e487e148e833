// Lines for a terminal in one style, in the script and width asked for.
#pragma once

#include <string>
#include <string_view>
#include <vector>

#include "base/finding.h"
#include "report/result_text.h"
#include "report/text_layout.h"

namespace coilassay {

inline constexpr std::string_view kTextIndent = "  ";

/// Writes lines in one style. Everything that is shown passes through words() and so through the script.
class TextPage {
 public:
  explicit TextPage(const TextStyle& style) : style_(style) {}

  std::string words(std::string_view text) const { return in_script(text, style_.script); }

  void heading(std::string_view text) {
    if (!text_.empty()) text_ += '\n';
    text_ += painted(wrapped(words(text), "", style_.width), "1");
  }
  void paragraph(std::string_view text, std::string_view first = kTextIndent) {
    text_ += wrapped(words(text), first, style_.width);
  }
  /// A sentence behind its severity in words; the colour only repeats the word.
  void remark(Severity severity, std::string_view text) {
    const std::string label(name(severity));
    std::string lines = wrapped(words(text), std::string(kTextIndent) + padded(label, 9), style_.width);
    if (style_.color) lines.replace(kTextIndent.size(), label.size(), painted(label, code_of(severity)));
    text_ += lines;
  }
  void table(const std::vector<std::vector<std::string>>& rows) { text_ += aligned(rows, kTextIndent); }

  const TextStyle& style() const { return style_; }
  std::string take() { return std::move(text_); }

 private:
  std::string painted(const std::string& text, std::string_view code) const {
    if (!style_.color) return text;
    std::string_view line = text;  // a line feed stays outside: some terminals paint to the edge
    const bool fed = line.ends_with('\n');
    if (fed) line.remove_suffix(1);
    return "\x1b[" + std::string(code) + 'm' + std::string(line) + "\x1b[0m" + (fed ? "\n" : "");
  }
  static std::string_view code_of(Severity severity) {
    switch (severity) {
      case Severity::refusal: return "1;31";
      case Severity::caution: return "1;33";
      case Severity::note: return "36";
    }
    return "0";
  }

  TextStyle style_;
  std::string text_;
};

}  // namespace coilassay
