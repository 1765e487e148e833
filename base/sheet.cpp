#include "base/sheet.h"

#include <fmt/format.h>
#include <toml++/toml.h>
#include <utf8.h>

#include <algorithm>
#include <cerrno>
#include <cmath>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <map>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

constexpr std::size_t kLargestSheet = std::size_t{1} << 20;

/// Kept alive by every table that is handed out.
struct Document {
  toml::table root;
  std::string name;
};

std::string type_in_words(const toml::node& node) {
  switch (node.type()) {
    case toml::node_type::table: return "a table";
    case toml::node_type::array: return node.is_array_of_tables() ? "an array of tables" : "an array";
    case toml::node_type::string: return "text in quotes";
    case toml::node_type::integer: return "an integer";
    case toml::node_type::floating_point: return "a number with a point";
    case toml::node_type::boolean: return "true or false";
    case toml::node_type::date: return "a date";
    case toml::node_type::time: return "a time of day";
    case toml::node_type::date_time: return "a date with a time";
    case toml::node_type::none: break;
  }
  return "something else";
}

/// TOML++ 3.3 limits the nesting of values, but not the length of dotted keys, and overflows the stack on "a.a.a. ...".
/// No sheet has keys of more than a few parts: rows of dots with no separator between them are counted where they are
/// longer than any key, and when they add up to more than text in quotes could explain, the line is returned.
std::optional<std::ptrdiff_t> line_of_endless_key(std::string_view text) {
  constexpr int kLongKey = 16, kTooMany = 1000;
  int row = 0, in_long_rows = 0;
  for (const char& c : text) {
    if (c == '.') {
      if (++row > kLongKey && ++in_long_rows > kTooMany) {
        return 1 + std::count(text.data(), &c, '\n');
      }
    } else if (c == '\n' || c == '=' || c == ',' || c == '{' || c == '[') {
      row = 0;
    }
  }
  return std::nullopt;
}

}  // namespace

struct SheetTable::Node {
  std::shared_ptr<const Document> document;
  const toml::table* table = nullptr;
  std::string path;  // "test.ramp"; empty for the root
  long long line = 0;
  // Asking is not a change a caller can see; the answers do not depend on it.
  mutable std::map<std::string, std::vector<std::shared_ptr<Node>>, std::less<>> asked;

  std::string place_of_line(long long at) const { return fmt::format("{}:{}", document->name, std::max(at, 1LL)); }

  const toml::node* ask(std::string_view key) const {
    asked.try_emplace(std::string(key));
    return table->get(key);
  }

  std::string path_of(std::string_view key) const {
    return path.empty() ? std::string(key) : fmt::format("{}.{}", path, key);
  }

  tl::unexpected<Error> wrong_type(std::string_view key, const toml::node& found, std::string_view wanted,
                                   std::string remedy) const {
    return failure(Problem::bad_sheet, place_of_line(found.source().begin.line),
                   fmt::format("'{}' is {}, where {} is needed", shown(path_of(key)), type_in_words(found), wanted),
                   std::move(remedy));
  }

  /// The tables below a key, made once: what was asked of them is remembered.
  const std::vector<std::shared_ptr<Node>>& children(std::string_view key, const toml::node& found) const {
    auto& known = asked.find(key)->second;
    if (!known.empty()) return known;
    const auto add = [&](const toml::table& child) {
      auto node = std::make_shared<Node>();
      node->document = document;
      node->table = &child;
      node->path = path_of(key);
      node->line = child.source().begin.line;
      known.push_back(std::move(node));
    };
    if (const toml::table* one = found.as_table()) {
      add(*one);
    } else if (const toml::array* several = found.as_array()) {
      for (const toml::node& element : *several) {
        if (const toml::table* child = element.as_table()) add(*child);
      }
    }
    return known;
  }

  Result<void> refuse_unknown() const;
};

SheetTable::SheetTable(std::shared_ptr<Node> node) : node_(std::move(node)) {}

bool SheetTable::has(std::string_view key) const { return node_->table->contains(key); }

std::vector<std::string> SheetTable::keys() const {
  std::vector<std::pair<std::uint32_t, std::string>> found;
  for (const auto& [key, value] : *node_->table) found.emplace_back(key.source().begin.line, key.str());
  std::stable_sort(found.begin(), found.end(), [](const auto& a, const auto& b) { return a.first < b.first; });
  std::vector<std::string> names;
  for (auto& [line, key] : found) names.push_back(std::move(key));
  return names;
}

Result<std::optional<std::string>> SheetTable::text(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (const auto* text = found->as_string()) return text->get();
  return node_->wrong_type(key, *found, "text", fmt::format("put it in quotes: {} = \"...\"", key));
}

Result<std::optional<double>> SheetTable::number(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (const auto* integer = found->as_integer()) return static_cast<double>(integer->get());
  if (const auto* real = found->as_floating_point()) {
    if (std::isfinite(real->get())) return real->get();
    return failure(Problem::bad_number, place(key), fmt::format("'{}' is not a finite number", shown(node_->path_of(key))),
                   "write a decimal number");
  }
  return node_->wrong_type(key, *found, "a number", fmt::format("write it without quotes: {} = 1.5", key));
}

Result<std::optional<long long>> SheetTable::integer(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (const auto* integer = found->as_integer()) return static_cast<long long>(integer->get());
  return node_->wrong_type(key, *found, "an integer", fmt::format("write it without quotes or point: {} = 2", key));
}

Result<std::optional<bool>> SheetTable::flag(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (const auto* flag = found->as_boolean()) return flag->get();
  return node_->wrong_type(key, *found, "true or false", fmt::format("write {} = true or {} = false", key, key));
}

Result<std::optional<std::chrono::year_month_day>> SheetTable::date(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  const std::string remedy = fmt::format("write {} = 2026-05-01, without quotes", key);
  const auto* date = found->as_date();
  if (date == nullptr) return node_->wrong_type(key, *found, "a date", remedy);
  const toml::date& d = date->get();
  const std::chrono::year_month_day day{std::chrono::year{d.year}, std::chrono::month{d.month}, std::chrono::day{d.day}};
  if (!day.ok()) {
    return failure(Problem::bad_sheet, place(key), fmt::format("'{}' is no day of the calendar", shown(node_->path_of(key))),
                   remedy);
  }
  return day;
}

Result<std::optional<std::vector<std::string>>> SheetTable::texts(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  const std::string remedy = fmt::format("write {} = [\"...\", \"...\"]", key);
  const toml::array* array = found->as_array();
  if (array == nullptr) return node_->wrong_type(key, *found, "a list of texts", remedy);
  std::vector<std::string> texts;
  for (const toml::node& element : *array) {
    const auto* text = element.as_string();
    if (text == nullptr) return node_->wrong_type(key, element, "text", remedy);
    texts.push_back(text->get());
  }
  return texts;
}

Result<std::optional<StatedValue>> SheetTable::value(std::string_view key, Unit expected) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (const auto* text = found->as_string()) {
    auto value = parse_value(text->get(), expected, place(key));
    if (!value) return failure(value);
    return *value;
  }
  if (!found->is_number()) {
    return node_->wrong_type(key, *found, kind_in_words(expected), fmt::format("write it in quotes: {} = \"...\"", key));
  }
  const auto bare = number(key);
  if (!bare) return failure(bare);
  return StatedValue::unstated(**bare, expected);
}

Result<std::optional<SheetTable>> SheetTable::table(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  if (found == nullptr) return std::nullopt;
  if (!found->is_table()) {
    return node_->wrong_type(key, *found, "a table", fmt::format("write [{}] and its keys below", node_->path_of(key)));
  }
  return SheetTable(node_->children(key, *found).front());
}

Result<std::vector<SheetTable>> SheetTable::tables(std::string_view key) const {
  const toml::node* found = node_->ask(key);
  std::vector<SheetTable> tables;
  if (found == nullptr) return tables;
  const std::string remedy = fmt::format("write [[{}]] and its keys below", node_->path_of(key));
  const toml::array* array = found->as_array();
  if (array == nullptr) return node_->wrong_type(key, *found, "an array of tables", remedy);
  for (const toml::node& element : *array) {
    if (!element.is_table()) return node_->wrong_type(key, element, "a table", remedy);
  }
  for (const auto& child : node_->children(key, *found)) tables.emplace_back(child);
  return tables;
}

std::string SheetTable::place(std::string_view key) const {
  const toml::node* found = node_->table->get(key);
  return node_->place_of_line(found != nullptr ? static_cast<long long>(found->source().begin.line) : node_->line);
}

Result<void> SheetTable::refuse_unknown_keys() const { return node_->refuse_unknown(); }

Result<void> SheetTable::Node::refuse_unknown() const {
  // TOML++ keeps keys by name; the first one as a person reads is the one on the lowest line.
  const toml::key* unknown = nullptr;
  for (const auto& [key, value] : *table) {
    if (asked.contains(key.str())) continue;
    if (unknown == nullptr || key.source().begin.line < unknown->source().begin.line) unknown = &key;
  }
  if (unknown != nullptr) {
    std::vector<std::string_view> known;
    std::string list;
    for (const auto& [key, below] : asked) {
      known.push_back(key);
      list += (list.empty() ? "" : ", ") + key;
    }
    const std::string_view near = nearest(unknown->str(), known);
    const std::string where = path.empty() ? "" : fmt::format(" in [{}]", shown(path));
    std::string remedy = near.empty() ? "" : fmt::format("did you mean '{}'? ", near);
    remedy += list.empty() ? "no key is known here" : fmt::format("known here: {}", list);
    return failure(Problem::bad_sheet, place_of_line(unknown->source().begin.line),
                   fmt::format("unknown key '{}'{}", shown(unknown->str()), where), std::move(remedy));
  }
  for (const auto& [key, below] : asked) {
    for (const auto& child : below) {
      if (auto known = child->refuse_unknown(); !known) return known;
    }
  }
  return {};
}

Result<SheetTable> parse_sheet(std::string_view text, std::string_view name) {
  const std::string place(name);
  if (text.size() > kLargestSheet) {
    return failure(Problem::bad_sheet, place, "this is larger than 1 MiB, which no sheet is", "give the sheet (TOML)");
  }
  if (const auto* bad = utf8::find_invalid(text.begin(), text.end()); bad != text.end()) {
    const auto line = 1 + std::count(text.begin(), bad, '\n');
    return failure(Problem::bad_sheet, fmt::format("{}:{}", place, line), "there are bytes that are no UTF-8 text",
                   "save the sheet as UTF-8");
  }
  if (const auto line = line_of_endless_key(text)) {
    return failure(Problem::bad_sheet, fmt::format("{}:{}", place, *line), "there is a key of more parts than any sheet has",
                   "write keys such as voltage.gain");
  }
  auto document = std::make_shared<Document>();
  document->name = place;
  try {
    document->root = toml::parse(text, name);
  } catch (const toml::parse_error& error) {
    return failure(Problem::bad_sheet, fmt::format("{}:{}", place, error.source().begin.line),
                   fmt::format("this is not valid TOML: {}", shown(error.description())),
                   "texts stand in quotes, one key = value a line");
  }
  auto root = std::make_shared<SheetTable::Node>();
  root->table = &document->root;
  root->line = 1;
  root->document = std::move(document);
  return SheetTable(std::move(root));
}

Result<SheetTable> read_sheet(const std::string& path) {
  const auto text = read_sheet_text(path);
  if (!text) return failure(text);
  return parse_sheet(*text, path);
}

Result<std::string> read_sheet_text(const std::string& path) {
  const auto unreadable = [&](std::string finding) {
    return failure(Problem::unreadable, path, std::move(finding), "give the path of a sheet (TOML)");
  };
  std::error_code error;
  if (std::filesystem::is_directory(path, error)) return unreadable("this is a directory, not a sheet");
  errno = 0;
  std::ifstream file(path, std::ios::binary);
  if (!file) {
    if (errno == ENOENT) return unreadable("there is no such file");
    if (errno == EACCES) return unreadable("there is no permission to read it");
    return unreadable("it cannot be opened");
  }
  std::string text(kLargestSheet + 1, '\0');  // one more byte than allowed shows that there is more
  file.read(text.data(), static_cast<std::streamsize>(text.size()));
  if (file.bad()) return unreadable("it cannot be read to its end");
  text.resize(static_cast<std::size_t>(file.gcount()));
  return text;
}

}  // namespace coilassay
