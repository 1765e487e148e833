#include "report/html_builder.h"

#include <algorithm>
#include <cassert>

#include "base/outside_text.h"

namespace coilassay {

namespace {

bool own_name(std::string_view name) {
  return !name.empty() && std::all_of(name.begin(), name.end(), [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= '0' && c <= '9') || c == '-';
  });
}

bool is_block(std::string_view tag) {
  for (const std::string_view block :
       {"html", "head",   "body",   "header", "main", "section", "table", "thead", "tbody", "tr", "ul",
        "dl",   "figure", "footer", "p",      "h1",   "h2",      "li",    "style", "title", "dt", "dd"}) {
    if (tag == block) return true;
  }
  return false;
}

}  // namespace

std::string html_escaped(std::string_view text) {
  std::string result;
  for (char c : shown(text, 4096)) {
    switch (c) {
      case '&': result += "&amp;"; break;
      case '<': result += "&lt;"; break;
      case '>': result += "&gt;"; break;
      case '"': result += "&quot;"; break;
      case '\'': result += "&#39;"; break;
      default: result += c;
    }
  }
  return result;
}

void HtmlBuilder::begin(std::string_view tag, Attributes attributes) {
  assert(own_name(tag));
  out_ += '<';
  out_ += tag;
  for (const auto& [name, value] : attributes) {
    assert(own_name(name));
    out_ += ' ';
    out_ += name;
    out_ += "=\"" + html_escaped(value) + '"';
  }
  out_ += '>';
}

HtmlBuilder& HtmlBuilder::open(std::string_view tag, Attributes attributes) {
  begin(tag, attributes);
  open_.emplace_back(tag);
  return *this;
}

HtmlBuilder& HtmlBuilder::close() {
  assert(!open_.empty());
  out_ += "</" + open_.back() + '>';
  if (is_block(open_.back())) out_ += '\n';
  open_.pop_back();
  return *this;
}

HtmlBuilder& HtmlBuilder::text(std::string_view text) {
  out_ += html_escaped(text);
  return *this;
}

HtmlBuilder& HtmlBuilder::element(std::string_view tag, std::string_view content, Attributes attributes) {
  return open(tag, attributes).text(content).close();
}

HtmlBuilder& HtmlBuilder::empty(std::string_view tag, Attributes attributes) {
  begin(tag, attributes);
  out_ += '\n';
  return *this;
}

HtmlBuilder& HtmlBuilder::table(const std::vector<std::string>& head, const std::vector<std::vector<std::string>>& rows,
                                std::string_view css_class) {
  open("table", {{"class", css_class}}).open("thead").open("tr");
  for (const std::string& cell : head) element("th", cell, {{"scope", "col"}});
  close().close().open("tbody");
  for (const auto& row : rows) {
    open("tr");
    for (const std::string& cell : row) element("td", cell);
    close();
  }
  return close().close();
}

HtmlBuilder& HtmlBuilder::symbol(std::string_view symbol) {
  const std::size_t at = symbol.find('_');
  open("var").text(symbol.substr(0, at));
  if (at != std::string_view::npos) {
    std::string index(symbol.substr(at + 1));
    std::replace(index.begin(), index.end(), '_', ' ');
    element("sub", index);
  }
  return close();
}

HtmlBuilder& HtmlBuilder::own_markup(std::string_view markup) {
  out_ += markup;
  return *this;
}

std::string HtmlBuilder::finish() {
  assert(open_.empty());
  return std::move(out_);
}

}  // namespace coilassay
