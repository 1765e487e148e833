#include "acquire/instrument/profile.h"

#include <filesystem>

#include "acquire/instrument/descriptor_stream.h"
#include "acquire/instrument/pattern.h"
#include "acquire/instrument/profile_section.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "base/utc_time.h"

namespace coilassay {

namespace {

/// "8N1": bits, parity, stop bits.
void read_frame(ProfileSection& link, SerialSetup& serial) {
  const std::string frame = link.text("frame").value_or("8N1");
  const bool fine = frame.size() == 3 && frame[0] >= '5' && frame[0] <= '8' &&
                    std::string("NEOMS").find(frame[1]) != std::string::npos && (frame[2] == '1' || frame[2] == '2');
  if (!fine) {
    link.refuse(Problem::bad_sheet, "frame", "'" + shown(frame, 20) + "' is no frame", "write bits, parity and stop bits, like \"8N1\" or \"7E1\"");
    return;
  }
  serial.bits = frame[0] - '0';
  serial.parity = frame[1];
  serial.stop_bits = frame[2] - '0';
}

void read_terminators(ProfileSection& link, LinkSetup& setup) {
  setup.terminator = link.text("terminator").value_or("\n");
  setup.reply_terminator = link.text("reply_terminator").value_or(setup.terminator);
  for (const char* key : {"terminator", "reply_terminator"}) {
    const std::string& sign = key[0] == 't' ? setup.terminator : setup.reply_terminator;
    if (!sign.empty() && sign.size() <= 8) continue;
    link.refuse(Problem::bad_sheet, key, sign.empty() ? "without a terminator nobody knows where a reply ends" : "this is too long for a terminator",
                std::string("write ") + key + " = \"\\n\" or \"\\r\\n\", as in the instrument's manual");
  }
}

LinkSetup read_link(ProfileSection link, const std::filesystem::path& folder) {
  LinkSetup setup;
  const std::string kind = link.word("kind", {"serial", "tcp", "recorded"});
  setup.kind = kind == "tcp" ? LinkSetup::Kind::tcp : kind == "recorded" ? LinkSetup::Kind::recorded : LinkSetup::Kind::serial;
  setup.port = link.text("port").value_or("");
  if (setup.port.empty()) {
    link.refuse(Problem::bad_sheet, "port", "[link] does not say which port", "write port = \"/dev/ttyUSB0\", or \"localhost:5025\" with kind = \"tcp\"");
  } else if (setup.kind == LinkSetup::Kind::tcp) {
    if (const auto both = parse_host_and_port(setup.port, link.place("port")); !both) {
      link.refuse(Problem::bad_sheet, "port", both.error().finding, both.error().remedy);
    }
  } else if (setup.kind == LinkSetup::Kind::recorded && !std::filesystem::path(setup.port).is_absolute()) {
    setup.port = (folder / setup.port).lexically_normal().string();
  }
  setup.serial.baud = static_cast<int>(link.integer("baud", 50, 20'000'000).value_or(9600));
  read_frame(link, setup.serial);
  const std::string flow = link.word("flow", {"none", "hardware", "software"});
  setup.serial.flow = flow == "hardware"   ? SerialSetup::Flow::hardware
                      : flow == "software" ? SerialSetup::Flow::software
                                           : SerialSetup::Flow::none;
  if (setup.kind != LinkSetup::Kind::serial) {
    for (const char* key : {"baud", "frame", "flow"}) {
      if (link.has(key)) link.refuse(Problem::bad_sheet, key, std::string(key) + " means something for a serial port only", "leave it out, or write kind = \"serial\"");
    }
  }
  read_terminators(link, setup);
  setup.timeout_s = link.positive("timeout", Unit::second).value_or(setup.timeout_s);
  setup.byte_timeout_s = link.positive("byte_timeout", Unit::second).value_or(setup.timeout_s);
  setup.lateness_s = link.not_negative("lateness", Unit::second).value_or(setup.timeout_s);
  setup.quiet_s = link.not_negative("quiet", Unit::second).value_or(setup.quiet_s);
  setup.reconnect_s = link.not_negative("reconnect", Unit::second).value_or(setup.reconnect_s);
  for (const auto& [key, value] : {std::pair{"timeout", setup.timeout_s}, {"byte_timeout", setup.byte_timeout_s}, {"lateness", setup.lateness_s},
                                   {"quiet", setup.quiet_s}, {"reconnect", setup.reconnect_s}}) {
    if (value > 3600) link.refuse(Problem::bad_number, key, std::string(key) + " is longer than an hour", "no instrument takes that long");
  }
  setup.echo = link.flag("echo").value_or(false);
  return setup;
}

void check_pattern(ProfileSection& section, std::string_view key, const std::optional<std::string>& pattern, std::size_t groups) {
  if (!pattern) return;
  const auto compiled = Pattern::compile(*pattern, section.place(key));
  if (!compiled) {
    section.refuse(compiled.error().problem, key, compiled.error().finding, compiled.error().remedy);
  } else if (groups > 0 && compiled->groups() != groups) {
    section.refuse(Problem::bad_sheet, key, "the pattern has " + std::to_string(compiled->groups()) + " groups for " + std::to_string(groups) + " fields",
                   "put each value in ( ), in the order of the fields");
  }
}

ReadingSetup read_reading(ProfileSection section) {
  ReadingSetup reading;
  reading.ask = section.command("ask");
  reading.fields = section.fields("fields");
  reading.separator = section.separator_sign();
  reading.pattern = section.text("pattern");
  if (reading.pattern && section.has("separator")) {
    section.refuse(Problem::bad_sheet, "separator", "a reply is taken apart by a pattern or by a separator, not by both", "leave one of them out");
  }
  check_pattern(section, "pattern", reading.pattern, reading.fields.size());
  reading.decimal = section.decimal_sign();
  if (reading.decimal == reading.separator) {
    section.refuse(Problem::bad_sheet, "decimal", "the decimal sign and the separator are the same", "write separator = \";\" or what it really is");
  }
  reading.status = section.text("status").value_or("0");
  reading.invalid = section.texts("invalid");
  reading.attempts = static_cast<std::size_t>(section.integer("attempts", 1, 100).value_or(3));
  reading.test = section.text("test").value_or("");
  reading.test_place = section.place("test");
  reading.at = section.conditions("at");
  reading.accuracy = section.accuracies("accuracy", reading.fields);
  reading.subtract = section.values("subtract", reading.fields);
  return reading;
}

/// One value for all fields, or one for each.
std::vector<double> per_field(ProfileSection& section, std::string_view key, const std::vector<ProfileField>& fields, double otherwise) {
  std::vector<double> values(fields.size(), otherwise);
  const std::vector<std::string> typed = section.one_or_more(key);
  if (typed.empty()) return values;
  if (typed.size() != 1 && typed.size() != fields.size()) {
    section.refuse(Problem::bad_sheet, key, std::string(key) + " has " + std::to_string(typed.size()) + " values for " + std::to_string(fields.size()) + " fields",
                   "give one for all fields or one for each");
    return values;
  }
  for (std::size_t i = 0; i < fields.size(); ++i) {
    const auto value = parse_value(typed[typed.size() == 1 ? 0 : i], fields[i].unit, section.place(key));
    if (!value) section.refuse(value.error().problem, key, value.error().finding, value.error().remedy);
    else values[i] = value->value;
  }
  return values;
}

RecordSetup read_record(ProfileSection section) {
  RecordSetup record;
  record.ask = section.one_or_more("ask");
  for (const std::string& each : record.ask) section.check_command("ask", each);
  const std::string format = section.word("format", {"rows", "block int8", "block int16", "block float32"});
  record.format = format == "block int8"      ? RecordSetup::Format::int8
                  : format == "block int16"   ? RecordSetup::Format::int16
                  : format == "block float32" ? RecordSetup::Format::float32
                                              : RecordSetup::Format::rows;
  record.fields = section.fields("fields");
  for (const ProfileField& field : record.fields) {
    if (field.symbol == "status") section.refuse(Problem::bad_sheet, "fields", "a record has no status", "write \"-\" for a column that is not looked at");
  }
  record.big_endian = section.word("byte_order", {"big", "little"}) == "big";
  record.scale = per_field(section, "scale", record.fields, 1);
  record.offset = per_field(section, "offset", record.fields, 0);
  if (!section.has("scale")) {
    for (std::size_t i = 0; i < record.fields.size(); ++i) record.scale[i] = record.fields[i].factor;
  }
  record.separator = section.separator_sign();
  record.decimal = section.decimal_sign();
  record.invalid = section.texts("invalid");
  record.sample_interval_s = section.positive("sample_interval", Unit::second).value_or(0);
  record.count = static_cast<std::size_t>(section.integer("count", 1, 50'000'000).value_or(0));
  if (record.ask.size() != 1 && record.ask.size() != record.fields.size()) {
    section.refuse(Problem::bad_sheet, "ask", "there are " + std::to_string(record.ask.size()) + " questions for " + std::to_string(record.fields.size()) + " fields",
                   "give one question for all fields or one for each");
  }
  for (const char* key : {"sample_interval", "count"}) {
    if (!section.has(key)) section.refuse(Problem::bad_sheet, key, std::string("[record] does not say ") + key, "write sample_interval = \"1 us\" and count = 5000");
  }
  return record;
}

PresentSetup read_present(ProfileSection section, const std::vector<ProfileField>& fields) {
  PresentSetup present;
  present.ask = section.command("ask");
  const auto when = section.text("when");
  present.when = when.value_or("1");
  check_pattern(section, "when", present.when, 0);
  if (when && !present.ask) section.refuse(Problem::bad_sheet, "when", "there is no question it could be the answer to", "write ask = \"...\" too");
  present.open_above = section.limits("open_above", fields, false);
  present.short_below = section.limits("short_below", fields, false);
  present.jitter = section.limits("jitter", fields, true);
  return present;
}

CalibrationDates read_calibration(ProfileSection section) {
  CalibrationDates dates;
  dates.id = section.text("id").value_or("");
  dates.certificate = section.text("certificate").value_or("");
  const auto calibrated = section.date("calibrated"), due = section.date("due");
  if (calibrated) dates.calibrated = to_text(*calibrated);
  if (due) dates.due = to_text(*due);
  if (calibrated && due && *due < *calibrated) section.refuse(Problem::bad_sheet, "due", "due lies before calibrated", "look at the certificate");
  dates.overdue_blocks = section.word("overdue", {"refuse", "mark"}) == "refuse";
  return dates;
}

Result<InstrumentProfile> read_profile(const SheetTable& root, const std::string& path) {
  std::optional<Error> error;
  ProfileSection sheet(root, "", error);
  InstrumentProfile profile;
  profile.path = path;
  if (auto link = sheet.section("link")) {
    profile.link = read_link(std::move(*link), std::filesystem::path(path).parent_path());
  } else {
    sheet.refuse(Problem::bad_sheet, "link", "there is no [link]", "write [link] with kind and port");
  }
  if (auto section = sheet.section("identity")) {
    IdentitySetup identity;
    identity.ask = section->command("ask").value_or("*IDN?");
    identity.expect = section->text("expect").value_or(".");
    check_pattern(*section, "expect", identity.expect, 0);
    profile.identity = identity;
  }
  if (auto section = sheet.section("prepare")) {
    profile.prepare = section->texts("send");
    for (const std::string& each : profile.prepare) section->check_command("send", each);
  }
  for (ProfileSection& section : sheet.sections("setting")) {
    SettingQuestion setting{section.text("name").value_or(""), section.command("ask").value_or(""), section.place("name")};
    if (setting.name.empty() || setting.ask.empty()) section.refuse(Problem::bad_sheet, "name", "a [[setting]] has a name and a question", "write name = \"frequency\" and ask = \"FREQ?\"");
    profile.settings.push_back(std::move(setting));
  }
  if (auto section = sheet.section("reading")) profile.reading = read_reading(std::move(*section));
  if (auto section = sheet.section("record")) profile.record = read_record(std::move(*section));
  if (!profile.reading && !profile.record) {
    sheet.refuse(Problem::bad_sheet, "reading", "there is neither [reading] nor [record]", "say what is asked and which fields come: [reading] ask, fields");
  }
  if (auto section = sheet.section("present")) {
    profile.present = read_present(std::move(*section), profile.reading ? profile.reading->fields : std::vector<ProfileField>{});
  }
  if (profile.reading && !profile.reading->ask) {
    // Its lines would come between question and reply.
    for (const char* key : {"identity", "setting", "record"}) {
      if (sheet.has(key)) sheet.refuse(Problem::bad_sheet, key, "[reading] has no 'ask', so the instrument prints lines unasked: it cannot be asked for anything else", "write ask = \"...\" in [reading], or leave this out");
    }
    if (profile.present && profile.present->ask) sheet.refuse(Problem::bad_sheet, "present", "[reading] has no 'ask', so the instrument prints lines unasked: it cannot be asked for anything else", "use open_above and short_below instead");
  }
  if (auto section = sheet.section("calibration")) profile.calibration = read_calibration(std::move(*section));
  if (auto section = sheet.section("verdict")) {
    VerdictCommands verdict;
    verdict.pass = section->command("pass").value_or("");
    verdict.fail = section->command("fail").value_or("");
    verdict.otherwise = section->command("otherwise").value_or("");
    for (const auto& [key, text] : {std::pair{"pass", verdict.pass}, {"fail", verdict.fail}, {"otherwise", verdict.otherwise}}) {
      if (text.empty()) section->refuse(Problem::bad_sheet, key, std::string("[verdict] does not say ") + key, "a sorter needs pass, fail and otherwise: a part of which nothing is known must go somewhere");
    }
    profile.verdict = verdict;
  }
  // A key that is missing is often one that was misspelt: that comes first.
  if (const auto known = root.refuse_unknown_keys(); !known) return failure(known);
  if (error) return tl::make_unexpected(*error);
  return profile;
}

}  // namespace

Result<InstrumentProfile> read_instrument_profile(const std::string& path) {
  const auto root = read_sheet(path);
  if (!root) return failure(root);
  return read_profile(*root, path);
}

Result<InstrumentProfile> parse_instrument_profile(std::string_view text, const std::string& name) {
  const auto root = parse_sheet(text, name);
  if (!root) return failure(root);
  return read_profile(*root, name);
}

}  // namespace coilassay
