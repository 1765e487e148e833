// Profiles: everything a sheet may say, and each way to say it wrong.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include "acquire/instrument/profile.h"

namespace coilassay {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;

constexpr const char* kLink = "[link]\nkind = \"tcp\"\nport = \"localhost:5025\"\n";
constexpr const char* kReading = "[reading]\nask = \"FETC?\"\nfields = [\"L_s [uH]\", \"R_s [ohm]\", \"status\", \"-\"]\n";

/// A profile that must be refused.
Error refused(const std::string& text) {
  const auto profile = parse_instrument_profile(text, "meter.toml");
  EXPECT_FALSE(profile) << text;
  return profile ? Error{} : profile.error();
}

TEST(InstrumentProfile, ReadsEverythingTheDesignNames) {
  const auto profile = parse_instrument_profile(
      "[link]\nkind = \"serial\"\nport = \"/dev/ttyUSB0\"\nbaud = 115200\nframe = \"7E2\"\nflow = \"hardware\"\nterminator = \"\\r\\n\"\n"
      "timeout = \"2 s\"\nlateness = \"1500 ms\"\n[identity]\nask = \"*IDN?\"\nexpect = \"bench-lcr\"\n[prepare]\nsend = [\"*CLS\", \"TRIG BUS\"]\n"
      "[reading]\nask = \"FETC?\"\nseparator = \",\"\nfields = [\"L_s [uH]\", \"R_s [ohm]\", \"status\"]\nstatus = \"0\"\ninvalid = [\"9.9E37\", \"----\"]\n"
      "at = { frequency = \"100 kHz\", level = \"10 mA\", bias = \"0 A\" }\naccuracy = { L_s = \"0.2 %\", R_s = \"1 % + 2 mohm\" }\n"
      "[present]\nask = \"PRES?\"\nwhen = \"1\"\nopen_above = { R_s = \"1 kohm\" }\njitter = { L_s = \"0.1 %\" }\n"
      "[verdict]\npass = \"BIN 1\"\nfail = \"BIN 2\"\notherwise = \"BIN 3\"\n",
      "meter.toml");
  ASSERT_TRUE(profile) << profile.error().place << profile.error().finding;
  EXPECT_EQ(profile->link.serial.baud, 115200);
  EXPECT_EQ(profile->link.serial.bits, 7);
  EXPECT_EQ(profile->link.serial.parity, 'E');
  EXPECT_EQ(profile->link.serial.stop_bits, 2);
  EXPECT_EQ(profile->link.serial.flow, SerialSetup::Flow::hardware);
  EXPECT_EQ(profile->link.reply_terminator, "\r\n") << "as what is sent, unless stated";
  EXPECT_DOUBLE_EQ(profile->link.lateness_s, 1.5);
  EXPECT_THAT(profile->prepare, ElementsAre("*CLS", "TRIG BUS"));
  ASSERT_TRUE(profile->reading);
  EXPECT_DOUBLE_EQ(profile->reading->fields[0].factor, 1e-6);
  EXPECT_EQ(profile->reading->fields[0].unit, Unit::henry);
  EXPECT_FALSE(profile->reading->at.level_v);
  EXPECT_DOUBLE_EQ(profile->reading->at.level_a->value, 0.01);
  EXPECT_DOUBLE_EQ(profile->reading->accuracy.at("R_s").ratio, 0.01);
  EXPECT_DOUBLE_EQ(profile->reading->accuracy.at("R_s").fixed, 0.002);
  EXPECT_DOUBLE_EQ(profile->present->open_above.at("R_s"), 1000);
  EXPECT_DOUBLE_EQ(profile->present->jitter.at("L_s"), 0.001);
  EXPECT_EQ(profile->verdict->otherwise, "BIN 3");
}

TEST(InstrumentProfile, AnUnknownKeyIsNamedWithItsLineAndTheNearestOne) {
  const Error error = refused(std::string(kLink) + kReading + "feilds = [\"L_s [H]\"]\n");
  EXPECT_EQ(error.problem, Problem::bad_sheet);
  EXPECT_EQ(error.place, "meter.toml:7");
  EXPECT_THAT(error.remedy, HasSubstr("fields"));
}

TEST(InstrumentProfile, APatternThatCannotCompileIsRefused) {
  const Error error = refused(std::string(kLink) + "[identity]\nexpect = \"lcr(\"\n" + kReading);
  EXPECT_EQ(error.place, "meter.toml:5");
  EXPECT_THAT(error.finding, HasSubstr("pattern 'lcr('"));
}

TEST(InstrumentProfile, APatternNeedsAGroupPerField) {
  const Error error = refused(std::string(kLink) + "[reading]\nask = \"?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\"]\npattern = \"L=(.*)\"\n");
  EXPECT_THAT(error.finding, HasSubstr("1 groups for 2 fields"));
}

TEST(InstrumentProfile, NoTerminatorIsRefused) {
  const Error error = refused(std::string(kLink) + "terminator = \"\"\n" + kReading);
  EXPECT_EQ(error.place, "meter.toml:4");
  EXPECT_THAT(error.finding, HasSubstr("where a reply ends"));
}

TEST(InstrumentProfile, SaysWhatIsMissing) {
  EXPECT_THAT(refused(kReading).finding, HasSubstr("no [link]"));
  EXPECT_THAT(refused(kLink).finding, HasSubstr("neither [reading] nor [record]"));
  EXPECT_THAT(refused(std::string("[link]\nkind = \"tcp\"\n") + kReading).finding, HasSubstr("which port"));
  EXPECT_THAT(refused(std::string(kLink) + "[reading]\nask = \"?\"\n").finding, HasSubstr("names no value"));
  EXPECT_THAT(refused(std::string(kLink) + "[record]\nask = \"RUN\"\nfields = [\"V [V]\"]\ncount = 10\n").finding, HasSubstr("sample_interval"));
  EXPECT_THAT(refused(std::string(kLink) + kReading + "[verdict]\npass = \"BIN 1\"\nfail = \"BIN 2\"\n").finding, HasSubstr("otherwise"));
}

TEST(InstrumentProfile, RefusesWhatMakesNoSense) {
  struct Case {
    std::string text;
    const char* finding;
  };
  const Case cases[] = {
      {"[link]\nkind = \"usb\"\nport = \"x\"\n" + std::string(kReading), "'usb'"},
      {"[link]\nkind = \"tcp\"\nport = \"localhost\"\n" + std::string(kReading), "no host and port"},
      {"[link]\nport = \"/dev/ttyS0\"\nframe = \"9N1\"\n" + std::string(kReading), "no frame"},
      {"[link]\nport = \"/dev/ttyS0\"\nbaud = 0\n" + std::string(kReading), "baud is 0"},
      {std::string(kLink) + "baud = 9600\n" + kReading, "serial port only"},
      {std::string(kLink) + "timeout = \"0 s\"\n" + kReading, "above zero"},
      {std::string(kLink) + "lateness = \"-1 s\"\n" + kReading, "not be negative"},
      {std::string(kLink) + "[reading]\nask = \"A\\nB\"\nfields = [\"L_s [H]\"]\n", "control character"},
      {std::string(kLink) + "[reading]\nask = \"?\"\nfields = [\"L_s [parsec]\"]\n", "names no unit"},
      {std::string(kLink) + "[reading]\nask = \"?\"\nfields = [\"L_s [m]\"]\n", "names no unit"},
      {std::string(kLink) + "[reading]\nask = \"?\"\nfields = [\"L_s [H]\", \"L_s [H]\"]\n", "twice"},
      {std::string(kLink) + kReading + "separator = \"0\"\n", "between values"},
      {std::string(kLink) + kReading + "decimal = \",\"\n", "are the same"},
      {std::string(kLink) + kReading + "accuracy = { L_s = \"2 mohm\" }\n", "no accuracy"},
      {std::string(kLink) + kReading + "accuracy = { Q = \"2 %\" }\n", "unknown key 'Q'"},
      {std::string(kLink) + kReading + "at = { level = \"1 kHz\" }\n", "current (A)"},
      {std::string(kLink) + "[reading]\nfields = [\"L_s [H]\"]\n[identity]\nexpect = \"x\"\n", "prints lines unasked"},
      {std::string(kLink) + "[record]\nask = [\"A\", \"B\"]\nfields = [\"V [V]\"]\nsample_interval = \"1 us\"\ncount = 1\n", "2 questions for 1 fields"},
      {std::string(kLink) + "[record]\nask = \"A\"\nfields = [\"V [V]\", \"I [A]\"]\nscale = [\"1 mV\", \"1 mV\"]\nsample_interval = \"1 us\"\ncount = 1\n", "current (A)"},
  };
  for (const Case& each : cases) {
    const Error error = refused(each.text);
    EXPECT_THAT(error.finding, HasSubstr(each.finding)) << each.text;
    EXPECT_THAT(error.place, HasSubstr("meter.toml:")) << each.text;
    EXPECT_FALSE(error.remedy.empty()) << each.text;
  }
}

TEST(InstrumentProfile, ARecordMayAskOncePerField) {
  const auto profile = parse_instrument_profile(
      std::string(kLink) + "[record]\nask = [\"CURV? 1\", \"CURV? 2\"]\nformat = \"block int16\"\nbyte_order = \"little\"\n"
                           "fields = [\"V [V]\", \"I [A]\"]\nscale = [\"1 mV\", \"10 uA\"]\noffset = \"0\"\nsample_interval = \"1 us\"\ncount = 5000\n",
      "scope.toml");
  ASSERT_TRUE(profile) << profile.error().finding;
  EXPECT_FALSE(profile->record->big_endian);
  EXPECT_THAT(profile->record->scale, ElementsAre(1e-3, 1e-5));
}

}  // namespace
}  // namespace coilassay
