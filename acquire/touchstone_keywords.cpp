#include "acquire/touchstone_keywords.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "acquire/number_scan.h"
#include "acquire/table_cells.h"
#include "base/outside_text.h"

namespace coilassay {
namespace {

constexpr std::size_t kMostPorts = 99;

std::vector<std::string> words_of(std::string_view line) {
  std::vector<std::string> words;
  for (const std::string_view word : cells_of(line, ' ')) words.push_back(lower_case(word));
  return words;
}

std::optional<int> frequency_exponent(const std::string& word) {
  if (word == "hz") return 0;
  if (word == "khz") return 3;
  if (word == "mhz") return 6;
  if (word == "ghz") return 9;
  return std::nullopt;
}

std::optional<PortParameter> parameter(const std::string& word) {
  if (word == "s") return PortParameter::s;
  if (word == "z") return PortParameter::z;
  if (word == "y") return PortParameter::y;
  if (word == "h") return PortParameter::h;
  if (word == "g") return PortParameter::g;
  return std::nullopt;
}

std::optional<TouchstoneSetup::Format> format(const std::string& word) {
  if (word == "ma") return TouchstoneSetup::Format::magnitude_angle;
  if (word == "db") return TouchstoneSetup::Format::decibel_angle;
  if (word == "ri") return TouchstoneSetup::Format::real_imaginary;
  return std::nullopt;
}

std::optional<double> positive(std::string_view word) {
  const CellValue value = read_cell(word, '.');
  if (value.kind != CellKind::number || !(value.value > 0)) return std::nullopt;
  return value.value;
}

tl::unexpected<Error> damaged(const std::string& place, const std::string& finding) {
  return failure(Problem::damaged, place, finding, "repair that line, or export the file again");
}

Result<std::size_t> count_of(const TouchstoneKeyword& keyword, const std::string& place, std::size_t most) {
  const auto value = positive(bare_cell(keyword.rest));
  if (!value || *value > static_cast<double>(most) || *value != std::floor(*value)) {
    return damaged(place, fmt::format("[{}] needs a whole number from 1 to {}, not '{}'", keyword.name, most, shown(keyword.rest, 40)));
  }
  return static_cast<std::size_t>(*value);
}

Result<void> read_references(const std::string& rest, const std::string& place, TouchstoneSetup& setup) {
  for (const std::string& word : words_of(rest)) {
    const auto value = positive(word);
    if (!value) return damaged(place, fmt::format("'{}' is no reference resistance", shown(word, 40)));
    setup.reference_ohm.push_back(*value);
  }
  return {};
}

Result<void> read_order(const TouchstoneKeyword& keyword, const std::string& place, TouchstoneSetup& setup) {
  if (keyword.rest != "12_21" && keyword.rest != "21_12") {
    return damaged(place, fmt::format("[{}] is 12_21 or 21_12, not '{}'", keyword.name, shown(keyword.rest, 40)));
  }
  setup.order_12_21 = keyword.rest == "12_21";
  return {};
}

Result<void> read_matrix(const TouchstoneKeyword& keyword, const std::string& place, TouchstoneSetup& setup) {
  if (keyword.rest == "full") {
    setup.matrix = TouchstoneSetup::MatrixFormat::full;
  } else if (keyword.rest == "lower") {
    setup.matrix = TouchstoneSetup::MatrixFormat::lower;
  } else if (keyword.rest == "upper") {
    setup.matrix = TouchstoneSetup::MatrixFormat::upper;
  } else {
    return damaged(place, fmt::format("[{}] is Full, Lower or Upper, not '{}'", keyword.name, shown(keyword.rest, 40)));
  }
  return {};
}

}  // namespace

bool is_option_line(std::string_view line) {
  line = bare_cell(line);
  if (!line.starts_with('#')) return false;
  const auto words = words_of(line.substr(1));
  std::size_t known = 0;
  for (std::size_t i = 0; i < words.size(); ++i) {
    const bool reference = words[i] == "r" || positive(words[i]);
    if (!frequency_exponent(words[i]) && !parameter(words[i]) && !format(words[i]) && !reference) return false;
    if (!reference) ++known;
  }
  return known >= 2;
}

Result<void> read_option_line(std::string_view line, const std::string& place, TouchstoneSetup& setup) {
  if (setup.option_line_seen) return {};  // only the first counts
  setup.option_line_seen = true;
  const auto words = words_of(bare_cell(line).substr(1));
  for (std::size_t i = 0; i < words.size(); ++i) {
    if (const auto exponent = frequency_exponent(words[i])) {
      setup.frequency_exponent = *exponent;
    } else if (const auto kind = parameter(words[i])) {
      setup.parameter = *kind;
    } else if (const auto form = format(words[i])) {
      setup.format = *form;
    } else if (words[i] == "r") {
      setup.reference_ohm.clear();
      while (i + 1 < words.size() && positive(words[i + 1])) setup.reference_ohm.push_back(*positive(words[++i]));
      if (setup.reference_ohm.empty()) return damaged(place, "the option line has an R without a resistance behind it");
    } else {
      return damaged(place, fmt::format("the option line has '{}', which means nothing", shown(words[i], 40)));
    }
  }
  return {};
}

std::optional<TouchstoneKeyword> keyword_of(std::string_view line) {
  line = bare_cell(line);
  const std::size_t close = line.find(']');
  if (!line.starts_with('[') || close == std::string_view::npos) return std::nullopt;
  return TouchstoneKeyword{lower_case(bare_cell(line.substr(1, close - 1))), lower_case(bare_cell(line.substr(close + 1)))};
}

Result<void> read_keyword(const TouchstoneKeyword& keyword, const std::string& place, TouchstoneSetup& setup) {
  const std::string& name = keyword.name;
  if (name == "version") {
    if (keyword.rest != "2.0" && keyword.rest != "2.1") {
      return damaged(place, fmt::format("version {} is not known; 1.0, 1.1, 2.0 and 2.1 are", shown(keyword.rest, 20)));
    }
    setup.version_2 = true;
    return {};
  }
  if (name == "number of ports") {
    const auto count = count_of(keyword, place, kMostPorts);
    if (!count) return failure(count);
    setup.ports = *count;
    return {};
  }
  if (name == "number of frequencies") {
    const auto count = count_of(keyword, place, std::size_t{1} << 30U);
    if (!count) return failure(count);
    setup.frequencies = *count;
    return {};
  }
  if (name == "reference") {
    setup.reference_ohm.clear();
    return read_references(keyword.rest, place, setup);
  }
  if (name == "reference continued") return read_references(keyword.rest, place, setup);
  if (name == "two-port data order" || name == "two-port order") return read_order(keyword, place, setup);
  if (name == "matrix format") return read_matrix(keyword, place, setup);
  if (name == "mixed-mode order") {
    return failure(Problem::not_a_capture, place, "mixed-mode parameters describe pairs of ports, not coils at ports",
                   "export single-ended parameters");
  }
  // Noise and whatever a later version adds does not change the meaning of the network data.
  return {};
}

}  // namespace coilassay
