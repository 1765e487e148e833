// What README.md shows is what the program says: each command in it is run beside the samples, and its output begins as shown.
#include <gmock/gmock.h>
#include <gtest/gtest.h>

#include <cstdio>
#include <filesystem>
#include <string>
#include <vector>

#include "tests/house/source_tree.h"
#include "tests/support/paths.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

struct Shown {
  std::string command;
  std::vector<std::string> lines;
};

/// Commands of the indented blocks ("    $ coilassay ...") with the lines shown under each.
std::vector<Shown> shown_in_readme() {
  std::vector<Shown> all;
  bool inside = false;
  for (const std::string& line : source_file("README.md").lines) {
    const bool indented = line.starts_with("    ");
    if (indented && line.starts_with("    $ coilassay ")) {
      all.push_back({line.substr(6), {}});
      inside = true;
    } else if (indented && line.starts_with("    $ ")) {
      inside = false;   // a step between
    } else if (inside && (indented || line.empty())) {
      all.back().lines.push_back(indented ? line.substr(4) : "");
    } else {
      inside = false;
    }
  }
  for (Shown& each : all) {
    while (!each.lines.empty() && each.lines.back().empty()) each.lines.pop_back();
  }
  return all;
}

TEST(Readme, ShowsWhatTheProgramSays) {
  const std::vector<Shown> all = shown_in_readme();
  ASSERT_GE(all.size(), 2u);
  const TemporaryFolder folder;
  std::filesystem::copy("sample-data", folder / "sample-data", std::filesystem::copy_options::recursive);
  const std::string whole = std::filesystem::absolute(program()).string();
  for (const Shown& each : all) {
    const std::string arguments = each.command.substr(std::string("coilassay").size());
    std::FILE* pipe = popen(("cd '" + folder / "sample-data" + "' && LC_ALL=C.UTF-8 '" + whole + "'" + arguments + " 2>/dev/null").c_str(), "r");
    ASSERT_NE(pipe, nullptr);
    std::string out;
    char block[4096];
    for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) out.append(block, n);
    pclose(pipe);
    std::string expected;
    for (const std::string& line : each.lines) expected += line + "\n";
    EXPECT_EQ(out.substr(0, expected.size()), expected) << each.command;
  }
}

}  // namespace
}  // namespace coilassay::test
