#include "ledger/entry.h"

#include <algorithm>
#include <nlohmann/json.hpp>

#include "base/digest.h"

namespace coilassay {

namespace {

using Json = nlohmann::ordered_json;

constexpr std::string_view kSchema = "coilassay.entry/1";
constexpr int kMostLevels = 64;  // of nested lists and objects; writing them out is recursive

tl::unexpected<Error> refused(std::string finding, std::string remedy) {
  return failure(Problem::ledger, "entry", std::move(finding), std::move(remedy));
}

bool is_sha256(std::string_view text) {
  return text.size() == 64 && std::all_of(text.begin(), text.end(), [](char c) {
           return (c >= '0' && c <= '9') || (c >= 'a' && c <= 'f');
         });
}

bool too_deep(std::string_view json) {
  int level = 0;
  bool in_text = false;
  for (std::size_t i = 0; i < json.size(); ++i) {
    const char c = json[i];
    if (in_text) {
      if (c == '\\') ++i;
      else if (c == '"') in_text = false;
    } else if (c == '"') {
      in_text = true;
    } else if (c == '{' || c == '[') {
      if (++level > kMostLevels) return true;
    } else if (c == '}' || c == ']') {
      --level;
    }
  }
  return false;
}

/// Null when it is no JSON object.
Json object_of(std::string_view text) {
  if (too_deep(text)) return nullptr;
  Json parsed = Json::parse(text, nullptr, false);
  if (!parsed.is_object()) return nullptr;
  return parsed;
}

Json text_or_null(const std::string& text) { return text.empty() ? Json(nullptr) : Json(text); }

Result<void> check_fields(const EntryContent& content) {
  for (const std::string* text : {&content.part, &content.revision, &content.supplier, &content.lot, &content.serial,
                                  &content.verdict, &content.operator_name, &content.instrument, &content.program,
                                  &content.reason}) {
    if (text->find('\0') != std::string::npos) return refused("a text holds a zero byte", "store it without");
  }
  if (!content.sheet_sha256.empty() && !is_sha256(content.sheet_sha256)) {
    return refused("the digest of the part sheet is none", "it has 64 hexadecimal digits");
  }
  for (const EntrySource& source : content.sources) {
    if (!is_sha256(source.sha256)) return refused("the digest of a file is none", "it has 64 hexadecimal digits");
    if (source.file.find('\0') != std::string::npos || source.test.find('\0') != std::string::npos) {
      return refused("a text holds a zero byte", "store it without");
    }
  }
  if ((content.kind == EntryKind::correction) != content.corrects.has_value()) {
    return refused("an entry points back when it is a correction, and only then", "say which entry it corrects");
  }
  if (content.kind == EntryKind::correction && content.reason.empty()) {
    return refused("a correction without a reason says nothing", "say why, as in --reason TEXT");
  }
  if ((content.kind == EntryKind::unit && content.attempt < 1) || content.attempt < 0) {
    return refused("attempts at a unit count from 1", "say which one it is");
  }
  return {};
}

/// Absent stands for a member of another type, or none.
std::optional<std::string> text_of(const Json& object, std::string_view key) {
  const auto member = object.find(key);
  if (member == object.end()) return std::nullopt;
  if (member->is_null()) return std::string();
  if (!member->is_string()) return std::nullopt;
  return member->get<std::string>();
}

bool take_sources(const Json& object, std::vector<EntrySource>& into) {
  const auto list = object.find("sources");
  if (list == object.end() || !list->is_array()) return false;
  for (const Json& item : *list) {
    if (!item.is_object()) return false;
    const auto test = text_of(item, "test"), file = text_of(item, "file"), sha256 = text_of(item, "sha256");
    if (!test || !file || !sha256 || !is_sha256(*sha256)) return false;
    into.push_back({*test, *file, *sha256});
  }
  return true;
}

bool take_numbers(const Json& object, EntryContent& content) {
  const auto attempt = object.find("attempt"), corrects = object.find("corrects");
  if (attempt == object.end() || corrects == object.end()) return false;
  if (attempt->is_number_integer()) content.attempt = attempt->get<int>();
  else if (!attempt->is_null()) return false;
  if (corrects->is_number_integer()) content.corrects = corrects->get<std::int64_t>();
  else if (!corrects->is_null()) return false;
  return true;
}

}  // namespace

std::string_view name(EntryKind kind) {
  switch (kind) {
    case EntryKind::unit: return "unit";
    case EntryKind::lot: return "lot";
    case EntryKind::check: return "check";
    case EntryKind::correction: return "correction";
  }
  return "unit";
}

std::optional<EntryKind> entry_kind(std::string_view text) {
  for (const EntryKind kind : kEntryKinds) {
    if (name(kind) == text) return kind;
  }
  return std::nullopt;
}

Result<std::string> body_of(const EntryContent& content) {
  if (const Result<void> fine = check_fields(content); !fine) return failure(fine);
  Json body{{"schema", kSchema},
            {"kind", name(content.kind)},
            {"time", to_text(content.time)},
            {"part", text_or_null(content.part)},
            {"revision", text_or_null(content.revision)},
            {"supplier", text_or_null(content.supplier)},
            {"sheet_sha256", text_or_null(content.sheet_sha256)},
            {"lot", text_or_null(content.lot)},
            {"serial", text_or_null(content.serial)},
            {"attempt", content.attempt == 0 ? Json(nullptr) : Json(content.attempt)},
            {"verdict", text_or_null(content.verdict)},
            {"operator", text_or_null(content.operator_name)},
            {"instrument", text_or_null(content.instrument)},
            {"program", text_or_null(content.program)}};
  Json sources = Json::array();
  for (const EntrySource& source : content.sources) {
    sources.push_back({{"test", text_or_null(source.test)}, {"file", text_or_null(source.file)}, {"sha256", source.sha256}});
  }
  body["sources"] = std::move(sources);
  body["corrects"] = content.corrects ? Json(*content.corrects) : Json(nullptr);
  body["reason"] = text_or_null(content.reason);

  if (!content.details.empty()) {
    const Json details = object_of(content.details);
    if (details.is_null()) return refused("the details of an entry are no JSON object", "pass one, with at most 64 levels");
    for (const auto& [key, value] : details.items()) {
      if (std::find(kEntryMembers.begin(), kEntryMembers.end(), key) != kEntryMembers.end()) {
        return refused("the details repeat '" + key + "', which an entry has already", "leave it to the field of that name");
      }
      body[key] = value;
    }
  }
  try {
    return body.dump();
  } catch (const Json::type_error&) {  // the library's way of saying so
    return refused("a text of an entry is no valid UTF-8", "pass it through the escaping of outside text first");
  }
}

Result<EntryContent> content_of(std::string_view text) {
  const auto broken = [] {
    return refused("the text of an entry is not one this program writes", "coilassay ledger verify says what is wrong");
  };
  Json body = object_of(text);
  if (body.is_null() || text_of(body, "schema") != std::string(kSchema)) return broken();
  EntryContent content;
  const auto kind = entry_kind(text_of(body, "kind").value_or(""));
  const auto time = parse_utc_time(text_of(body, "time").value_or(""));
  if (!kind || !time || !take_numbers(body, content) || !take_sources(body, content.sources)) return broken();
  content.kind = *kind;
  content.time = *time;
  for (const auto& [key, field] : {std::pair{"part", &content.part}, {"revision", &content.revision},
                                   {"supplier", &content.supplier}, {"sheet_sha256", &content.sheet_sha256},
                                   {"lot", &content.lot}, {"serial", &content.serial}, {"verdict", &content.verdict},
                                   {"operator", &content.operator_name}, {"instrument", &content.instrument},
                                   {"program", &content.program}, {"reason", &content.reason}}) {
    const auto value = text_of(body, key);
    if (!value) return broken();
    *field = *value;
  }
  for (const std::string_view key : kEntryMembers) body.erase(std::string(key));
  content.details = body.dump();
  if (!check_fields(content)) return broken();
  return content;
}

std::string entry_hash(std::string_view previous, std::string_view body) {
  Sha256 digest;
  digest.add(previous);
  digest.add(std::string_view("\n"));
  digest.add(body);
  return digest.finish();
}

}  // namespace coilassay
