// A profile tried step by step: what was sent, what came, how it was read, and where it went wrong.
#include <algorithm>
#include <nlohmann/json.hpp>

#include "acquire/instrument/block.h"
#include "acquire/instrument/conversation.h"
#include "acquire/instrument/open_stream.h"
#include "acquire/instrument/pattern.h"
#include "acquire/instrument/reply_values.h"
#include "analysis/reading.h"
#include "app/runs/acquire_run.h"
#include "app/runs/spared_files.h"
#include "base/number_text.h"
#include "base/outside_text.h"
#include "report/json_writer.h"

namespace coilassay {

namespace {

constexpr std::size_t kShown = 160;  // bytes of one exchange that are shown

/// Listens to everything that passes, piece by piece; pieces of one direction are joined.
struct Overheard {
  std::vector<std::pair<bool, std::string>> pieces;
  void add(bool sent, std::string_view bytes) {
    if (pieces.empty() || pieces.back().first != sent) pieces.emplace_back(sent, "");
    std::string& last = pieces.back().second;
    if (last.size() < 65536) last += bytes;
  }
};

class OverheardStream final : public ByteStream {
 public:
  OverheardStream(std::unique_ptr<ByteStream> inner, Overheard& ear) : inner_(std::move(inner)), ear_(ear) {}
  const std::string& name() const override { return inner_->name(); }
  Result<void> write(std::string_view bytes, Span patience) override {
    ear_.add(true, bytes);
    return inner_->write(bytes, patience);
  }
  Result<std::size_t> read(std::span<char> into, Span patience) override {
    auto got = inner_->read(into, patience);
    if (got && *got > 0) ear_.add(false, {into.data(), *got});
    return got;
  }

 private:
  std::unique_ptr<ByteStream> inner_;
  Overheard& ear_;
};

/// What the bytes that came suggest when a reply was not understood.
std::string suggestion(const Overheard& ear, const LinkSetup& link) {
  std::string came;
  for (const auto& [sent, bytes] : ear.pieces) {
    if (!sent) came += bytes;
  }
  if (came.empty()) return "nothing came: is it switched on, is this its port, does it expect another terminator or baud?";
  const auto odd = std::count_if(came.begin(), came.end(), [](char c) {
    const auto u = static_cast<unsigned char>(c);
    return (u < 0x20 && c != '\r' && c != '\n' && c != '\t') || u > 0x7e;
  });
  if (4 * static_cast<std::size_t>(odd) > came.size()) return "what came is no text: look at baud and frame in [link]";
  if (came.find(link.reply_terminator) == std::string::npos) {
    if (came.find('\r') != std::string::npos) return "what came ends with a carriage return: write reply_terminator = \"\\r\" in [link]";
    return "what came has no terminator: look at reply_terminator in [link]";
  }
  for (const auto& [sent, bytes] : ear.pieces) {
    const std::string_view line = std::string_view(bytes).substr(0, bytes.find_first_of("\r\n"));
    if (sent && !line.empty() && !link.echo && came.starts_with(line)) return "it sends back what it was sent: write echo = true in [link]";
  }
  return {};
}

/// The steps; each adds itself, and says whether to go on.
class Trial {
 public:
  Trial(const InstrumentProfile& profile, const std::shared_ptr<ByteLog>& log, const std::function<bool()>& stopped)
      : profile_(profile), line_(hasty(profile.link), profile.identity, overhearing(opener_of(profile.link, log)), stopped) {}

  TryReport run() {
    if (open() && prepare() && settings() && reading() && record() && present()) verdict();
    return std::move(report_);
  }

 private:
  /// Nothing is waited for that is not there: this is for finding out, not for measuring.
  static LinkSetup hasty(LinkSetup link) {
    link.reconnect_s = 0;
    return link;
  }
  StreamOpener overhearing(StreamOpener inner) {
    return [this, inner = std::move(inner)]() -> Result<std::unique_ptr<ByteStream>> {
      auto stream = inner();
      if (!stream) return stream;
      return std::make_unique<OverheardStream>(std::move(*stream), ear_);
    };
  }

  bool step(std::string title, std::vector<std::string> read_as, std::optional<Error> trouble = std::nullopt) {
    TryStep step;
    step.title = std::move(title);
    for (const auto& [sent, bytes] : ear_.pieces) {
      std::string text = escaped_bytes(std::string_view(bytes).substr(0, kShown));
      if (bytes.size() > kShown) text += " ... (" + std::to_string(bytes.size()) + " bytes)";
      step.bytes.emplace_back(sent, std::move(text));
    }
    step.read_as = std::move(read_as);
    if (trouble) {
      if (const std::string better = suggestion(ear_, profile_.link); !better.empty()) trouble->remedy = better;
      step.trouble = std::move(trouble);
    }
    ear_.pieces.clear();
    report_.steps.push_back(std::move(step));
    return !report_.steps.back().trouble;
  }

  bool open() {
    const bool unasked = profile_.reading && !profile_.reading->ask;
    const auto opened = line_.open(unasked);
    if (!opened && ear_.pieces.empty()) {
      report_.steps.push_back({"open " + shown(profile_.link.port, 80), {}, {}, opened.error().error});
      return false;
    }
    std::vector<std::string> read_as;
    if (opened && profile_.identity) read_as.push_back("identity: " + shown(line_.identity(), 120));
    if (opened && !profile_.identity && !unasked) read_as.push_back("it was silent for " + to_text(profile_.link.lateness_s, Unit::second) + ", as it should be");
    if (opened && unasked) read_as.push_back("open; it is not asked anything, as [reading] has no 'ask'");
    return step(profile_.identity ? "open, listen, ask who it is" : "open and listen", read_as, opened ? std::nullopt : std::optional(opened.error().error));
  }

  bool prepare() {
    if (profile_.prepare.empty()) return true;
    for (const std::string& command : profile_.prepare) {
      if (const auto sent = line_.tell(command); !sent) return step("prepare", {}, sent.error().error);
    }
    return step("prepare", {"no reply is expected"});
  }

  bool settings() {
    for (const SettingQuestion& setting : profile_.settings) {
      const auto reply = line_.ask(setting.ask);
      if (!reply) return step("setting " + shown(setting.name, 40), {}, reply.error().error);
      step("setting " + shown(setting.name, 40), {shown(setting.name, 40) + ": " + shown(*reply, 80)});
    }
    return true;
  }

  bool reading() {
    if (!profile_.reading) return true;
    const ReadingSetup& setup = *profile_.reading;
    const auto line = setup.ask ? line_.ask(*setup.ask) : line_.next_line();
    if (!line) return step("reading", {}, line.error().error);
    const auto reading = parse_reading(setup, *line, profile_.path);
    if (!reading) return step("reading", {}, reading.error());
    std::vector<std::string> read_as;
    for (const ReadingValue& value : reading->values) {
      read_as.push_back(shown(value.symbol, 40) + ": " + (value.state == ValueState::over_range ? "no value (over range, or nothing there)" : to_text(value.value, value.unit, Script::utf8, 7)));
    }
    const bool has_status = std::any_of(setup.fields.begin(), setup.fields.end(), [](const ProfileField& f) { return f.symbol == "status"; });
    if (has_status) read_as.push_back("status: " + shown(reading->status, 40) + (reading->status_ok ? " (all is well)" : " (not " + shown(setup.status, 40) + ": values would not be used)"));
    return step("reading", read_as);
  }

  bool record() {
    if (!profile_.record) return true;
    const RecordSetup& setup = *profile_.record;
    for (const std::string& question : setup.ask) {
      const std::string title = "record " + shown(question, 40);
      if (setup.format == RecordSetup::Format::rows) {
        const auto lines = line_.ask_rows(question, setup.count);
        if (!lines) return step(title, {}, lines.error().error);
        step(title, {std::to_string(lines->size()) + " rows; the first is '" + shown(lines->front(), 80) + "'"});
        continue;
      }
      const std::size_t width = setup.ask.size() == 1 ? setup.fields.size() : 1;
      const std::size_t bytes = setup.count * width * bytes_per_sample(setup.format);
      const auto payload = line_.ask_block(question, bytes);
      if (!payload) return step(title, {}, payload.error().error);
      if (payload->size() != bytes) {
        return step(title, {}, Error{Problem::instrument, profile_.path, "the block has " + std::to_string(payload->size()) + " bytes where count, fields and format make " + std::to_string(bytes), "look at count and format in [record]"});
      }
      const auto raw = raw_samples(*payload, setup.format, setup.big_endian);
      const auto [least, most] = std::minmax_element(raw.begin(), raw.end());
      step(title, {std::to_string(raw.size()) + " numbers from " + to_shortest(*least) + " to " + to_shortest(*most) + ", before scale and offset"});
    }
    return true;
  }

  bool present() {
    if (!profile_.present || !profile_.present->ask) return true;
    const auto reply = line_.ask(*profile_.present->ask);
    if (!reply) return step("present", {}, reply.error().error);
    const auto pattern = Pattern::compile(profile_.present->when, profile_.path);
    if (!pattern) return step("present", {}, pattern.error());
    return step("present", {pattern->is_all_of(*reply) ? "a part is in the fixture" : "no part is in the fixture ('" + shown(*reply, 40) + "' is not " + shown(profile_.present->when, 40) + ")"});
  }

  void verdict() {
    if (!profile_.verdict) return;
    step("verdict", {"nothing is sent now: a pass would send '" + shown(profile_.verdict->pass, 40) + "', a fail '" + shown(profile_.verdict->fail, 40) + "', anything else '" +
                     shown(profile_.verdict->otherwise, 40) + "'"});
  }

  const InstrumentProfile& profile_;
  Overheard ear_;
  Conversation line_;
  TryReport report_;
};

}  // namespace

Result<TryReport> run_try_profile(const std::string& path, const std::optional<std::string>& trace, const std::function<bool()>& stopped,
                                  const RunContext& context) {
  const auto profile = read_instrument_profile(path);
  if (!profile) return failure(profile);
  if (auto fine = check_profile_symbols(*profile, false); !fine) return failure(fine);
  std::shared_ptr<ByteLog> log;
  if (trace) {
    // A recorded session that is played is read while the log is written.
    if (auto spared = spare_files(std::vector<GivenFile>{{"--trace", *trace}}, std::vector<GivenFile>{{"", profile->link.port}}); !spared) return failure(spared);
    auto begun = ByteLog::begin(*trace, "coilassay trace of " + path + ", begun " + to_text(context.now));
    if (!begun) return failure(begun);
    log = *begun;
  }
  return Trial(*profile, log, stopped).run();
}

std::string to_json(const TryReport& report) {
  nlohmann::ordered_json document;
  document["schema"] = "coilassay.try/1";
  document["works"] = report.works();
  auto& steps = document["steps"] = nlohmann::ordered_json::array();
  for (const TryStep& step : report.steps) {
    nlohmann::ordered_json each;
    each["step"] = step.title;
    each["bytes"] = nlohmann::ordered_json::array();
    for (const auto& [sent, bytes] : step.bytes) each["bytes"].push_back({{sent ? "sent" : "came", bytes}});
    each["read_as"] = step.read_as;
    if (step.trouble) each["trouble"] = {{"finding", json_safe(step.trouble->finding)}, {"remedy", json_safe(step.trouble->remedy)}};
    steps.push_back(std::move(each));
  }
  return json_text(document);
}

}  // namespace coilassay
