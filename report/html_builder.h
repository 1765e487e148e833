// HTML that escapes by default: there is no way to add outside text as markup by accident.
#pragma once

#include <initializer_list>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace coilassay {

/// Text as it stands in HTML and SVG, in an attribute too: & < > " ' become entities; control, bidirectional and
/// invalid bytes are shown as escapes first.
std::string html_escaped(std::string_view text);

class HtmlBuilder {
 public:
  using Attributes = std::initializer_list<std::pair<std::string_view, std::string_view>>;

  /// Tags and attribute names are ours: lower-case letters, digits and "-" (anything else is a programming mistake).
  HtmlBuilder& open(std::string_view tag, Attributes attributes = {});
  HtmlBuilder& close();
  HtmlBuilder& text(std::string_view text);
  /// open, text, close
  HtmlBuilder& element(std::string_view tag, std::string_view text, Attributes attributes = {});
  /// A tag without content, <meta>.
  HtmlBuilder& empty(std::string_view tag, Attributes attributes);
  /// A table with a line of headings.
  HtmlBuilder& table(const std::vector<std::string>& head, const std::vector<std::vector<std::string>>& rows,
                     std::string_view css_class);
  /// A symbol with its index set low: "L_s".
  HtmlBuilder& symbol(std::string_view symbol);
  /// Markup made by this program itself (a drawing, a style sheet): not escaped.
  HtmlBuilder& own_markup(std::string_view markup);

  /// The whole text; every tag must be closed.
  std::string finish();

 private:
  void begin(std::string_view tag, Attributes attributes);
  std::string out_;
  std::vector<std::string> open_;
};

}  // namespace coilassay
