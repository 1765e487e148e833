#include "acquire/bench_sheet.h"

#include <fmt/format.h>

#include <cmath>
#include <filesystem>
#include <initializer_list>

#include "base/outside_text.h"
#include "base/sheet.h"

namespace coilassay {

namespace {

constexpr double kAbsoluteZero_degC = -273.15;

/// What a value must be to make physical sense.
enum class Sense {
  any,
  not_zero,      // a gain: an inverted probe is one
  above_zero,    // a capacitor, a resistance
  not_negative,  // strays and losses: may be as little as nothing
};

std::string rule(Sense sense) {
  switch (sense) {
    case Sense::any: return "a finite value";
    case Sense::not_zero: return "a value other than zero";
    case Sense::above_zero: return "a value above zero";
    case Sense::not_negative: return "zero or a value above it";
  }
  return "";
}

/// One table of the sheet. Keeps the first error and goes on asking, so that every key becomes known to the sheet.
class Section {
 public:
  Section(SheetTable table, std::string name, std::optional<Error>& error)
      : table_(std::move(table)), name_(std::move(name)), error_(error) {}

  std::string place(std::string_view key) const { return table_.place(key); }
  std::string full(std::string_view key) const { return fmt::format("{}.{}", name_, key); }

  void refuse(Problem problem, std::string_view key, std::string finding, std::string remedy) {
    if (!error_) error_ = Error{problem, place(key), std::move(finding), std::move(remedy)};
  }

  /// A value of the first of the units that fits; a bare number is taken in the first one.
  std::optional<StatedValue> value(std::string_view key, std::initializer_list<Unit> units, Sense sense) {
    std::optional<Error> first;
    for (const Unit unit : units) {
      const auto read = table_.value(key, unit);
      if (read) {
        if (*read) check(key, **read, sense);
        return *read;
      }
      if (!first) first = read.error();
      if (read.error().problem != Problem::wrong_unit) break;
    }
    note(*first);
    return std::nullopt;
  }
  std::optional<StatedValue> value(std::string_view key, Unit unit, Sense sense) { return value(key, {unit}, sense); }

  std::optional<std::vector<std::string>> texts(std::string_view key) {
    const auto read = table_.texts(key);
    if (read) return *read;
    note(read.error());
    return std::nullopt;
  }

  std::optional<long long> integer(std::string_view key) {
    const auto read = table_.integer(key);
    if (read) return *read;
    note(read.error());
    return std::nullopt;
  }

  /// Text that is not empty.
  std::optional<std::string> text(std::string_view key) {
    const auto read = table_.text(key);
    if (!read) {
      note(read.error());
      return std::nullopt;
    }
    if (*read && (*read)->empty())
      refuse(Problem::bad_sheet, key, fmt::format("'{}' is empty", full(key)), "leave it out, or fill it in");
    return *read;
  }

  /// A channel's name in quotes, or its position as a bare number.
  std::optional<std::string> column(std::string_view key) {
    const auto position = table_.integer(key);
    if (!position) return text(key);
    if (!*position) return std::nullopt;
    if (**position < 1) {
      refuse(Problem::bad_sheet, key, fmt::format("'{}' is {}; columns count from 1", full(key), **position),
             "give the position of the column, or its name in quotes");
    }
    return std::to_string(**position);
  }

  std::optional<std::chrono::year_month_day> date(std::string_view key) {
    const auto read = table_.date(key);
    if (!read) {
      note(read.error());
      return std::nullopt;
    }
    return *read;
  }

 private:
  void note(const Error& error) {
    if (!error_) error_ = error;
  }

  void check(std::string_view key, const StatedValue& stated, Sense sense) {
    const double v = stated.value;
    const bool fits = sense == Sense::any || (sense == Sense::not_zero && v != 0) ||
                      (sense == Sense::above_zero && v > 0) || (sense == Sense::not_negative && v >= 0);
    if (!std::isfinite(v) || !fits) {
      refuse(Problem::bad_number, key,
             fmt::format("'{}' cannot be {}", full(key),
                         v < 0    ? "negative"
                         : v == 0 ? "zero"
                                  : "that"),
             "give " + rule(sense));
      return;
    }
    if (sense == Sense::any) return;
    // What must not vanish cannot be known to 100 %; what may be nothing can.
    const double half = stated.law == Law::rectangular ? stated.half_width
                        : stated.law == Law::normal    ? stated.standard_uncertainty
                                                       : 0;
    const bool too_wide = sense == Sense::not_negative ? half > v : half >= std::fabs(v);
    if (too_wide) {
      const std::string finding =
          sense == Sense::not_negative
              ? fmt::format("the tolerance of '{}' reaches below zero", full(key))
              : fmt::format("the tolerance of '{}' is as large as the value, or larger", full(key));
      refuse(Problem::bad_number, key, finding, "give a smaller tolerance, or leave the key out for the default");
    }
  }

  SheetTable table_;
  std::string name_;
  std::optional<Error>& error_;
};

/// The sheet's tables, asked for one after another.
class Reading {
 public:
  explicit Reading(SheetTable root) : root_(std::move(root)) {}

  std::optional<Section> section(const std::string& name) {
    auto table = root_.table(name);
    if (!table) {
      if (!error) error = table.error();
      return std::nullopt;
    }
    if (!*table) return std::nullopt;
    return Section(std::move(**table), name, error);
  }

  std::vector<Section> sections(const std::string& name) {
    std::vector<Section> sections;
    auto tables = root_.tables(name);
    if (!tables) {
      if (!error) error = tables.error();
      return sections;
    }
    for (SheetTable& table : *tables) sections.emplace_back(std::move(table), name, error);
    return sections;
  }

  std::optional<Error> error;

 private:
  SheetTable root_;
};

void read_columns(Section& section, ChannelSetup& channel) {
  channel.column = section.column("column");
  channel.low_column = section.column("low_column");
  if (channel.low_column && channel.low_column == channel.column) {
    section.refuse(Problem::bad_sheet, "low_column", "column and low_column are the same: their difference is nothing",
                   "name the column that is to be subtracted");
  }
}

void read_voltage(Section& section, ChannelSetup& voltage) {
  read_columns(section, voltage);
  voltage.gain = section.value("gain", Unit::one, Sense::not_zero);
  voltage.full_scale = section.value("full_scale", Unit::volt, Sense::above_zero);
  voltage.input_capacitance = section.value("input_capacitance", Unit::farad, Sense::not_negative);
  voltage.input_resistance = section.value("input_resistance", Unit::ohm, Sense::above_zero);
}

void read_current(Section& section, ChannelSetup& current) {
  read_columns(section, current);
  current.gain = section.value("gain", {Unit::one, Unit::ampere_per_volt}, Sense::not_zero);
  current.shunt = section.value("shunt", Unit::ohm, Sense::above_zero);
  // Across a shunt, and behind a probe in A/V, the column is volts.
  const bool volts = current.shunt || (current.gain && current.gain->unit == Unit::ampere_per_volt);
  current.full_scale = volts ? section.value("full_scale", Unit::volt, Sense::above_zero)
                             : section.value("full_scale", {Unit::ampere, Unit::volt}, Sense::above_zero);
  current.shunt_inductance = section.value("shunt_inductance", Unit::henry, Sense::not_negative);
  current.skew = section.value("skew", Unit::second, Sense::any);
  current.probe_corner = section.value("probe_corner", Unit::hertz, Sense::above_zero);
  if (current.shunt && current.gain && current.gain->unit == Unit::ampere_per_volt) {
    section.refuse(Problem::bad_sheet, "gain", "a shunt and a gain in A/V: the column cannot be both",
                   "leave out the shunt, or give the gain as a plain number");
  }
}

void read_timebase(Section& section, BenchSetup& setup) {
  setup.timebase = section.value("tolerance", Unit::one, Sense::not_negative);
  if (!setup.timebase) return;
  if (setup.timebase->law != Law::unstated && setup.timebase->law != Law::exact) {
    section.refuse(Problem::bad_sheet, "tolerance", "the tolerance of the time base is itself the half-width",
                   "write tolerance = \"25 ppm\", without ±");
  } else if (setup.timebase->value >= 1) {
    section.refuse(Problem::bad_number, "tolerance", "a time base off by its whole value is no clock",
                   "write tolerance = \"25 ppm\"");
  }
}

/// A value of this section is itself the half-width of what may be wrong.
void read_accuracy(Section& section, ImpedanceAccuracy& accuracy) {
  const auto half_width = [&](std::string_view key, Unit unit) {
    const auto value = section.value(key, unit, Sense::not_negative);
    if (value && value->law != Law::unstated && value->law != Law::exact) {
      section.refuse(Problem::bad_sheet, key, fmt::format("'{}' is itself the half-width", section.full(key)),
                     "write it without ±, as the data sheet states it");
    }
    if (value && unit == Unit::one && value->value >= 1) {
      section.refuse(Problem::bad_number, key, fmt::format("'{}' is the whole value or more", section.full(key)),
                     "write accuracy = \"0.1 %\"");
    }
    return value;
  };
  accuracy.ratio = half_width("accuracy", Unit::one);
  accuracy.series_floor = half_width("series_floor", Unit::ohm);
  accuracy.parallel_floor = half_width("parallel_floor", Unit::siemens);
  accuracy.scattering = half_width("scattering", Unit::one);
}

CapacitorSetup read_capacitor(Section& section) {
  CapacitorSetup capacitor;
  const auto value = section.value("value", Unit::farad, Sense::above_zero);
  if (!value)
    section.refuse(Problem::bad_sheet, "value", "a [[capacitor]] without its value", "write value = \"10 nF ± 1 %\"");
  if (value) capacitor.value = *value;
  capacitor.dissipation_factor = section.value("dissipation_factor", Unit::one, Sense::not_negative);
  if (capacitor.dissipation_factor && capacitor.dissipation_factor->value >= 1) {
    section.refuse(Problem::bad_number, "dissipation_factor", "a dissipation factor of 1 or more is a resistor's",
                   "give the tangent of the loss angle, such as \"0.0005\" or \"0.05 %\"");
  }
  return capacitor;
}

/// One character, or its name; nothing a number is written with.
std::optional<char> read_delimiter(Section& section) {
  const auto text = section.text("delimiter");
  if (!text || text->empty()) return std::nullopt;
  if (*text == "tab") return '\t';
  if (*text == "space") return ' ';
  const char c = text->front();
  const bool usable = text->size() == 1 && (c == '\t' || (c >= ' ' && c <= '~')) &&
                      std::string_view("0123456789.+-\"'eEdD").find(c) == std::string_view::npos;
  if (!usable) {
    section.refuse(Problem::bad_sheet, "delimiter", fmt::format("'{}' cannot stand between columns", shown(*text)),
                   "write one character, \",\" or \";\", or \"tab\" or \"space\"");
    return std::nullopt;
  }
  return c;
}

std::optional<char> read_decimal(Section& section) {
  const auto text = section.text("decimal");
  if (!text || text->empty()) return std::nullopt;
  if (*text != "." && *text != ",") {
    section.refuse(Problem::bad_sheet, "decimal", fmt::format("'{}' is no decimal sign", shown(*text)),
                   "write \".\" or \",\"");
    return std::nullopt;
  }
  return text->front();
}

void read_file(Section& section, ReadOptions& reading) {
  reading.delimiter = read_delimiter(section);
  reading.decimal = read_decimal(section);
  if (const auto interval = section.value("sample_interval", Unit::second, Sense::above_zero)) {
    reading.sample_interval_s = interval->value;
    if (interval->law == Law::rectangular || interval->law == Law::normal) {
      section.refuse(Problem::bad_sheet, "sample_interval", "the error of the sampling clock is stated elsewhere",
                     "write it as the tolerance of [timebase]");
    }
  }
  reading.columns = section.texts("columns").value_or(std::vector<std::string>{});
  if (const auto skip = section.integer("skip")) {
    if (*skip < 0) {
      section.refuse(Problem::bad_number, "skip", "'file.skip' cannot be negative", "give the number of lines to pass over");
    } else {
      reading.skip = static_cast<std::size_t>(*skip);
    }
  }
  if (reading.delimiter && reading.delimiter == reading.decimal) {
    section.refuse(Problem::bad_sheet, "decimal", "the decimal sign and the delimiter are the same",
                   "files with a decimal comma have \";\" or \"tab\" between their columns");
  }
}

std::string as_text(std::chrono::year_month_day day) {
  return fmt::format("{:04}-{:02}-{:02}", static_cast<int>(day.year()), static_cast<unsigned>(day.month()),
                     static_cast<unsigned>(day.day()));
}

EquipmentItem read_equipment(Section& section) {
  EquipmentItem item;
  const auto id = section.text("id");
  if (!id) section.refuse(Problem::bad_sheet, "id", "an [[equipment]] without its id", "write id = \"DMM-3\"");
  item.id = id.value_or("");
  item.certificate = section.text("certificate").value_or("");
  const auto calibrated = section.date("calibrated"), due = section.date("due");
  if (calibrated) item.calibrated = as_text(*calibrated);
  if (due) item.due = as_text(*due);
  if (calibrated && due && *due < *calibrated) {
    section.refuse(Problem::bad_sheet, "due",
                   fmt::format("calibration of '{}' is due before it was done", shown(item.id)), "check the two dates");
  }
  return item;
}

std::string resolved(const std::string& path, const std::string& sheet) {
  const std::filesystem::path given(path);
  return given.is_absolute() ? path : (std::filesystem::path(sheet).parent_path() / given).lexically_normal().string();
}

}  // namespace

Result<BenchSetup> read_bench_sheet(const std::string& path) {
  const auto sheet = read_sheet(path);
  if (!sheet) return failure(sheet);
  Reading reading(*sheet);
  BenchSetup setup;
  if (auto section = reading.section("voltage")) read_voltage(*section, setup.voltage);
  if (auto section = reading.section("current")) read_current(*section, setup.current);
  if (auto section = reading.section("timebase")) read_timebase(*section, setup);
  for (Section& section : reading.sections("capacitor")) setup.capacitors.push_back(read_capacitor(section));
  if (auto section = reading.section("across")) {
    setup.across_resistance = section->value("resistance", Unit::ohm, Sense::above_zero);
    setup.across_capacitance = section->value("capacitance", Unit::farad, Sense::not_negative);
  }
  if (auto section = reading.section("winding")) {
    setup.winding_resistance = section->value("resistance", Unit::ohm, Sense::above_zero);
  }
  if (auto section = reading.section("impedance")) read_accuracy(*section, setup.impedance);
  if (auto section = reading.section("stimulus")) {
    setup.level = section->value("level", Unit::volt, Sense::not_negative);
    setup.bias = section->value("bias", Unit::ampere, Sense::any);
  }
  if (auto section = reading.section("room")) {
    setup.temperature = section->value("temperature", Unit::degree_celsius, Sense::any);
    if (setup.temperature && setup.temperature->value < kAbsoluteZero_degC) {
      section->refuse(Problem::bad_number, "temperature", "'room.temperature' is below absolute zero",
                      "give it in degC");
    }
  }
  if (auto section = reading.section("fixture")) {
    setup.fixture_set = section->text("set");
    if (setup.fixture_set) setup.fixture_set = resolved(*setup.fixture_set, path);
  }
  if (auto section = reading.section("file")) read_file(*section, setup.reading);
  for (Section& section : reading.sections("equipment")) setup.equipment.push_back(read_equipment(section));
  // A misspelt key is often why another is missing: it is named first.
  if (const auto known = sheet->refuse_unknown_keys(); !known) return failure(known);
  if (reading.error) return tl::make_unexpected(*reading.error);
  return setup;
}

}  // namespace coilassay
