#include "acquire/fixture_set.h"

#include <fmt/format.h>

#include <cmath>

#include "acquire/number_scan.h"
#include "acquire/table_cells.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/sheet.h"
#include "base/utc_time.h"

namespace coilassay {

namespace {

constexpr std::size_t kFewestPoints = 2;

/// Asks for keys one after another and keeps the first error, so that every key becomes known to the sheet.
class Asking {
 public:
  explicit Asking(SheetTable root) : root_(std::move(root)) {}

  std::optional<SheetTable> table(const char* name) { return got(root_.table(name)); }

  std::string text(const std::optional<SheetTable>& table, const char* key) {
    if (!table) return {};
    return got(table->text(key)).value_or("");
  }
  std::optional<StatedValue> value(const std::optional<SheetTable>& table, const char* key, Unit unit, bool not_negative) {
    if (!table) return std::nullopt;
    const auto read = got(table->value(key, unit));
    if (read && (!std::isfinite(read->value) || (not_negative && read->value < 0))) {
      refuse(Problem::bad_number, table->place(key), fmt::format("'{}' cannot be negative", key), "give zero or a value above it");
    }
    return read;
  }

  void refuse(Problem problem, std::string place, std::string finding, std::string remedy) {
    if (!error) error = Error{problem, std::move(place), std::move(finding), std::move(remedy)};
  }

  template <class T>
  std::optional<T> got(const Result<std::optional<T>>& read) {
    if (read) return *read;
    if (!error) error = read.error();
    return std::nullopt;
  }

  std::string place(const char* key) const { return root_.place(key); }
  Result<void> refuse_unknown_keys() const { return root_.refuse_unknown_keys(); }
  std::optional<Error> error;

 private:
  SheetTable root_;
};

MeasuredStandard standard_of(Asking& ask, const std::optional<SheetTable>& table) {
  return {ask.text(table, "file"), ask.text(table, "sha256"), {}};
}

/// A load is in ohm or in farad.
void read_load(Asking& ask, FixtureSet& set) {
  const auto table = ask.table("load");
  if (!table) return;
  set.load = standard_of(ask, table);
  const auto in_ohm = table->value("value", Unit::ohm);
  if (in_ohm) {
    set.load_value = *in_ohm;
  } else {
    set.load_value = ask.got(table->value("value", Unit::farad));
  }
  if (!set.load_value) {
    ask.refuse(Problem::bad_sheet, table->place("value"), "the load's 'value' is missing", "write it like value = \"100 ohm ± 0.1 %\"");
  } else if (!(set.load_value->value > 0)) {
    ask.refuse(Problem::bad_number, table->place("value"), "the load's value must be above zero", "write it like value = \"100 ohm ± 0.1 %\"");
  }
  set.load_inductance = ask.value(table, "inductance", Unit::henry, true);
}

void read_row(Asking& ask, const std::string& place, std::size_t row, const std::string& text, FixtureSet& set) {
  const std::size_t numbers = set.load ? 7 : 5;
  std::vector<double> read;
  for (const std::string_view cell : cells_of(text, ' ')) {
    const auto number = parse_plain_number(cell);
    if (!number) {
      ask.refuse(Problem::bad_sheet, place, fmt::format("row {} of grid.points: '{}' is no number", row + 1, shown(std::string(cell), 40)),
                 "make the set again with coilassay fixture");
      return;
    }
    read.push_back(*number);
  }
  if (read.size() != numbers) {
    ask.refuse(Problem::bad_sheet, place, fmt::format("row {} of grid.points has {} numbers of {}", row + 1, read.size(), numbers),
               "a row is a frequency, then the real and imaginary part of each standard");
    return;
  }
  if (!(read[0] > 0) || (!set.frequency_hz.empty() && !(read[0] > set.frequency_hz.back()))) {
    ask.refuse(Problem::bad_sheet, place, fmt::format("row {} of grid.points: frequencies must be above zero and rise", row + 1),
               "make the set again with coilassay fixture");
    return;
  }
  set.frequency_hz.push_back(read[0]);
  set.open.z_ohm.emplace_back(read[1], read[2]);
  set.short_circuit.z_ohm.emplace_back(read[3], read[4]);
  if (set.load) set.load->z_ohm.emplace_back(read[5], read[6]);
}

void read_grid(Asking& ask, FixtureSet& set) {
  const auto table = ask.table("grid");
  const auto rows = table ? ask.got(table->texts("points")) : std::nullopt;
  if (!rows || rows->size() < kFewestPoints) {
    ask.refuse(Problem::bad_sheet, ask.place("grid"), "the set has no measured points", "make the set again with coilassay fixture");
    return;
  }
  const std::string place = table->place("points");
  for (std::size_t row = 0; row < rows->size(); ++row) read_row(ask, place, row, (*rows)[row], set);
}

void read_head(Asking& ask, FixtureSet& set) {
  const auto head = ask.table("fixture");
  if (!head) {
    ask.refuse(Problem::bad_sheet, ask.place("fixture"), "it has no section [fixture]: it is not a fixture set",
               "make one with coilassay fixture");
    return;
  }
  set.name = ask.text(head, "name");
  const auto made = ask.got(head->date("made"));
  if (!made) ask.refuse(Problem::bad_sheet, head->place("made"), "the day on which it was made is missing", "write it like made = 2026-03-04");
  set.made = made.value_or(std::chrono::year_month_day{});
  set.expires = ask.got(head->date("expires"));
  const std::string connection = ask.text(head, "connection");
  if (!connection.empty()) {
    const auto known = parse_connection(connection);
    if (!known) {
      ask.refuse(Problem::bad_sheet, head->place("connection"), fmt::format("'{}' is no connection", shown(connection, 30)),
                 "write reflect, series or shunt");
    }
    set.connection = known.value_or(Connection::reflect);
  }
  const auto port = ask.got(head->integer("port"));
  if (port && (*port < 1 || *port > 99)) {
    ask.refuse(Problem::bad_sheet, head->place("port"), "ports count from 1", "write the number of the port the fixture is on");
  }
  set.port = static_cast<std::size_t>(port.value_or(1));
}

Result<FixtureSet> set_of(SheetTable root) {
  Asking ask(std::move(root));
  FixtureSet set;
  read_head(ask, set);
  const auto open = ask.table("open"), short_circuit = ask.table("short");
  set.open = standard_of(ask, open);
  set.open_capacitance = ask.value(open, "capacitance", Unit::farad, true);
  set.short_circuit = standard_of(ask, short_circuit);
  const auto inductance = ask.value(short_circuit, "inductance", Unit::henry, true);
  if (!inductance) {
    ask.refuse(Problem::bad_sheet, short_circuit ? short_circuit->place("inductance") : ask.place("short"),
               "the short's own inductance is missing; it has no default, for conventions differ",
               "write it like inductance = \"0.4 nH ± 0.1 nH\", or inductance = \"0 nH\" where that is the convention");
  } else {
    set.short_inductance = *inductance;
  }
  set.short_resistance = ask.value(short_circuit, "resistance", Unit::ohm, true);
  read_load(ask, set);
  read_grid(ask, set);
  if (ask.error) return tl::make_unexpected(*ask.error);
  if (const auto known = ask.refuse_unknown_keys(); !known) return failure(known);
  return set;
}

std::string quoted(const std::string& text) {
  std::string safe = "\"";
  for (const char c : shown(text, 200)) {
    if (c == '"' || c == '\\') safe += '\\';
    safe += c;
  }
  return safe + "\"";
}

}  // namespace

std::string_view name(Connection connection) {
  switch (connection) {
    case Connection::reflect: return "reflect";
    case Connection::series: return "series";
    case Connection::shunt: return "shunt";
  }
  return "";
}

std::optional<Connection> parse_connection(std::string_view text) {
  for (const Connection each : {Connection::reflect, Connection::series, Connection::shunt}) {
    if (text == name(each)) return each;
  }
  return std::nullopt;
}

std::string sheet_value_text(const StatedValue& v) {
  const std::string unit = v.unit == Unit::one ? "" : " " + std::string(symbol(v.unit));
  std::string text = to_shortest(v.value) + unit;
  if (v.law == Law::exact) text += " ± 0 %";
  if (v.law == Law::rectangular) text += " ± " + to_shortest(v.half_width) + unit;
  if (v.law == Law::normal) text += " ± " + to_shortest(2 * v.standard_uncertainty) + unit + " (k=2)";
  return text;
}

Result<FixtureSet> read_fixture_set(const std::string& path) {
  Result<SheetTable> sheet = read_sheet(path);
  if (!sheet) return failure(sheet);
  return set_of(std::move(*sheet));
}

Result<FixtureSet> parse_fixture_set(std::string_view text, std::string_view name) {
  Result<SheetTable> sheet = parse_sheet(text, name);
  if (!sheet) return failure(sheet);
  return set_of(std::move(*sheet));
}

std::string fixture_set_text(const FixtureSet& set) {
  std::string text = "# What this fixture adds to a part: its standards as measured. Made by coilassay fixture; see docs/formats.md.\n";
  text += "[fixture]\nname = " + quoted(set.name) + "\nmade = " + to_text(set.made) + "\n";
  if (set.expires) text += "expires = " + to_text(*set.expires) + "\n";
  text += "connection = \"" + std::string(name(set.connection)) + "\"\nport = " + std::to_string(set.port) + "\n";
  const auto standard = [&](const char* section, const MeasuredStandard& measured) {
    text += "\n[" + std::string(section) + "]\nfile = " + quoted(measured.file) + "\nsha256 = " + quoted(measured.sha256) + "\n";
  };
  const auto value = [&](const char* key, const std::optional<StatedValue>& stated) {
    if (stated) text += std::string(key) + " = \"" + sheet_value_text(*stated) + "\"\n";
  };
  standard("open", set.open);
  value("capacitance", set.open_capacitance);
  standard("short", set.short_circuit);
  value("inductance", set.short_inductance);
  value("resistance", set.short_resistance);
  if (set.load) {
    standard("load", *set.load);
    value("value", set.load_value);
    value("inductance", set.load_inductance);
  }
  text += "\n[grid]\n# frequency in Hz, then the real and imaginary part in ohm of open, short";
  text += set.load ? " and load\npoints = [\n" : "\npoints = [\n";
  for (std::size_t i = 0; i < set.frequency_hz.size(); ++i) {
    text += "  \"" + to_shortest(set.frequency_hz[i]);
    for (const MeasuredStandard* each : {&set.open, &set.short_circuit, set.load ? &*set.load : nullptr}) {
      if (each != nullptr) text += " " + to_shortest(each->z_ohm[i].real()) + " " + to_shortest(each->z_ohm[i].imag());
    }
    text += "\",\n";
  }
  return text + "]\n";
}

}  // namespace coilassay
