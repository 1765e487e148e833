// How the line is trusted again after something went wrong: rule by rule, against a far end that is told what to do.
#include "acquire/instrument/conversation.h"

#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <atomic>
#include <chrono>
#include <deque>
#include <thread>

#include "tests/support/instrument_bench.h"

namespace coilassay {
namespace {

using testing::ElementsAre;
using testing::HasSubstr;
using Clock = std::chrono::steady_clock;

/// The far end: what it sends some time after a line came; "" is asked when the line is opened. Outlives the streams.
struct FarEnd {
  struct Piece {
    double after_s;
    std::string bytes;
  };
  std::function<std::vector<Piece>(const std::string& line)> answer;
  std::atomic<bool> present{true};  // false: opening fails, and an open line is lost

  std::deque<std::pair<SteadyTime, std::string>> coming;
  std::size_t taken = 0;  // bytes of the first of them
  std::vector<std::pair<double, std::string>> heard;  // seconds since the start
  SteadyTime begun = Clock::now();

  double now_s() const { return std::chrono::duration<double>(Clock::now() - begun).count(); }
  std::vector<std::string> heard_lines() const {
    std::vector<std::string> lines;
    for (const auto& [at, line] : heard) lines.push_back(line);
    return lines;
  }
  void say(double after_s, const std::string& bytes) {
    coming.emplace_back(Clock::now() + std::chrono::duration_cast<Span>(std::chrono::duration<double>(after_s)), bytes);
    std::stable_sort(coming.begin(), coming.end(), [](const auto& a, const auto& b) { return a.first < b.first; });
  }
};

class FarStream final : public ByteStream {
 public:
  explicit FarStream(FarEnd& far) : far_(far) {}
  const std::string& name() const override { return name_; }
  Result<void> write(std::string_view bytes, Span) override {
    if (!far_.present) return failure(Problem::instrument, name_, "the line was lost", "");
    const std::string line(bytes.substr(0, bytes.find('\n')));
    far_.heard.emplace_back(far_.now_s(), line);
    for (const FarEnd::Piece& piece : far_.answer(line)) far_.say(piece.after_s, piece.bytes);
    return {};
  }
  Result<std::size_t> read(std::span<char> into, Span patience) override {
    const SteadyTime deadline = Clock::now() + patience;
    for (;;) {
      if (!far_.present) return failure(Problem::instrument, name_, "the line was lost", "");
      if (!far_.coming.empty() && far_.coming.front().first <= Clock::now()) {
        const std::string_view bytes = std::string_view(far_.coming.front().second).substr(far_.taken);
        const std::size_t n = std::min(bytes.size(), into.size());
        std::copy_n(bytes.begin(), n, into.begin());
        far_.taken += n;
        if (n == bytes.size()) {
          far_.coming.pop_front();
          far_.taken = 0;
        }
        return n;
      }
      if (Clock::now() >= deadline) return 0;
      SteadyTime until = deadline;
      if (!far_.coming.empty()) until = std::min(until, far_.coming.front().first);
      std::this_thread::sleep_until(until);
    }
  }

 private:
  FarEnd& far_;
  std::string name_ = "far end";
};

StreamOpener opener(FarEnd& far) {
  return [&far]() -> Result<std::unique_ptr<ByteStream>> {
    if (!far.present) return failure(Problem::instrument, "far end", "nobody is there", "");
    return std::make_unique<FarStream>(far);
  };
}

LinkSetup link() {
  LinkSetup setup;
  setup.port = "far end";
  setup.timeout_s = setup.byte_timeout_s = 0.05;
  setup.lateness_s = 0.06;
  setup.quiet_s = 0.005;
  setup.reconnect_s = 0.3;
  return setup;
}
const IdentitySetup kIdentity{"*IDN?", "bench"};

/// Answers the identity, and each other question with itself and a count.
std::function<std::vector<FarEnd::Piece>(const std::string&)> well_behaved(int& count) {
  return [&count](const std::string& line) -> std::vector<FarEnd::Piece> {
    if (line == "*IDN?") return {{0, "bench,1\n"}};
    return {{0, line + " " + std::to_string(++count) + "\n"}};
  };
}

/// The lead is pulled while the answer is waited for.
void pull_when_asked(FarEnd& far) {
  far.answer = [&far, before = far.answer](const std::string& line) {
    far.present = line != "A";
    return before(line);
  };
}

TEST(Conversation, AskedAndAnswered) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_EQ(line.identity(), "bench,1");
  EXPECT_EQ(line.ask("A").value(), "A 1");
  EXPECT_EQ(line.ask("B").value(), "B 2");
  EXPECT_EQ(line.counts().stale_bytes, 0u);
}

TEST(Conversation, ALateReplyIsDiscardedAndNeverShifted) {
  FarEnd far;
  int count = 0;
  const auto good = well_behaved(count);
  far.answer = [&](const std::string& l) {
    auto pieces = good(l);
    if (l == "A") pieces[0].after_s = 0.1;  // time-out at 0.05, lateness to 0.11
    return pieces;
  };
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  const auto first = line.ask("A");
  ASSERT_FALSE(first);
  EXPECT_EQ(first.error().trouble, Trouble::silent);
  EXPECT_EQ(line.ask("B").value(), "B 2");
  EXPECT_EQ(line.counts().stale_bytes, 4u) << "'A 1' and its end";
}

TEST(Conversation, AfterATimeOutItListensInSilenceThenAsksTheIdentityThenTheQuestion) {
  FarEnd far;
  int count = 0;
  const auto good = well_behaved(count);
  far.answer = [&](const std::string& l) { return l == "A" ? std::vector<FarEnd::Piece>{} : good(l); };
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  far.heard.clear();
  EXPECT_FALSE(line.ask("A"));
  EXPECT_EQ(line.ask("B").value(), "B 1");
  EXPECT_THAT(far.heard_lines(), ElementsAre("A", "*IDN?", "B"));
  EXPECT_GE(far.heard[1].first - far.heard[0].first, 0.05 + 0.06) << "time-out and lateness";
  EXPECT_GE(far.heard[2].first - far.heard[1].first, 0.005) << "a second quiet stretch";
}

TEST(Conversation, WithoutAnIdentitySilenceAloneHasToDo) {
  FarEnd far;
  int count = 0;
  const auto good = well_behaved(count);
  far.answer = [&](const std::string& l) { return l == "A" ? std::vector<FarEnd::Piece>{{0.1, "A late\n"}} : good(l); };
  Conversation line(link(), std::nullopt, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_FALSE(line.ask("A"));
  EXPECT_EQ(line.ask("B").value(), "B 1");
  EXPECT_THAT(far.heard_lines(), ElementsAre("A", "B"));
  EXPECT_GE(far.heard[1].first - far.heard[0].first, 0.05 + 0.06);
}

TEST(Conversation, WhatCameBeforeTheQuestionIsStale) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  const auto before = line.counts();
  far.say(0, "B 99\n");
  EXPECT_EQ(line.ask("B").value(), "B 1");
  EXPECT_EQ(line.counts().stale_bytes - before.stale_bytes, 5u);
  EXPECT_EQ(line.counts().resynchronisations - before.resynchronisations, 1u) << "more of it may be on the way";
}

TEST(Conversation, ADoubledReplyIsNoReply) {
  FarEnd far;
  int count = 0;
  const auto good = well_behaved(count);
  far.answer = [&](const std::string& l) {
    auto pieces = good(l);
    if (l == "A") pieces.push_back({0.003, pieces[0].bytes});
    return pieces;
  };
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  const auto first = line.ask("A");
  ASSERT_FALSE(first);
  EXPECT_EQ(first.error().trouble, Trouble::extra_bytes);
  EXPECT_EQ(line.ask("B").value(), "B 2");
}

TEST(Conversation, ASplitReplyIsPutTogether) {
  FarEnd far;
  far.answer = [](const std::string& l) -> std::vector<FarEnd::Piece> {
    if (l == "*IDN?") return {{0, "ben"}, {0.02, "ch\n"}};
    return {{0, "4"}, {0.01, "7"}, {0.03, "\r\n"}};
  };
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_EQ(line.ask("A").value(), "47");
}

TEST(Conversation, AReplyWithoutAnEndIsCutShort) {
  FarEnd far;
  far.answer = [](const std::string&) -> std::vector<FarEnd::Piece> { return {{0, "47.0"}}; };
  Conversation line(link(), std::nullopt, opener(far));
  ASSERT_TRUE(line.open());
  const auto reply = line.ask("A");
  ASSERT_FALSE(reply);
  EXPECT_EQ(reply.error().trouble, Trouble::cut_short);
  EXPECT_THAT(reply.error().error.finding, HasSubstr("47.0"));
}

TEST(Conversation, TenMegabytesWithoutAnEndAreNotCollected) {
  FarEnd far;
  far.answer = [](const std::string&) -> std::vector<FarEnd::Piece> { return {{0, std::string(10'000'000, '7')}}; };
  LinkSetup patient = link();
  patient.timeout_s = patient.byte_timeout_s = 5;   // that much takes a while to be made, too
  Conversation line(patient, std::nullopt, opener(far));
  ASSERT_TRUE(line.open());
  const auto begun = Clock::now();
  const auto reply = line.ask("A");
  ASSERT_FALSE(reply);
  EXPECT_EQ(reply.error().trouble, Trouble::too_long);
  EXPECT_LT(Clock::now() - begun, std::chrono::seconds(10)) << "it never ends by itself";
  // The rest of it is drained before anything else is asked.
  far.answer = [](const std::string&) -> std::vector<FarEnd::Piece> { return {{0, "47\n"}}; };
  EXPECT_EQ(line.ask("B").value(), "47");
}

TEST(Conversation, OneThatTalksWithoutEndIsGivenUp) {
  FarEnd far;
  const SteadyTime begun = Clock::now();   // one clock for all: no pause may slip in between
  for (int i = 0; i < 20'000; ++i) far.coming.emplace_back(begun + std::chrono::milliseconds(i), "x");
  Conversation line(link(), std::nullopt, opener(far));
  const auto opened = line.open();
  ASSERT_FALSE(opened);
  EXPECT_EQ(opened.error().trouble, Trouble::never_quiet);
}

TEST(Conversation, AfterReconnectingAnotherIdentityIsRefused) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  pull_when_asked(far);
  EXPECT_EQ(line.ask("A").error().trouble, Trouble::lost);
  far.present = true;
  far.answer = [](const std::string& l) -> std::vector<FarEnd::Piece> { return {{0, l == "*IDN?" ? "bench,2\n" : "A 1\n"}}; };
  const auto reply = line.ask("A");
  ASSERT_FALSE(reply);
  EXPECT_EQ(reply.error().trouble, Trouble::other_identity);
  EXPECT_THAT(reply.error().error.finding, HasSubstr("'bench,2' instead of 'bench,1'"));
  EXPECT_FALSE(may_be_tried_again(reply.error().trouble));
}

TEST(Conversation, TheSameInstrumentIsTakenBackAfterItsLeadWasPulled) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  pull_when_asked(far);
  EXPECT_EQ(line.ask("A").error().trouble, Trouble::lost);
  std::thread back([&] {
    std::this_thread::sleep_for(std::chrono::milliseconds(100));
    far.present = true;
  });
  const auto reply = line.ask("B");
  back.join();
  EXPECT_EQ(reply.value(), "B 2") << "the answer to A, whatever it was, is not taken for it";
  EXPECT_EQ(line.counts().reconnections, 1u);
}

TEST(Conversation, ALeadPulledBeforeTheQuestionOrAfterTheReplyCostsNoReading) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_EQ(line.ask("A").value(), "A 1");
  far.present = false;  // after the reply, hence before the next question
  std::thread back([&] {
    std::this_thread::sleep_for(std::chrono::milliseconds(100));
    far.present = true;
  });
  const auto reply = line.ask("B");
  back.join();
  EXPECT_EQ(reply.value(), "B 2") << "it was not sent into the void first";
}

TEST(Conversation, OneThatIsGoneForGoodIsWaitedForAsLongAsStated) {
  FarEnd far;
  int count = 0;
  far.answer = well_behaved(count);
  Conversation line(link(), kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  pull_when_asked(far);
  EXPECT_EQ(line.ask("A").error().trouble, Trouble::lost);
  const auto begun = Clock::now();
  const auto reply = line.ask("A");
  const double waited = std::chrono::duration<double>(Clock::now() - begun).count();
  ASSERT_FALSE(reply);
  EXPECT_EQ(reply.error().trouble, Trouble::gone);
  EXPECT_GE(waited, 0.3);
  EXPECT_LT(waited, 1.0);
}

TEST(Conversation, OneThatWasSwitchedOffAndOnAgainGoesOn) {
  FarEnd far;
  int count = 0;
  const auto good = well_behaved(count);
  bool on = true;
  far.answer = [&](const std::string& l) { return on ? good(l) : std::vector<FarEnd::Piece>{}; };
  LinkSetup patient = link();
  patient.reconnect_s = 3;
  Conversation line(patient, kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  on = false;
  EXPECT_EQ(line.ask("A").error().trouble, Trouble::silent);
  const SteadyTime begun = Clock::now();
  far.answer = [&](const std::string& l) {
    return Clock::now() - begun > std::chrono::milliseconds(600) ? good(l) : std::vector<FarEnd::Piece>{};
  };
  EXPECT_EQ(line.ask("B").value(), "B 1") << "more than three rounds of silence";
}

TEST(Conversation, AnEchoIsTakenWhereStatedAndUnreadableWhereNot) {
  FarEnd far;
  far.answer = [](const std::string& l) -> std::vector<FarEnd::Piece> { return {{0, l + "\r\n"}, {0, l == "*IDN?" ? "bench\n" : "47\n"}}; };
  LinkSetup echoing = link();
  echoing.echo = true;
  Conversation line(echoing, kIdentity, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_EQ(line.ask("A").value(), "47");
  Conversation plain(link(), kIdentity, opener(far));
  EXPECT_FALSE(plain.open());
}

TEST(Conversation, LinesThatComeUnaskedAreTakenWholeAndNew) {
  FarEnd far;
  far.answer = [](const std::string&) -> std::vector<FarEnd::Piece> { return {}; };
  Conversation line(link(), std::nullopt, opener(far));
  ASSERT_TRUE(line.open(true));
  far.say(0, "old 1\nold 2\nhal");
  far.say(0.02, "f\nnew 1\n");
  far.say(0.04, "new 2\n");
  EXPECT_EQ(line.next_line().value(), "new 1");
}

TEST(Conversation, BlocksAreReadWholeWithAndWithoutTerminator) {
  FarEnd far;
  far.answer = [](const std::string& l) -> std::vector<FarEnd::Piece> {
    if (l == "A") return {{0, "#1"}, {0.01, "5AB\nD"}, {0.02, "E\n"}};
    if (l == "B") return {{0, "#15ABCDE"}};
    if (l == "C") return {{0, "#9999999999ABC"}};
    return {{0, "ABC\n"}};
  };
  Conversation line(link(), std::nullopt, opener(far));
  ASSERT_TRUE(line.open());
  EXPECT_EQ(line.ask_block("A", 5).value(), "AB\nDE") << "a line feed among the bytes ends nothing";
  EXPECT_EQ(line.ask_block("B", 5).value(), "ABCDE");
  EXPECT_EQ(line.ask_block("C", 5).error().trouble, Trouble::unreadable) << "more is announced than stated";
  EXPECT_EQ(line.ask_block("D", 5).error().trouble, Trouble::unreadable);
}

TEST(Conversation, StopsWhenTheUserSaysSo) {
  FarEnd far;
  far.answer = [](const std::string&) -> std::vector<FarEnd::Piece> { return {}; };
  std::atomic<bool> stop{false};
  LinkSetup slow = link();
  slow.timeout_s = slow.byte_timeout_s = 60;
  Conversation line(slow, std::nullopt, opener(far), [&] { return stop.load(); });
  ASSERT_TRUE(line.open());
  std::thread user([&] {
    std::this_thread::sleep_for(std::chrono::milliseconds(50));
    stop = true;
  });
  const auto begun = Clock::now();
  EXPECT_EQ(line.ask("A").error().trouble, Trouble::stopped);
  user.join();
  EXPECT_LT(Clock::now() - begun, std::chrono::seconds(30));   // long before the time-out
}

// A sample of the claim that tests/proof/instrument_wrong_unit.cpp makes at full size.
TEST(Conversation, NotOneReadingOfAThousandLandsOnAWrongUnit) {
  const test::UnitsMeasured all = test::measure_units(1000, test::five_percent(), 7);
  EXPECT_EQ(all.wrong_unit, 0u);
  // On a machine that has no time for it a good reply may come too late and be refused: that is safe, and must be rare.
  EXPECT_LE(all.refused, 50u);
  EXPECT_EQ(all.units, 1000u);
  EXPECT_GT(all.misbehaved, 25u) << "otherwise nothing was tried";
  EXPECT_GT(all.resynchronisations, 15u);
}

}  // namespace
}  // namespace coilassay
