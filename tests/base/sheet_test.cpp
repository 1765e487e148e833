#include "base/sheet.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <filesystem>
#include <fstream>

#include "base/number_text.h"

namespace coilassay {
namespace {

using testing::HasSubstr;

constexpr std::string_view kBench = R"toml([voltage]
column = "CH1"
gain = "1 ± 2 %"
input_resistance = 10e6
turns = 3
earthed = true
[[capacitor]]
value = "10.012 nF ± 5 pF (k=2)"
[[capacitor]]
value = "22 nF"
[test.ramp]
repeats = 2
at = { frequency = "100 kHz" }
[[equipment]]
id = "DMM-3"
due = 2027-05-01
[reading]
fields = ["L_s [H]", "R_s [ohm]"]
)toml";

SheetTable bench() {
  auto sheet = parse_sheet(kBench, "bench.toml");
  EXPECT_TRUE(sheet) << sheet.error().finding;
  return *sheet;
}

/// Asks for everything that is in it.
void ask_for_all(const SheetTable& sheet) {
  const auto voltage = sheet.table("voltage").value().value();
  EXPECT_EQ(voltage.text("column").value(), "CH1");
  EXPECT_DOUBLE_EQ(voltage.value("gain", Unit::one).value()->half_width, 0.02);
  EXPECT_EQ(voltage.value("input_resistance", Unit::ohm).value()->value, 1e7);
  EXPECT_EQ(voltage.integer("turns").value(), 3);
  EXPECT_EQ(voltage.flag("earthed").value(), true);
  const auto capacitors = sheet.tables("capacitor").value();
  ASSERT_EQ(capacitors.size(), 2U);
  EXPECT_EQ(capacitors[0].value("value", Unit::farad).value()->standard_uncertainty, 2.5e-12);
  EXPECT_EQ(capacitors[1].value("value", Unit::farad).value()->value, 22e-9);
  const auto ramp = sheet.table("test").value()->table("ramp").value().value();
  EXPECT_EQ(ramp.number("repeats").value(), 2.0);
  EXPECT_EQ(ramp.table("at").value()->value("frequency", Unit::hertz).value()->value, 1e5);
  const auto equipment = sheet.tables("equipment").value();
  ASSERT_EQ(equipment.size(), 1U);
  EXPECT_EQ(equipment[0].text("id").value(), "DMM-3");
  using namespace std::chrono;
  EXPECT_EQ(equipment[0].date("due").value(), 2027y / May / 1d);
  EXPECT_EQ(sheet.table("reading").value()->texts("fields").value(), (std::vector<std::string>{"L_s [H]", "R_s [ohm]"}));
}

TEST(Sheet, GivesEveryKindOfValueAndAcceptsASheetWhoseKeysAreAllKnown) {
  const SheetTable sheet = bench();
  ask_for_all(sheet);
  const auto all_known = sheet.refuse_unknown_keys();
  EXPECT_TRUE(all_known) << all_known.error().finding;
}

TEST(Sheet, NamesThatAPersonChoseComeInTheOrderOfTheirLines) {
  const auto sheet = parse_sheet("[test.zero]\na = 1\n[test.alpha]\na = 2\n", "part.toml");
  ASSERT_TRUE(sheet);
  const auto tests = sheet->table("test").value().value();
  EXPECT_EQ(tests.keys(), (std::vector<std::string>{"zero", "alpha"}));
  EXPECT_FALSE(sheet->refuse_unknown_keys()) << "listing keys must not make them known";
}

TEST(Sheet, AbsentKeysAreNoErrorAndCountAsKnown) {
  const SheetTable sheet = bench();
  EXPECT_FALSE(sheet.has("current"));
  EXPECT_TRUE(sheet.has("voltage"));
  EXPECT_EQ(sheet.table("current").value().has_value(), false);
  EXPECT_TRUE(sheet.tables("limit").value().empty());
  const auto voltage = sheet.table("voltage").value().value();
  EXPECT_EQ(voltage.text("nothing").value(), std::nullopt);
  EXPECT_EQ(voltage.number("nothing").value(), std::nullopt);
  EXPECT_EQ(voltage.integer("nothing").value(), std::nullopt);
  EXPECT_EQ(voltage.flag("nothing").value(), std::nullopt);
  EXPECT_EQ(voltage.date("nothing").value(), std::nullopt);
  EXPECT_EQ(voltage.texts("nothing").value(), std::nullopt);
  EXPECT_FALSE(voltage.value("nothing", Unit::ohm).value().has_value());
}

TEST(Sheet, NamesTheLineOfAKey) {
  const SheetTable sheet = bench();
  const auto voltage = sheet.table("voltage").value().value();
  EXPECT_EQ(voltage.place("gain"), "bench.toml:3");
  EXPECT_EQ(voltage.place("absent"), "bench.toml:1");
  EXPECT_EQ(sheet.tables("capacitor").value()[1].place("value"), "bench.toml:10");
  EXPECT_EQ(sheet.tables("capacitor").value()[1].place("absent"), "bench.toml:9");
}

struct Planted {
  std::string_view after;   // this line
  std::string_view line;    // is put in
  std::string_view place;
  std::string_view finding;
  std::string_view remedy;
};

TEST(Sheet, FindsAKeyNobodyAskedForAtAnyDepth) {
  const Planted cases[] = {
      {"", "stray = 1\n", "bench.toml:1", "unknown key 'stray'", "known here"},
      {"[voltage]\n", "colum = \"CH2\"\n", "bench.toml:2", "'colum' in [voltage]", "did you mean 'column'?"},
      {"value = \"22 nF\"\n", "loss = 1\n", "bench.toml:11", "'loss' in [capacitor]", "known here: value"},
      {"repeats = 2\n", "pulses = 1\n", "bench.toml:13", "'pulses' in [test.ramp]", "known here"},
      {"earthed = true\n", "[volage]\n", "bench.toml:7", "unknown key 'volage'", "did you mean 'voltage'?"},
      {"earthed = true\n", "[voltage.low]\ngain = 2\n", "bench.toml:7", "'low' in [voltage]", "known here"},
  };
  for (const Planted& c : cases) {
    std::string text(kBench);
    text.insert(text.find(c.after) + c.after.size(), c.line);
    const auto sheet = parse_sheet(text, "bench.toml");
    ASSERT_TRUE(sheet) << sheet.error().finding;
    ask_for_all(*sheet);
    const auto known = sheet->refuse_unknown_keys();
    ASSERT_FALSE(known) << c.line;
    EXPECT_EQ(known.error().problem, Problem::bad_sheet);
    EXPECT_EQ(known.error().place, c.place);
    EXPECT_THAT(known.error().finding, HasSubstr(c.finding));
    EXPECT_THAT(known.error().remedy, HasSubstr(c.remedy));
  }
}

TEST(Sheet, ATableAskedForTwiceRemembersBothQuestions) {
  const auto sheet = parse_sheet("[a]\nx = 1\ny = 2\n", "s.toml");
  ASSERT_TRUE(sheet);
  EXPECT_EQ(sheet->table("a").value()->number("x").value(), 1.0);
  EXPECT_FALSE(sheet->refuse_unknown_keys());
  EXPECT_EQ(sheet->table("a").value()->number("y").value(), 2.0);
  EXPECT_TRUE(sheet->refuse_unknown_keys());
}

TEST(Sheet, RefusesAValueOfTheWrongTypeWithItsLine) {
  const auto sheet = parse_sheet(
      "text = 1\nnumber = \"2\"\ninteger = 1.5\nflag = \"yes\"\ndate = \"2026-05-01\"\ntexts = [\"a\", 1]\nvalue = true\n"
      "table = 3\ntables = { a = 1 }\nmoment = 2026-05-01T10:00:00Z\nmixed = [ {a = 1}, 2 ]\n",
      "s.toml");
  ASSERT_TRUE(sheet) << sheet.error().finding;
  const auto expect_refused = [](const auto& result, int line, std::string_view says) {
    ASSERT_FALSE(result);
    EXPECT_EQ(result.error().problem, Problem::bad_sheet);
    EXPECT_EQ(result.error().place, "s.toml:" + std::to_string(line));
    EXPECT_THAT(result.error().finding, HasSubstr(says));
    EXPECT_FALSE(result.error().remedy.empty());
  };
  expect_refused(sheet->text("text"), 1, "an integer, where text is needed");
  expect_refused(sheet->number("number"), 2, "text in quotes, where a number is needed");
  expect_refused(sheet->integer("integer"), 3, "where an integer is needed");
  expect_refused(sheet->flag("flag"), 4, "where true or false is needed");
  expect_refused(sheet->date("date"), 5, "text in quotes, where a date is needed");
  expect_refused(sheet->texts("texts"), 6, "an integer, where text is needed");
  expect_refused(sheet->value("value", Unit::ohm), 7, "where a resistance (ohm) is needed");
  expect_refused(sheet->table("table"), 8, "where a table is needed");
  expect_refused(sheet->tables("tables"), 9, "where an array of tables is needed");
  expect_refused(sheet->date("moment"), 10, "a date with a time");
  expect_refused(sheet->tables("mixed"), 11, "where a table is needed");
}

TEST(Sheet, RefusesNumbersThatAreNone) {
  const auto sheet = parse_sheet("a = nan\nb = inf\nc = -inf\nd = \"10 nH\"\ne = \"1,5 nF\"\n", "s.toml");
  ASSERT_TRUE(sheet);
  for (const char* key : {"a", "b", "c"}) {
    EXPECT_EQ(sheet->number(key).error().problem, Problem::bad_number) << key;
    EXPECT_EQ(sheet->value(key, Unit::farad).error().problem, Problem::bad_number) << key;
  }
  const auto wrong = sheet->value("d", Unit::farad);
  ASSERT_FALSE(wrong);
  EXPECT_EQ(wrong.error().problem, Problem::wrong_unit);
  EXPECT_EQ(wrong.error().place, "s.toml:4");
  EXPECT_EQ(sheet->value("e", Unit::farad).error().problem, Problem::bad_number);
}

TEST(Sheet, SyntaxErrorsNameTheirLine) {
  const std::pair<std::string, std::string> cases[] = {
      {"a = 1\nb = \n", "s.toml:2"},
      {"a = 1\na = 2\n", "s.toml:2"},
      {"[x\n", "s.toml:1"},
      {"a = 1\n\nb = \"\xff\"\n", "s.toml:3"},
      {"a = 2026-02-30\n", "s.toml:1"},
      {std::string("a = \"\0\"\n", 8), "s.toml:1"},
  };
  for (const auto& [text, place] : cases) {
    const auto sheet = parse_sheet(text, "s.toml");
    ASSERT_FALSE(sheet) << text;
    EXPECT_EQ(sheet.error().problem, Problem::bad_sheet);
    EXPECT_EQ(sheet.error().place, place);
    EXPECT_FALSE(sheet.error().remedy.empty());
  }
}

TEST(Sheet, DeepNestingIsRefusedNotACrash) {
  EXPECT_FALSE(parse_sheet("a = " + std::string(100'000, '['), "s.toml"));
  std::string key = "a";
  for (int i = 0; i < 100'000; ++i) key += ".a";
  for (const std::string& text : {key + " = 1\n", "[" + key + "]\n", "x = 1\ny = { " + key + " = 1 }\n"}) {
    const auto sheet = parse_sheet(text, "s.toml");
    ASSERT_FALSE(sheet);
    EXPECT_EQ(sheet.error().problem, Problem::bad_sheet);
  }
  // The deepest that gets through: as many inline tables as the library nests, each with a key just short enough.
  std::string deep;
  for (int i = 0; i < 250; ++i) deep += (i == 0 ? "" : "{ ") + std::string("a.a.a.a.a.a.a.a.a.a.a.a.a.a.a.a = ");
  deep += "1";
  for (int i = 1; i < 250; ++i) deep += " }";
  const auto sheet = parse_sheet(deep + "\n", "s.toml");
  if (sheet) {
    EXPECT_FALSE(sheet->refuse_unknown_keys());
  }
}

TEST(Sheet, ManyPointsInNumbersAndTextAreNoEndlessKey) {
  std::string text = "note = \"wait....................................\"\npoints = [";
  for (int i = 0; i < 5000; ++i) text += "1.5, ";
  EXPECT_TRUE(parse_sheet(text + "]\n", "s.toml"));
}

class SheetFile : public testing::Test {
 protected:
  SheetFile()
      : folder_(std::filesystem::path(testing::TempDir()) /
                (std::string("coilassay_") + testing::UnitTest::GetInstance()->current_test_info()->name())) {
    std::filesystem::remove_all(folder_);
    std::filesystem::create_directories(folder_);
  }
  ~SheetFile() override { std::filesystem::remove_all(folder_); }
  std::string write(const std::string& name, const std::string& text) const {
    std::ofstream(folder_ / name, std::ios::binary) << text;
    return (folder_ / name).string();
  }
  std::filesystem::path folder_;
};

TEST_F(SheetFile, IsReadWithOrWithoutAByteOrderMark) {
  for (const std::string start : {"", "\xef\xbb\xbf"}) {
    const std::string path = write("bench.toml", start + "a = 1\r\nb = 2\r\n");
    const auto sheet = read_sheet(path);
    ASSERT_TRUE(sheet) << sheet.error().finding;
    EXPECT_EQ(sheet->integer("b").value(), 2);
    EXPECT_EQ(sheet->place("b"), path + ":2");
    EXPECT_EQ(read_sheet_text(path).value(), start + "a = 1\r\nb = 2\r\n") << "a digest is of the bytes as they stand";
  }
}

TEST_F(SheetFile, ThatCannotBeReadIsRefusedWithAReason) {
  const auto missing = read_sheet((folder_ / "none.toml").string());
  ASSERT_FALSE(missing);
  EXPECT_EQ(missing.error().problem, Problem::unreadable);
  EXPECT_THAT(missing.error().finding, HasSubstr("no such file"));
  const auto directory = read_sheet(folder_.string());
  ASSERT_FALSE(directory);
  EXPECT_EQ(directory.error().problem, Problem::unreadable);
  EXPECT_THAT(directory.error().finding, HasSubstr("directory"));
  const auto large = read_sheet(write("large.toml", "# " + std::string(1 << 20, 'x')));
  ASSERT_FALSE(large);
  EXPECT_THAT(large.error().finding, HasSubstr("1 MiB"));
  EXPECT_TRUE(read_sheet(write("empty.toml", "")));
}

}  // namespace
}  // namespace coilassay
