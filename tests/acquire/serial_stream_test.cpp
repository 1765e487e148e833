// Serial ports: pseudo-terminals in the place of leads, and scripts in the place of instruments.
#include "acquire/instrument/serial_stream.h"

#include <fcntl.h>
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <pty.h>
#include <sys/wait.h>
#include <termios.h>
#include <unistd.h>

#include <array>
#include <chrono>
#include <csignal>
#include <filesystem>
#include <string>
#include <thread>

#include "acquire/instrument/instrument.h"
#include "acquire/instrument/open_stream.h"
#include "tests/support/instrument_bench.h"
#include "tests/support/program.h"

namespace coilassay {
namespace {

using testing::HasSubstr;
using Clock = std::chrono::steady_clock;
using std::chrono::milliseconds;

/// A lead whose far end the test holds.
struct Lead {
  Lead() {
    std::array<char, 128> path{};
    int slave = -1;
    if (openpty(&far, &slave, path.data(), nullptr, nullptr) != 0) throw std::runtime_error("no pseudo-terminal");
    termios raw{};
    tcgetattr(slave, &raw);
    cfmakeraw(&raw);
    tcsetattr(slave, TCSANOW, &raw);
    name = path.data();
    near = slave;
  }
  ~Lead() {
    pull();
    close(near);
  }
  Lead(const Lead&) = delete;
  Lead& operator=(const Lead&) = delete;
  void pull() {
    if (far >= 0) close(far);
    far = -1;
  }
  int far = -1, near = -1;
  std::string name;
};

TEST(SerialStream, CarriesBytesBothWays) {
  Lead lead;
  auto port = open_serial(lead.name, {.baud = 115200});
  ASSERT_TRUE(port) << port.error().finding;
  ASSERT_TRUE((*port)->write("*IDN?\n", milliseconds(500)));
  std::array<char, 64> bytes{};
  EXPECT_EQ(read(lead.far, bytes.data(), bytes.size()), 6);
  ASSERT_EQ(write(lead.far, "bench\n", 6), 6);
  const auto got = (*port)->read(bytes, milliseconds(500));
  ASSERT_TRUE(got);
  EXPECT_EQ(std::string(bytes.data(), *got), "bench\n");
  const auto nothing = (*port)->read(bytes, milliseconds(120));
  ASSERT_TRUE(nothing);
  EXPECT_EQ(*nothing, 0u);
}

// 250000 is no speed of the old list: any baud that the hardware can do.
TEST(SerialStream, SetsTheBaudThatIsStated) {
  for (const int baud : {9600, 115200, 250000}) {
    Lead lead;
    EXPECT_TRUE(open_serial(lead.name, {.baud = baud})) << baud;
  }
}

TEST(SerialStream, ALeadThatIsPulledIsSeenWithinASlice) {
  Lead lead;
  auto port = open_serial(lead.name, {});
  ASSERT_TRUE(port);
  std::thread hand([&] {
    std::this_thread::sleep_for(milliseconds(100));
    lead.pull();
  });
  const auto begun = Clock::now();
  std::array<char, 64> bytes{};
  const auto got = (*port)->read(bytes, milliseconds(5000));
  hand.join();
  ASSERT_FALSE(got);
  EXPECT_EQ(got.error().problem, Problem::instrument);
  EXPECT_THAT(got.error().finding, HasSubstr("lead was pulled"));
  EXPECT_LT(Clock::now() - begun, milliseconds(100 + 50 + 100)) << "a slice, and the scheduler";
}

TEST(SerialStream, APortThatIsTakenSaysSo) {
  Lead lead;
  const auto first = open_serial(lead.name, {});
  ASSERT_TRUE(first);
  const auto second = open_serial(lead.name, {});
  ASSERT_FALSE(second);
  EXPECT_THAT(second.error().finding, HasSubstr("another program has this port open"));
}

TEST(SerialStream, LinksAreFollowed) {
  Lead lead;
  test::TemporaryFolder folder;
  std::filesystem::create_symlink(lead.name, folder / "by-id-bench-lcr");
  EXPECT_TRUE(open_serial(folder / "by-id-bench-lcr", {}));
}

TEST(SerialStream, APortThatIsNotThereSaysSo) {
  for (const char* name : {"/dev/ttyNONE7", "no such port", "/dev/null"}) {
    const auto port = open_serial(name, {});
    ASSERT_FALSE(port) << name;
    EXPECT_EQ(port.error().problem, Problem::instrument);
    EXPECT_FALSE(port.error().remedy.empty());
  }
}

/// socat with an instrument behind a pseudo-terminal.
class Socat {
 public:
  Socat(const std::string& link, const std::string& other) : link_(link) {
    child_ = fork();
    if (child_ == 0) {
      const std::string end = "pty,raw,echo=0,link=" + link;
      execlp("socat", "socat", end.c_str(), other.c_str(), static_cast<char*>(nullptr));
      _exit(127);
    }
    for (int i = 0; i < 200 && !std::filesystem::exists(link); ++i) std::this_thread::sleep_for(milliseconds(10));
  }
  ~Socat() { end(); }
  Socat(const Socat&) = delete;
  Socat& operator=(const Socat&) = delete;
  void end() {
    if (child_ <= 0) return;
    kill(child_, SIGTERM);
    waitpid(child_, nullptr, 0);
    child_ = -1;
  }
  bool there() const { return std::filesystem::exists(link_); }

 private:
  std::string link_;
  pid_t child_ = -1;
};

InstrumentProfile serial_profile(const std::string& port) {
  return test::parsed_profile("[link]\nport = \"" + port + "\"\nbaud = 115200\ntimeout = \"500 ms\"\nlateness = \"50 ms\"\nreconnect = \"300 ms\"\n"
                              "[identity]\nexpect = \"script\"\n[reading]\nask = \"FETC?\"\nfields = [\"L_s [H]\", \"R_s [ohm]\"]\n");
}

// An instrument of another make altogether: a shell script behind socat, both general tools.
TEST(SerialStream, AScriptBehindSocatIsAnInstrument) {
  test::TemporaryFolder folder;
  const std::string script = folder.file("meter.sh",
                                         "while read -r question; do\n  case $question in\n    '*IDN?') echo 'script,1' ;;\n"
                                         "    'FETC?') n=$((n + 1)); echo \"4.${n}e-5,0.35\" ;;\n  esac\ndone\n");
  Socat socat(folder / "port", "exec:sh " + script);
  ASSERT_TRUE(socat.there()) << "needs socat";
  const InstrumentProfile profile = serial_profile(folder / "port");
  Instrument instrument(profile, opener_of(profile.link));
  const auto opened = instrument.open();
  ASSERT_TRUE(opened) << opened.error().finding;
  EXPECT_EQ(instrument.identity(), "script,1");
  EXPECT_DOUBLE_EQ(instrument.read()->find("L_s")->value, 4.1e-5);
  EXPECT_DOUBLE_EQ(instrument.read()->find("L_s")->value, 4.2e-5);
  socat.end();
  const auto after = instrument.read();
  ASSERT_FALSE(after);
  EXPECT_TRUE(instrument.is_gone());
  EXPECT_EQ(after.error().problem, Problem::instrument);
}

TEST(SerialStream, TheStandInAnswersOnAPseudoTerminal) {
  Lead lead;
  synthetic::StandInSetup setup;
  setup.profile = test::parsed_profile(test::meter_profile_text("127.0.0.1:1"));
  auto stand_in = synthetic::StandIn::make(setup);
  ASSERT_TRUE(stand_in);
  std::atomic<bool> stop{false};
  std::thread server([&] { synthetic::serve_descriptor(lead.far, *stand_in, 0.02, [&] { return stop.load(); }); });
  InstrumentProfile profile = setup.profile;
  profile.link.kind = LinkSetup::Kind::serial;
  profile.link.port = lead.name;
  Instrument instrument(profile, opener_of(profile.link));
  const auto opened = instrument.open();
  EXPECT_TRUE(opened) << opened.error().finding;
  const auto reading = instrument.read();
  stop = true;
  server.join();
  ASSERT_TRUE(reading) << reading.error().finding;
  EXPECT_NEAR(reading->find("L_s")->value, 47e-6, 1e-10);
}

// Without any stand-in: whatever serial ports the machine really has are opened, or their absence is told.
TEST(SerialStream, RealPortsOpenOrSayWhyNot) {
  std::size_t real = 0;
  for (const auto& entry : std::filesystem::directory_iterator("/sys/class/tty")) {
    if (!std::filesystem::exists(entry.path() / "device" / "driver")) continue;
    const std::string name = "/dev/" + entry.path().filename().string();
    if (!std::filesystem::exists(name)) continue;
    ++real;
    const auto port = open_serial(name, {});
    EXPECT_TRUE(port.has_value() || !port.error().remedy.empty()) << name;
  }
  if (real == 0) GTEST_SKIP() << "this machine has no serial port";
}

}  // namespace
}  // namespace coilassay
