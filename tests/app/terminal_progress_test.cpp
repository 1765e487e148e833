#include "app/commands/terminal_progress.h"

#include <gtest/gtest.h>

#include <sstream>

namespace coilassay {
namespace {

TEST(TerminalProgress, StaysSilentForASecondAndTidiesUp) {
  std::ostringstream terminal;
  double now = 100;
  {
    TerminalProgress progress(terminal, Script::utf8, 80, [&] { return now; });
    now = 100.9;
    EXPECT_TRUE(progress.advance("reading ring.csv", 1, 4));
    EXPECT_EQ(terminal.str(), "");
    now = 101.1;
    progress.advance("reading ring.csv", 2, 4);
    EXPECT_EQ(terminal.str(), "\r\x1b[Kreading ring.csv 50 %");
    now = 101.15;  // too soon for the eye
    progress.advance("reading ring.csv", 3, 4);
    EXPECT_EQ(terminal.str(), "\r\x1b[Kreading ring.csv 50 %");
    now = 101.3;
    progress.advance("trials", 3, 0);
    EXPECT_TRUE(terminal.str().ends_with("\r\x1b[Ktrials"));
  }
  EXPECT_TRUE(terminal.str().ends_with("\r\x1b[K"));
}

TEST(TerminalProgress, LeavesNoTraceOfQuickWork) {
  std::ostringstream terminal;
  {
    TerminalProgress progress(terminal, Script::utf8, 80, [] { return 0.0; });
    progress.advance("reading", 1, 2);
  }
  EXPECT_EQ(terminal.str(), "");
}

TEST(TerminalProgress, ShowsOutsideNamesSafely) {
  std::ostringstream terminal;
  double now = 0;
  TerminalProgress progress(terminal, Script::ascii, 80, [&] { return now; });
  now = 2;
  progress.advance("reading \x1b]0;x", 1, 2);
  EXPECT_EQ(terminal.str(), "\r\x1b[Kreading \\x1b]0;x 50 %");
}

}  // namespace
}  // namespace coilassay
