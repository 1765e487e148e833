// Bad input: one sentence with place, finding and remedy; never a crash, never a number.
#include <gmock/gmock.h>

#include <cmath>
#include <filesystem>
#include <sstream>

#include "tests/end_to_end/bench.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;

/// "<place>: <finding>" and "  try: <remedy>", nothing else.
void expect_one_sentence(const std::string& error) {
  std::istringstream lines(error);
  std::string sentence, remedy, more;
  std::getline(lines, sentence);
  std::getline(lines, remedy);
  EXPECT_THAT(sentence, HasSubstr(": ")) << error;
  EXPECT_GT(sentence.size(), 15u) << error;
  EXPECT_TRUE(remedy.starts_with("  try: ")) << error;
  EXPECT_GT(remedy.size(), 12u) << error;
  EXPECT_FALSE(std::getline(lines, more)) << error;
}

/// The input cannot be used: exit 2, in words and as a document.
void expect_unusable(const std::vector<std::string>& arguments, const std::string& problem, const std::string& place,
                     const std::string& part = "") {
  SCOPED_TRACE(testing::PrintToString(arguments));
  const ProgramEnd words = run_program_process(arguments);
  EXPECT_EQ(words.exit_code, 2) << words.out << words.error;
  EXPECT_EQ(words.out, "");
  expect_one_sentence(words.error);
  EXPECT_TRUE(words.error.starts_with(place)) << words.error;
  EXPECT_THAT(words.error, HasSubstr(part));

  const auto document = measured_json(arguments, 2);
  EXPECT_EQ(document.value("problem", ""), problem) << document.dump();
  EXPECT_NE(document.value("finding", ""), "");
  EXPECT_NE(document.value("remedy", ""), "");
}

/// There is nothing to measure in it: exit 3, a result without its leading quantity, and a finding that says why.
void expect_refused(const std::vector<std::string>& arguments) {
  SCOPED_TRACE(testing::PrintToString(arguments));
  const ProgramEnd words = run_program_process(arguments);
  EXPECT_EQ(words.exit_code, 3) << words.out << words.error;
  EXPECT_THAT(words.out, HasSubstr("refusal"));

  const auto document = measured_json(arguments, 3);
  EXPECT_TRUE(document.value("quantities", nlohmann::json::object()).empty()) << document.dump(1);
  bool says_why = false;
  for (const auto& finding : document.value("findings", nlohmann::json::array())) {
    says_why = says_why || finding.at("severity") == "refusal";
  }
  EXPECT_TRUE(says_why) << document.dump(1);
}

TEST(BadInput, NoFile) {
  expect_unusable({"ringdown", "/no/such/ring.csv"}, "unreadable", "/no/such/ring.csv: ");
  expect_unusable({"ringdown", "/no/such/ring.csv", "--bench", "/no/such/bench.toml"}, "unreadable",
                  "/no/such/bench.toml");
}

TEST(BadInput, EmptyFile) {
  const TemporaryFolder folder;
  expect_unusable({"ringdown", folder.file("empty.csv", "")}, "not_a_capture", folder / "empty.csv");
  ProgramStart nothing;
  nothing.arguments = {"ringdown", "-"};
  const ProgramEnd end = run_program_process(nothing);
  EXPECT_EQ(end.exit_code, 2);
  expect_one_sentence(end.error);
}

TEST(BadInput, ADirectory) {
  const TemporaryFolder folder;
  expect_unusable({"ringdown", folder.path()}, "unreadable", folder.path());
}

TEST(BadInput, AFileThatMayNotBeRead) {
  const TemporaryFolder folder;
  const std::string file = folder.file("locked.csv", "1\n2\n");
  std::filesystem::permissions(file, std::filesystem::perms::none);
  std::filesystem::permissions(folder.path(), std::filesystem::perms::others_exec, std::filesystem::perm_options::add);
  ProgramStart start;
  start.arguments = {"--version"};
  start.as_nobody = true;
  if (run_program_process(start).exit_code != 0) GTEST_SKIP() << "only root may reach the program in this folder";
  start.arguments = {"ringdown", file};
  const ProgramEnd end = run_program_process(start);
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_TRUE(end.error.starts_with(file)) << end.error;
  expect_one_sentence(end.error);
}

TEST(BadInput, ABinary) {
  const TemporaryFolder folder;
  std::string bytes;
  for (unsigned i = 0; i < 5000; ++i) bytes += static_cast<char>((i * i * 7919 + i * 31) >> 3 & 0xff);
  expect_unusable({"ringdown", folder.file("noise.bin", bytes)}, "not_a_capture", folder / "noise.bin");
}

TEST(BadInput, Prose) {
  const TemporaryFolder folder;
  const std::string text = "The coil hangs on the wall.\nNobody has measured it yet.\n";
  expect_unusable({"ringdown", folder.file("letter.txt", text)}, "not_a_capture", folder / "letter.txt");
}

TEST(BadInput, OneSample) {
  const TemporaryFolder folder;
  const std::string file = folder.file("one.csv", "time [s],CH1 [V]\n0,1.5\n");
  const ProgramEnd end = run_program_process({"ringdown", file, "--capacitor", "10nF"});
  EXPECT_TRUE(end.exit_code == 2 || end.exit_code == 3) << end.out << end.error;
  if (end.exit_code == 2) {
    expect_one_sentence(end.error);
    measured_json({"ringdown", file, "--capacitor", "10nF"}, 2);
  } else {
    expect_refused({"ringdown", file, "--capacitor", "10nF"});
  }
}

/// A table of `samples` values, 1 us apart.
template <class F>
std::string table(std::size_t samples, F value) {
  std::ostringstream text;
  text.precision(10);
  text << "time [s],CH1 [V]\n";
  for (std::size_t i = 0; i < samples; ++i) text << static_cast<double>(i) * 1e-6 << ',' << value(i) << '\n';
  return text.str();
}

TEST(BadInput, AllEqual) {
  const TemporaryFolder folder;
  expect_refused({"ringdown", folder.file("flat.csv", table(2000, [](std::size_t) { return 1.25; }))});
}

TEST(BadInput, NothingButMissingSamples) {
  const TemporaryFolder folder;
  const std::string file = folder.file("nan.csv", table(2000, [](std::size_t) { return "NaN"; }));
  const ProgramEnd end = run_program_process({"ringdown", file});
  ASSERT_TRUE(end.exit_code == 2 || end.exit_code == 3) << end.out << end.error;
  if (end.exit_code == 2) expect_one_sentence(end.error);
  const auto document = measured_json({"ringdown", file}, end.exit_code);
  EXPECT_TRUE(document.value("quantities", nlohmann::json::object()).empty());
}

TEST(BadInput, AStretchOfMissingSamplesIsCountedAndNeverTakenForZero) {
  const TemporaryFolder folder;
  const auto ring = [](double i) { return 2 * std::exp(-i / 400) * std::sin(0.2 * i); };
  std::ostringstream text;
  text << "time [s],CH1 [V]\n";
  for (int i = 0; i < 3000; ++i) {
    text << i << "e-6,";
    if (i >= 300 && i < 310) {
      text << "NaN\n";
    } else {
      text << ring(i) << '\n';
    }
  }
  const std::string file = folder.file("holes.csv", text.str());
  const ProgramEnd end = run_program_process({"ringdown", file, "--json"});
  ASSERT_TRUE(end.exit_code == 0 || end.exit_code == 3) << end.out << end.error;
  const auto document = nlohmann::json::parse(end.out);
  // omega_0 of the made-up decay: sqrt(0.2^2 + 0.0025^2) per microsecond.
  if (end.exit_code == 0) {
    EXPECT_NEAR(document.at("quantities").at("f_0").at("value").get<double>(), 31833.4, 5);
  }
  EXPECT_THAT(end.out, HasSubstr("missing_samples"));
}

TEST(BadInput, AColumnThatDoesNotExist) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, {"--samples", "3000"});
  for (const char* column : {"CH9", "7", "0", "-1"}) {
    expect_unusable({"ringdown", ring, "--voltage", column}, "missing_column", ring);
  }
}

TEST(BadInput, ANegativeCapacitor) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, {"--samples", "3000"});
  expect_unusable({"ringdown", ring, "--capacitor", "-10nF"}, "bad_number", "--capacitor: ");
  expect_unusable({"ringdown", ring, "--capacitor=-10nF"}, "bad_number", "--capacitor: ");
  const std::string sheet = folder.file("bench.toml", "[[capacitor]]\nvalue = \"-10 nF\"\n");
  expect_unusable({"ringdown", ring, "--bench", sheet}, "bad_number", sheet + ":2");
}

TEST(BadInput, AUnitOfTheWrongKind) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, {"--samples", "3000"});
  expect_unusable({"ringdown", ring, "--capacitor", "10uH"}, "wrong_unit", "--capacitor: ");
  expect_unusable({"ringdown", ring, "--probe-resistance", "10pF"}, "wrong_unit", "--probe-resistance: ");
  expect_unusable({"ringdown", ring, "--from", "3V"}, "wrong_unit", "--from: ");
  const std::string sheet = folder.file("bench.toml", "[voltage]\ninput_capacitance = \"13 ohm\"\n");
  expect_unusable({"ringdown", ring, "--bench", sheet}, "wrong_unit", sheet + ":2");
}

TEST(BadInput, ABenchSheetWithAMisspeltKey) {
  const TemporaryFolder folder;
  const std::string ring = folder / "ring.csv";
  simulate_into(ring, {"--samples", "3000"});
  const std::string sheet = folder.file("bench.toml", "[voltage]\ncolum = \"CH1\"\n");
  expect_unusable({"ringdown", ring, "--bench", sheet}, "bad_sheet", sheet + ":2", "column");
}

TEST(BadInput, CapturesAndCapacitorsThatDoNotMatch) {
  const TemporaryFolder folder;
  const std::string a = folder / "a.csv", b = folder / "b.csv";
  simulate_into(a, {"--samples", "3000"});
  simulate_into(b, {"--samples", "3000", "--capacitor", "22nF"});
  expect_unusable({"ringdown", a, b}, "usage", "--capacitor: ");
  expect_unusable({"ringdown", a, b, "--capacitor", "10nF"}, "usage", "--capacitor: ");
  expect_unusable({"ringdown", a, "--capacitor", "10nF", "--capacitor", "22nF"}, "usage", "--capacitor: ");
  expect_unusable({"ringdown", a, b, "--capacitor", "10nF", "--capacitor", "10nF"}, "usage", "--capacitor: ");
  expect_unusable({"ringdown", "-", "-", "--capacitor", "10nF", "--capacitor", "22nF"}, "usage", "-: ");
}

TEST(BadInput, ACaptureThatHoldsNoRinging) {
  const TemporaryFolder folder;
  unsigned state = 1;
  const auto noise = [&state](std::size_t) {
    state = state * 1664525u + 1013904223u;
    return static_cast<double>(state >> 16) / 65536 - 0.5;
  };
  expect_refused({"ringdown", folder.file("noise.csv", table(4000, noise))});
  expect_refused(
      {"ringdown", folder.file("slope.csv", table(4000, [](std::size_t i) { return 1e-3 * static_cast<double>(i); }))});
  expect_refused({"ringdown", folder.file("step.csv", table(4000, [](std::size_t i) { return i < 400 ? 0.0 : 1.0; }))});
}

TEST(BadInput, RingingHiddenUnderNoise) {
  const TemporaryFolder folder;
  const std::string ring = folder / "buried.csv";
  simulate_into(ring, {"--initial-current", "1uA", "--noise", "100mV", "--samples", "5000"});
  expect_refused({"ringdown", ring, "--capacitor", "10nF±1%"});
}

TEST(BadInput, NamesFromOutsideCannotSteerATerminal) {
  const ProgramEnd end = run_program_process({"ringdown", "\x1b]0;title\x07.csv"});
  EXPECT_EQ(end.exit_code, 2);
  EXPECT_THAT(end.error, testing::Not(HasSubstr("\x1b")));
  EXPECT_THAT(end.error, HasSubstr("\\x1b]0;title\\x07.csv"));
}

}  // namespace
}  // namespace coilassay::test
