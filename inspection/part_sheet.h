// What a part must be, at which conditions, by which rule: the part sheet (docs/formats.md#part-sheet).
#pragma once

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "base/quantity.h"
#include "base/result.h"
#include "base/unit.h"
#include "base/utc_time.h"

namespace coilassay {

/// Conditions a limit is stated at; only those that matter to it. Series or parallel is in the symbol (L_s, L_p).
struct LimitConditions {
  std::optional<double> frequency_hz, level_v, level_a, bias_a, temperature_degc;
  std::string definition;  // of a saturation current: "ramp_incremental", "ramp_secant", "bias_small_signal"; empty: any
};

/// One demand of the drawing. At least one of min and max is there; SI, no prefix.
struct Limit {
  std::string quantity;  // a symbol of analysis/symbols.h
  Unit unit = Unit::one;
  std::optional<double> min, max;
  std::optional<double> nominal;  // when it was stated as nominal and deviation
  std::string test;               // name of a [test.NAME], a kind of test, or "reading"; empty: any source that fits
  LimitConditions at;
  std::string place;              // "drum.toml:12"
};

/// How far a condition may be from the stated one: a ratio of the stated value, or an absolute distance.
struct ConditionTolerance {
  double value = 0;
  bool relative = false;
  bool stated = false;  // false: the program's own default
};

struct ConditionTolerances {
  ConditionTolerance frequency{0.01, true, false};
  ConditionTolerance level{0.2, true, false};
  ConditionTolerance bias{0.01, false, false};        // A
  ConditionTolerance temperature{3.0, false, false};  // K
};

/// How one test of a unit is captured and measured: [test.NAME]. Its files are <serial>.<name>.<ext>, or with several
/// captures <serial>.<name>.<1, 2, ...>.<ext>. What is not stated stays with the bench sheet.
struct TestPlan {
  std::string name;                  // of the section and of the files
  std::string kind;                  // "ringdown", "ramp", "sine", "sweep", "coupling", "resistance", "reading"
  std::optional<std::string> bench;  // path, resolved against the sheet
  std::size_t repeats = 1;           // captures of the same thing, measured each, judged by their mean
  std::optional<std::string> segment;
  std::optional<double> from_s, to_s;
  std::vector<double> at_hz;         // sweep, coupling: besides what the limits name
  std::optional<StatedValue> level, temperature;
  std::vector<StatedValue> biases;             // one, or one for each capture of a joint sine measurement
  std::vector<StatedValue> capacitors;         // ringdown: one, or one for each capture of a joint measurement
  std::vector<StatedValue> dissipation_factors;
  std::optional<StatedValue> probe_capacitance, probe_resistance, across_resistance, across_capacitance;
  std::optional<StatedValue> dcr;              // ramp, sine
  std::optional<StatedValue> shunt, skew;
  std::optional<std::string> material;         // resistance
  std::optional<StatedValue> temperature_coefficient;
  std::optional<std::string> connection;       // sweep: "reflect", "series", "shunt"
  std::optional<std::size_t> port;
  bool from_waveform = false;
  std::optional<std::string> fixture;          // sweep: path of a fixture set
  std::optional<std::string> dots;             // coupling: "same", "opposite"
  std::optional<StatedValue> link_inductance, link_resistance;
  std::vector<StatedValue> winding_resistances;
  std::string place;

  /// Captures of one unit that are measured together: two or more for a line over capacitors or a table over bias.
  std::size_t joint_captures() const;
};

enum class DecisionRule {
  simple,              // value inside passes, else fails
  guarded_acceptance,  // passes at least g inside every limit, else fails
  guarded,             // passes at least g inside, fails at least g outside, undecided between
  guarded_rejection,   // fails at least g outside, else passes
};
std::string_view name(DecisionRule rule);

struct Decision {
  DecisionRule rule = DecisionRule::guarded;
  double risk = 0.05;  // largest probability of the wrong verdict the rule guards against, given the value
};

enum class SamplingScheme { attributes, variables, claim, all };
std::string_view name(SamplingScheme scheme);

enum class Severity105 { normal, tightened, reduced, discontinued };
std::string_view name(Severity105 severity);

struct Sampling {
  SamplingScheme scheme = SamplingScheme::all;
  std::string level = "II";     // S-1 .. S-4, I, II, III
  double aql_percent = 1.0;
  Severity105 severity = Severity105::normal;  // to begin with; history moves it
  bool reduced_allowed = false; // limit numbers are not held: reduced only when the sheet says so
  std::string quantity;         // variables: the one quantity of the plan
  double confidence = 0.9;      // claim
  double reliability = 0.95;    // claim: fraction conforming
  std::uint64_t seed = 1;       // of the draw of positions
  std::uint64_t accept = 0;     // all: nonconforming units a lot may hold
  bool undecided_set_aside = false;  // else counted as nonconforming; not_comparable too
  std::optional<UtcTime> resumed;    // lots before it do not count: inspection begins anew with `severity`
};

enum class RetestUse { first, mean };
struct Retest {
  std::uint64_t attempts = 1;
  RetestUse use = RetestUse::first;
  std::vector<std::string> reasons;  // why a unit may be measured again; a station takes their numbers, from 1
};

/// A named artefact measured at the start of a shift, to see what certificates cannot.
struct CheckStandard {
  std::string serial;
  std::string quantity;
  Unit unit = Unit::one;
  std::string test;               // as of a limit; empty: any
  double every_s = 8 * 3600.0;
  std::optional<double> centre, sigma;  // stated; else from the first `baseline` readings
  std::size_t baseline = 10;
  bool refuse = true;             // a lot is refused when it is out or overdue; false: marked only
};

/// [process.SYMBOL]: what is known of the parts before any is measured, and how well they will be; for planning only.
struct ProcessPlan {
  double mean = 0, deviation = 0;
  double uncertainty = 0;         // standard, of the value of one unit
};

struct PartSheet {
  std::string path;
  std::string sha256;             // of the sheet's bytes
  std::string name, revision, supplier, description;
  std::string serial_pattern, serial_place;  // RE2 pattern of a whole serial number, for stations; empty: any
  std::vector<Limit> limits;
  ConditionTolerances tolerances;
  std::vector<TestPlan> tests;
  Decision decision;
  Sampling sampling;
  Retest retest;
  std::optional<CheckStandard> check_standard;
  /// [gauge]: standard deviation of placing and reading, by symbol, from a gauge study; joins the uncertainty of a unit.
  std::map<std::string, double> gauge_sigma;
  std::map<std::string, ProcessPlan> processes;   // by symbol

  /// The section with this name, else nullptr.
  const TestPlan* find_test(std::string_view test) const;
};

/// Reads a part sheet. bad_sheet, wrong_unit or bad_number with the line: an unknown key, a limit in the wrong unit, min
/// above max, a quantity that is no symbol, a limit on a test that is not there, a rule or scheme that does not exist.
/// What is legal and yet cannot work is found by check_sheet() (inspection/sheet_check.h).
Result<PartSheet> read_part_sheet(const std::string& path);
Result<PartSheet> parse_part_sheet(std::string_view text, const std::string& path);

/// "37.6 µH to 56.4 µH", "at least 1.2 A", for people.
std::string limits_in_words(const Limit& limit);
/// "at 100.0 kHz, 100.0 mV, bias 0 A"; empty when the limit names no conditions.
std::string conditions_in_words(const LimitConditions& at);

/// Whether a kind of test can give a symbol at all ("reading" gives what its instrument says).
bool test_gives(std::string_view kind, std::string_view symbol);

/// What the measurement of one unit by `test` must be asked for so that every limit can be judged: the frequencies.
std::vector<double> frequencies_needed(const PartSheet& sheet, const TestPlan& test);

/// Whether a limit may be judged from this test.
bool limit_uses(const Limit& limit, const TestPlan& test);

}  // namespace coilassay
