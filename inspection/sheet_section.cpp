#include "inspection/sheet_section.h"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "base/number_text.h"
#include "base/outside_text.h"

namespace coilassay {

namespace {

std::string_view rule(SheetRange range) {
  switch (range) {
    case SheetRange::any: return "a finite value";
    case SheetRange::not_zero: return "a value other than zero";
    case SheetRange::above_zero: return "a value above zero";
    case SheetRange::not_negative: return "zero or a value above it";
    case SheetRange::fraction: return "a value above 0 and below 1, such as \"5 %\"";
  }
  return "";
}

}  // namespace

std::string SheetSection::full(std::string_view key) const {
  return name_.empty() ? std::string(key) : fmt::format("{}.{}", name_, key);
}

void SheetSection::refuse(Problem problem, std::string_view key, std::string finding, std::string remedy) {
  note({problem, place(key), std::move(finding), std::move(remedy)});
}

void SheetSection::note(const Error& error) {
  if (!*error_) *error_ = error;
}

bool SheetSection::fits(std::string_view key, const StatedValue& stated, SheetRange range) {
  const double v = stated.value;
  bool fits = std::isfinite(v);
  switch (range) {
    case SheetRange::any: break;
    case SheetRange::not_zero: fits = fits && v != 0; break;
    case SheetRange::above_zero: fits = fits && v > 0; break;
    case SheetRange::not_negative: fits = fits && v >= 0; break;
    case SheetRange::fraction: fits = fits && v > 0 && v < 1; break;
  }
  if (!fits) {
    refuse(Problem::bad_number, key, fmt::format("'{}' cannot be {}", full(key), to_text(v, stated.unit, Script::ascii)),
           fmt::format("give {}", rule(range)));
    return false;
  }
  const double half = stated.law == Law::rectangular ? stated.half_width
                      : stated.law == Law::normal    ? stated.standard_uncertainty
                                                     : 0;
  const bool too_wide = range == SheetRange::not_negative ? half > v : range != SheetRange::any && half >= std::fabs(v);
  if (too_wide) {
    refuse(Problem::bad_number, key, fmt::format("the tolerance of '{}' is as large as the value, or larger", full(key)),
           "give a smaller tolerance, or leave the key out for the default");
  }
  return !too_wide;
}

std::optional<StatedValue> SheetSection::value(std::string_view key, std::initializer_list<Unit> units, SheetRange range) {
  std::optional<Error> first;
  for (const Unit unit : units) {
    const auto read = table_.value(key, unit);
    if (read) {
      if (*read && !fits(key, **read, range)) return std::nullopt;
      return *read;
    }
    if (!first) first = read.error();
    if (read.error().problem != Problem::wrong_unit) break;
  }
  note(*first);
  return std::nullopt;
}

std::vector<StatedValue> SheetSection::values(std::string_view key, Unit unit, SheetRange range) {
  std::vector<StatedValue> values;
  const auto list = table_.texts(key);
  if (!list) {  // no list: one value then
    if (const auto one = value(key, {unit}, range)) values.push_back(*one);
    return values;
  }
  if (!*list) return values;
  for (const std::string& text : **list) {
    const auto read = parse_value(text, unit, place(key));
    if (!read) {
      note(read.error());
    } else if (fits(key, *read, range)) {
      values.push_back(*read);
    }
  }
  if ((*list)->empty()) refuse(Problem::bad_sheet, key, fmt::format("'{}' is an empty list", full(key)), "leave it out, or fill it in");
  return values;
}

std::optional<double> SheetSection::plain(std::string_view key, std::initializer_list<Unit> units, SheetRange range) {
  const auto stated = value(key, units, range);
  if (!stated) return std::nullopt;
  if (stated->law != Law::unstated && stated->law != Law::exact) {
    refuse(Problem::bad_sheet, key, fmt::format("'{}' has a tolerance, where a single value is needed", full(key)),
           "write the value without \u00b1");
    return std::nullopt;
  }
  return stated->value;
}

std::optional<double> SheetSection::number(std::string_view key, SheetRange range) {
  const auto read = table_.number(key);
  if (!read) {
    note(read.error());
    return std::nullopt;
  }
  if (*read && !fits(key, StatedValue::unstated(**read, Unit::one), range)) return std::nullopt;
  return *read;
}

std::optional<std::uint64_t> SheetSection::count(std::string_view key, std::uint64_t least, std::uint64_t most) {
  const auto read = table_.integer(key);
  if (!read) {
    note(read.error());
    return std::nullopt;
  }
  if (!*read) return std::nullopt;
  if (**read < 0 || static_cast<std::uint64_t>(**read) < least || static_cast<std::uint64_t>(**read) > most) {
    refuse(Problem::bad_number, key, fmt::format("'{}' is {}, which is outside {} to {}", full(key), **read, least, most),
           "give a whole number in that range");
    return std::nullopt;
  }
  return static_cast<std::uint64_t>(**read);
}

std::optional<bool> SheetSection::flag(std::string_view key) {
  const auto read = table_.flag(key);
  if (read) return *read;
  note(read.error());
  return std::nullopt;
}

std::optional<std::chrono::year_month_day> SheetSection::date(std::string_view key) {
  const auto read = table_.date(key);
  if (read) return *read;
  note(read.error());
  return std::nullopt;
}

std::vector<std::string> SheetSection::texts(std::string_view key) {
  const auto list = table_.texts(key);
  if (!list) {
    note(list.error());
    return {};
  }
  return list->value_or(std::vector<std::string>{});
}

std::optional<std::string> SheetSection::text(std::string_view key) {
  const auto read = table_.text(key);
  if (!read) {
    note(read.error());
    return std::nullopt;
  }
  if (*read && (*read)->empty()) {
    refuse(Problem::bad_sheet, key, fmt::format("'{}' is empty", full(key)), "leave it out, or fill it in");
    return std::nullopt;
  }
  return *read;
}

std::optional<std::string> SheetSection::raw_text(std::string_view key) const {
  const auto read = table_.text(key);
  return read ? *read : std::nullopt;
}

std::optional<std::string> SheetSection::choice(std::string_view key, std::initializer_list<std::string_view> allowed) {
  const auto read = text(key);
  if (!read || std::find(allowed.begin(), allowed.end(), *read) != allowed.end()) return read;
  const std::string_view near = nearest(*read, allowed);
  refuse(Problem::bad_sheet, key, fmt::format("'{}' cannot be '{}'", full(key), shown(*read, 60)),
         near.empty() ? fmt::format("write one of: {}", fmt::join(allowed, ", "))
                      : fmt::format("did you mean '{}'? one of: {}", near, fmt::join(allowed, ", ")));
  return std::nullopt;
}

std::optional<SheetSection> SheetSection::section(std::string_view key) {
  auto table = table_.table(key);
  if (!table) {
    note(table.error());
    return std::nullopt;
  }
  if (!*table) return std::nullopt;
  return SheetSection(std::move(**table), full(key), *error_);
}

std::vector<SheetSection> SheetSection::sections(std::string_view key) {
  std::vector<SheetSection> sections;
  auto tables = table_.tables(key);
  if (!tables) {
    note(tables.error());
    return sections;
  }
  for (SheetTable& table : *tables) sections.emplace_back(std::move(table), full(key), *error_);
  return sections;
}

}  // namespace coilassay
