// What leaves the house: an installed tree that another project finds and links, and Debian packages.
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <sys/wait.h>

#include <cstdio>
#include <filesystem>
#include <string>

#include "tests/support/paths.h"
#include "tests/support/program.h"

namespace coilassay::test {
namespace {

using testing::HasSubstr;
using testing::Not;

struct ShellEnd {
  int exit_code = -1;
  std::string out;   // both streams
};

ShellEnd shell(const std::string& command) {
  std::FILE* pipe = popen(("( " + command + " ) 2>&1").c_str(), "r");
  if (pipe == nullptr) return {};
  ShellEnd end;
  char block[4096];
  for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) end.out.append(block, n);
  const int status = pclose(pipe);
  end.exit_code = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
  return end;
}

std::string build_folder() { return std::filesystem::path(program()).parent_path().parent_path().string(); }

// The ten lines of tests/packaging/consumer, built against an installed tree alone, measure what the program measures.
TEST(Packaging, AnotherProjectFindsTheLibrariesAndMeasuresWithThem) {
  const TemporaryFolder folder;
  const ShellEnd installed = shell("cmake --install '" + build_folder() + "' --prefix '" + folder / "usr" + "'");
  ASSERT_EQ(installed.exit_code, 0) << installed.out;
  const ShellEnd built = shell("cmake -S tests/packaging/consumer -B '" + folder / "build" + "' -G Ninja -DCMAKE_PREFIX_PATH='" +
                               folder / "usr" + "' && cmake --build '" + folder / "build" + "'");
  ASSERT_EQ(built.exit_code, 0) << built.out;
  const ShellEnd ours = shell("'" + folder / "build/consumer" + "' sample-data/drum-47.csv 10.02e-9");
  ASSERT_EQ(ours.exit_code, 0) << ours.out;
  const ShellEnd program_says =
      shell("'" + folder / "usr/bin/coilassay" + "' ringdown sample-data/drum-47.csv --capacitor '10.02nF±0%' --json --quiet");
  ASSERT_EQ(program_says.exit_code, 0) << program_says.out;
  const std::string number = ours.out.substr(0, 12);   // 4.6183...e-05 to all digits that both write
  EXPECT_THAT(program_says.out, HasSubstr("\"value\": " + number));
  for (const char* file : {"usr/share/man/man1/coilassay.1", "usr/share/doc/coilassay/docs/findings.md",
                           "usr/share/bash-completion/completions/coilassay"}) {
    EXPECT_TRUE(std::filesystem::exists(folder / file)) << file;
  }
}

TEST(Packaging, MakesADebianPackageOfTheProgramAndOneOfTheLibraries) {
  const TemporaryFolder folder;
  const ShellEnd packed = shell("cd '" + folder.path() + "' && cpack --config '" +
                                std::filesystem::absolute(build_folder()).string() + "/CPackConfig.cmake' -B '" + folder.path() + "'");
  ASSERT_EQ(packed.exit_code, 0) << packed.out;
  const ShellEnd program_package = shell("cd '" + folder.path() + "' && dpkg-deb -I coilassay_*.deb && dpkg-deb -c coilassay_*.deb");
  ASSERT_EQ(program_package.exit_code, 0) << program_package.out;
  EXPECT_THAT(program_package.out, HasSubstr("libc6"));
  EXPECT_THAT(program_package.out, HasSubstr("libfftw3-double3"));
  EXPECT_THAT(program_package.out, HasSubstr("Recommends: gnuplot-nox"));
  EXPECT_THAT(program_package.out, HasSubstr("./usr/bin/coilassay"));
  EXPECT_THAT(program_package.out, Not(HasSubstr("libcoilassay_base.a")));
  const ShellEnd libraries = shell("cd '" + folder.path() + "' && dpkg-deb -I coilassay-dev_*.deb && dpkg-deb -c coilassay-dev_*.deb");
  ASSERT_EQ(libraries.exit_code, 0) << libraries.out;
  EXPECT_THAT(libraries.out, HasSubstr("libeigen3-dev"));
  EXPECT_THAT(libraries.out, HasSubstr("./usr/include/coilassay/analysis/ring_down.h"));
}

}  // namespace
}  // namespace coilassay::test
