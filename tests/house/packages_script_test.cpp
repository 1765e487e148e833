// cmake/debian-packages.sh against a make-believe machine: a folder of stand-ins for apt-get, dpkg-query, id and sudo that write
// down how they were called.
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <sys/wait.h>

#include <cstdio>
#include <filesystem>
#include <fstream>
#include <string>

#include "tests/house/source_tree.h"

namespace coilassay::test {
namespace {

namespace fs = std::filesystem;
using testing::HasSubstr;
using testing::Not;

class PackagesScript : public testing::Test {
 protected:
  void SetUp() override {
    folder_ = fs::path(testing::TempDir()) / ("packages-" + std::string(testing::UnitTest::GetInstance()->current_test_info()->name()));
    fs::remove_all(folder_);
    fs::create_directories(folder_ / "bin");
    // What the script itself needs of a system.
    for (const char* tool : {"env", "tr"}) {
      for (const char* place : {"/usr/bin/", "/bin/"}) {
        if (fs::exists(std::string(place) + tool) && !fs::exists(folder_ / "bin" / tool)) {
          fs::create_symlink(std::string(place) + tool, folder_ / "bin" / tool);
        }
      }
    }
    stand_in("id", "echo 0");
    // Installed is what stands in the file 'installed'.
    stand_in("dpkg-query", "while [ $# -gt 1 ]; do shift; done\nwhile read -r name; do [ \"$name\" = \"$1\" ] && echo 'install ok installed'; "
                           "done <\"$FOLDER/installed\"\nexit 0");
    write("installed", "cmake\n");
  }
  void TearDown() override { fs::remove_all(folder_); }

  void write(const std::string& name, const std::string& text) { std::ofstream(folder_ / name) << text; }
  void stand_in(const std::string& name, const std::string& does) {
    const fs::path path = folder_ / "bin" / name;
    std::ofstream(path) << "#!/bin/sh\n" << does << '\n';
    fs::permissions(path, fs::perms::owner_all);
  }
  /// apt-get that writes down its arguments; `does` decides on its exit.
  void apt_get(const std::string& does) { stand_in("apt-get", "echo \"apt-get $*\" >>\"$FOLDER/calls\"\n" + does); }

  /// What the script said; `exit_code_` and `calls()` tell the rest.
  std::string need(const std::string& packages) {
    const std::string command = "FOLDER='" + folder_.string() + "' PATH='" + (folder_ / "bin").string() +
                                "' /bin/sh -c '. cmake/debian-packages.sh; need_packages " + packages + "' 2>&1";
    std::FILE* pipe = popen(command.c_str(), "r");
    std::string text;
    char block[512];
    for (std::size_t n; (n = std::fread(block, 1, sizeof block, pipe)) > 0;) text.append(block, n);
    const int status = pclose(pipe);
    exit_code_ = WIFEXITED(status) ? WEXITSTATUS(status) : -1;
    return text;
  }
  std::string calls() const { return source_file((folder_ / "calls").string()).text(); }

  fs::path folder_;
  int exit_code_ = -1;
};

TEST_F(PackagesScript, ChangesNothingWhenAllIsThere) {
  apt_get("exit 0");
  EXPECT_EQ(need("cmake"), "");
  EXPECT_EQ(exit_code_, 0);
  EXPECT_EQ(calls(), "");
}

TEST_F(PackagesScript, InstallsWhatIsMissingAndNothingElse) {
  apt_get("exit 0");
  EXPECT_THAT(need("cmake ngspice"), HasSubstr("missing: ngspice"));
  EXPECT_EQ(exit_code_, 0);
  EXPECT_THAT(calls(), HasSubstr("--no-install-recommends --no-remove install ngspice"));
  EXPECT_THAT(calls(), Not(HasSubstr("cmake")));
  EXPECT_THAT(calls(), Not(HasSubstr("update"))) << "the index is not fetched when it is not needed";
}

TEST_F(PackagesScript, FetchesTheIndexWhenItKnowsNothing) {
  apt_get("case $* in *update*) : >\"$FOLDER/index\" ;; *) [ -e \"$FOLDER/index\" ] ;; esac");
  need("ngspice");
  EXPECT_EQ(exit_code_, 0);
  EXPECT_THAT(calls(), HasSubstr("update"));
}

TEST_F(PackagesScript, SaysSoWhenItCannotInstall) {
  apt_get("case $* in *update*) exit 0 ;; *) exit 100 ;; esac");
  const std::string said = need("ngspice");
  EXPECT_EQ(exit_code_, 1);
  EXPECT_THAT(said, HasSubstr("could not install: ngspice"));
  EXPECT_THAT(said, HasSubstr("try: "));
}

TEST_F(PackagesScript, AsksForRightsOnlyWhenSomethingIsMissing) {
  stand_in("id", "echo 1000");
  stand_in("sudo", "echo sudo >>\"$FOLDER/calls\"\n\"$@\"");
  apt_get("exit 0");
  need("cmake");
  EXPECT_EQ(calls(), "");
  need("ngspice");
  EXPECT_EQ(exit_code_, 0);
  EXPECT_THAT(calls(), HasSubstr("sudo\n"));
}

TEST_F(PackagesScript, WithoutRightsItSaysWhatToInstall) {
  stand_in("id", "echo 1000");
  apt_get("exit 0");
  EXPECT_THAT(need("ngspice"), HasSubstr("as root, apt-get install --no-install-recommends ngspice"));
  EXPECT_EQ(exit_code_, 1);
}

TEST_F(PackagesScript, OnAnotherSystemItNamesThePackagesAndGoesOn) {
  fs::remove(folder_ / "bin" / "dpkg-query");
  const std::string said = need("cmake ngspice");
  EXPECT_EQ(exit_code_, 0);
  EXPECT_THAT(said, HasSubstr("no Debian system"));
  EXPECT_THAT(said, HasSubstr("cmake ngspice"));
}

}  // namespace
}  // namespace coilassay::test
