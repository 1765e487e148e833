#include "inspection/part_sheet_tests.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <filesystem>

#include "base/outside_text.h"

namespace coilassay {

namespace {

bool is_kind(std::string_view text) {
  constexpr std::string_view kKinds[] = {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance", "reading"};
  return std::find(std::begin(kKinds), std::end(kKinds), text) != std::end(kKinds);
}

std::string resolved(const std::string& path, const std::string& sheet) {
  const std::filesystem::path given(path);
  return given.is_absolute() ? path : (std::filesystem::path(sheet).parent_path() / given).lexically_normal().string();
}

std::optional<std::string> read_path(SheetSection& section, std::string_view key, const std::string& sheet_path) {
  const auto path = section.text(key);
  if (!path) return std::nullopt;
  return resolved(*path, sheet_path);
}

/// Only letters, digits, - and _: the name is a part of file names.
void check_name(SheetSection& section, const std::string& test_name) {
  const bool fine = !test_name.empty() && std::all_of(test_name.begin(), test_name.end(), [](char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9') || c == '-' || c == '_';
  });
  const bool number = std::all_of(test_name.begin(), test_name.end(), [](char c) { return c >= '0' && c <= '9'; });
  if (fine && !number) return;
  section.refuse(Problem::bad_sheet, "kind", fmt::format("a test cannot be called '{}': its name is part of file names", shown(test_name, 60)),
                 "use letters, digits, - and _, and not digits alone");
}

void read_what_is_across(SheetSection& section, TestPlan& test) {
  test.capacitors = section.values("capacitor", Unit::farad, SheetRange::above_zero);
  test.dissipation_factors = section.values("capacitor_dissipation", Unit::one, SheetRange::not_negative);
  test.probe_capacitance = section.value("probe_capacitance", {Unit::farad}, SheetRange::not_negative);
  test.probe_resistance = section.value("probe_resistance", {Unit::ohm}, SheetRange::above_zero);
  test.across_resistance = section.value("across", {Unit::ohm}, SheetRange::above_zero);
  test.across_capacitance = section.value("across_capacitance", {Unit::farad}, SheetRange::not_negative);
  const std::size_t losses = test.dissipation_factors.size();
  if (losses > 1 && losses != test.capacitors.size()) {
    section.refuse(Problem::bad_sheet, "capacitor_dissipation",
                   fmt::format("{} dissipation factors for {} capacitors", losses, test.capacitors.size()),
                   "give one for all, or one for each");
  }
  for (const StatedValue& loss : test.dissipation_factors) {
    if (loss.value >= 1) {
      section.refuse(Problem::bad_number, "capacitor_dissipation", "a dissipation factor of 1 or more is a resistor's",
                     "give the tangent of the loss angle, such as \"0.0005\"");
    }
  }
}

void read_sweep(SheetSection& section, TestPlan& test) {
  test.connection = section.choice("connection", {"reflect", "series", "shunt"});
  if (const auto port = section.count("port", 1, 1000)) test.port = static_cast<std::size_t>(*port);
  test.from_waveform = section.flag("from_waveform").value_or(false);
}

void read_frequencies(SheetSection& section, TestPlan& test) {
  for (const StatedValue& at : section.values("at", Unit::hertz, SheetRange::above_zero)) test.at_hz.push_back(at.value);
}

void read_coupling(SheetSection& section, TestPlan& test) {
  test.dots = section.choice("dots", {"same", "opposite"});
  test.link_inductance = section.value("link_inductance", {Unit::henry}, SheetRange::not_negative);
  test.link_resistance = section.value("link_resistance", {Unit::ohm}, SheetRange::not_negative);
  test.winding_resistances = section.values("winding_resistance", Unit::ohm, SheetRange::above_zero);
  if (!test.winding_resistances.empty() && test.winding_resistances.size() != 2) {
    section.refuse(Problem::bad_sheet, "winding_resistance", "two windings have two resistances",
                   "write [\"1 ohm\", \"2 ohm\"]");
  }
}

void read_resistance(SheetSection& section, TestPlan& test) {
  test.material = section.choice("material", {"copper", "aluminium"});
  test.temperature_coefficient = section.value("temperature_coefficient", {Unit::one}, SheetRange::above_zero);
  if (test.material && test.temperature_coefficient) {
    section.refuse(Problem::bad_sheet, "temperature_coefficient", "a material and a temperature coefficient state the same twice",
                   "leave one out");
  }
}

}  // namespace

TestPlan read_test_plan(SheetSection& section, const std::string& test_name, const std::string& sheet_path) {
  TestPlan test;
  test.name = test_name;
  test.place = section.place();
  check_name(section, test_name);
  const auto kind = section.choice("kind", {"ringdown", "ramp", "sine", "sweep", "coupling", "resistance", "reading"});
  const bool named_by_kind = is_kind(test_name);
  if (!kind && !named_by_kind) {
    section.refuse(Problem::bad_sheet, "kind", fmt::format("[test.{}] does not say what kind of test it is", shown(test_name, 60)),
                   "write kind = \"ringdown\", or ramp, sine, sweep, coupling, resistance");
  } else if (kind && named_by_kind && *kind != test_name) {
    section.refuse(Problem::bad_sheet, "kind", fmt::format("[test.{}] is said to be of the kind {}", test_name, *kind),
                   "give the test another name, or leave kind out");
  }
  test.kind = kind.value_or(named_by_kind ? test_name : "");
  if (const auto repeats = section.count("repeats", 1, 1000)) test.repeats = static_cast<std::size_t>(*repeats);
  if (test.kind == "reading") return test;

  test.bench = read_path(section, "bench", sheet_path);
  test.segment = section.text("segment");
  test.from_s = section.plain("from", {Unit::second}, SheetRange::any);
  test.to_s = section.plain("to", {Unit::second}, SheetRange::any);
  if (test.from_s && test.to_s && *test.from_s >= *test.to_s) {
    section.refuse(Problem::bad_sheet, "to", "the window ends before it begins", "give a 'to' later than 'from'");
  }
  test.level = section.value("level", {Unit::volt}, SheetRange::not_negative);
  test.temperature = section.value("temperature", {Unit::degree_celsius}, SheetRange::any);
  test.biases = section.values("bias", Unit::ampere, SheetRange::any);
  if (test.biases.size() > 1 && test.kind != "sine") {
    section.refuse(Problem::bad_sheet, "bias", "only sine captures make a table over the bias", "give one bias");
  }
  // Without a kind every key is taken as known: the missing kind is the error to name, not the keys.
  const auto is = [&](std::string_view one) { return test.kind == one || test.kind.empty(); };
  const bool driven = is("ramp") || is("sine");
  if (driven || is("resistance")) test.shunt = section.value("shunt", {Unit::ohm}, SheetRange::above_zero);
  if (driven) {
    test.skew = section.value("skew", {Unit::second}, SheetRange::any);
    test.dcr = section.value("dcr", {Unit::ohm}, SheetRange::above_zero);
  }
  if (is("ringdown")) read_what_is_across(section, test);
  if (is("sweep") || is("coupling")) {
    read_frequencies(section, test);
    test.fixture = read_path(section, "fixture", sheet_path);
  }
  if (is("sweep")) read_sweep(section, test);
  if (is("coupling")) read_coupling(section, test);
  if (is("resistance")) read_resistance(section, test);
  if (test.joint_captures() > 1 && test.repeats > 1) {
    section.refuse(Problem::bad_sheet, "repeats", "several captures are already measured together here",
                   "leave repeats out: the list says how many captures there are");
  }
  return test;
}

}  // namespace coilassay
