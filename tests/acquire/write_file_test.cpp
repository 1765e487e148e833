#include <fcntl.h>
#include <gmock/gmock.h>
#include <gtest/gtest.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <functional>
#include <sstream>
#include <thread>

#include "acquire/capture_writer.h"

namespace coilassay {
namespace {

namespace fs = std::filesystem;

class WriteFile : public ::testing::Test {
 protected:
  WriteFile() {
    folder_ = fs::temp_directory_path() / ("write_file_test_" + std::to_string(::getpid()));
    fs::create_directories(folder_);
  }
  ~WriteFile() override {
    fs::permissions(folder_, fs::perms::owner_all);
    fs::remove_all(folder_);
  }
  WriteFile(const WriteFile&) = delete;
  WriteFile& operator=(const WriteFile&) = delete;

  std::string in(const std::string& name) const { return (folder_ / name).string(); }
  static std::string contents(const std::string& path) {
    std::ifstream file(path, std::ios::binary);
    std::ostringstream text;
    text << file.rdbuf();
    return text.str();
  }
  std::size_t entries() const {
    return static_cast<std::size_t>(std::distance(fs::directory_iterator(folder_), fs::directory_iterator()));
  }
  void refuses(const std::string& path, const std::string& word) const {
    const auto written = write_file(path, "new");
    ASSERT_FALSE(written) << path;
    EXPECT_EQ(written.error().problem, Problem::cannot_write);
    EXPECT_EQ(written.error().place, path);
    EXPECT_THAT(written.error().finding, ::testing::HasSubstr(word));
  }

  fs::path folder_;
};

/// Runs in a process of its own; its exit code is what `work` returns.
int in_child(const std::function<int()>& work) {
  const pid_t child = ::fork();
  if (child == 0) ::_exit(work());
  int status = 0;
  ::waitpid(child, &status, 0);
  return WIFEXITED(status) ? WEXITSTATUS(status) : 1000 + WTERMSIG(status);
}

TEST_F(WriteFile, NewFilesHonourTheUmaskAndOldOnesKeepTheirMode) {
  EXPECT_EQ(in_child([&] {
              ::umask(027);
              return write_file(in("new.csv"), "a\n") ? 0 : 1;
            }),
            0);
  EXPECT_EQ(contents(in("new.csv")), "a\n");
  struct stat about {};
  ASSERT_EQ(::stat(in("new.csv").c_str(), &about), 0);
  EXPECT_EQ(about.st_mode & 07777, 0640U);
  ASSERT_EQ(::chmod(in("new.csv").c_str(), 0600), 0);
  ASSERT_TRUE(write_file(in("new.csv"), "b\n"));
  EXPECT_EQ(contents(in("new.csv")), "b\n");
  ASSERT_EQ(::stat(in("new.csv").c_str(), &about), 0);
  EXPECT_EQ(about.st_mode & 07777, 0600U);
  EXPECT_EQ(entries(), 1U);
}

TEST_F(WriteFile, AnyNameThatFitsIsWritten) {
  const std::string longest(255, 'x');
  ASSERT_TRUE(write_file(in(longest), std::string("\0\xff\n", 3)));
  EXPECT_EQ(contents(in(longest)), std::string("\0\xff\n", 3));
  ASSERT_TRUE(write_file(in("empty"), ""));
  EXPECT_EQ(contents(in("empty")), "");
}

TEST_F(WriteFile, ALinkIsKeptAndItsTargetReplaced) {
  fs::create_directory(in("real"));
  std::ofstream(in("real/file")) << "old";
  fs::create_symlink("real/file", in("link"));
  ASSERT_TRUE(write_file(in("link"), "new"));
  EXPECT_TRUE(fs::is_symlink(in("link")));
  EXPECT_EQ(contents(in("real/file")), "new");
  fs::create_symlink("real/later", in("dangling"));
  ASSERT_TRUE(write_file(in("dangling"), "made"));
  EXPECT_TRUE(fs::is_symlink(in("dangling")));
  EXPECT_EQ(contents(in("real/later")), "made");
}

TEST_F(WriteFile, DevicesAndPipesAreWrittenInto) {
  ASSERT_TRUE(write_file("/dev/null", "nothing"));
  EXPECT_TRUE(fs::is_character_file("/dev/null"));
  const std::string pipe = in("pipe");
  ASSERT_EQ(::mkfifo(pipe.c_str(), 0600), 0);
  std::string got;
  std::thread reader([&] { got = contents(pipe); });
  const std::string much(300000, 'z');  // more than a pipe holds
  EXPECT_TRUE(write_file(pipe, much));
  reader.join();
  EXPECT_EQ(got, much);
  EXPECT_TRUE(fs::is_fifo(pipe));
  EXPECT_EQ(entries(), 1U);
}

TEST_F(WriteFile, AFullDiskSaysSo) {
  refuses("/dev/full", "the disk is full");
}

TEST_F(WriteFile, AMissingFolderSaysSo) {
  refuses(in("none/file"), "no such folder");
  std::ofstream(in("plain")) << "x";
  refuses(in("plain/file"), "no such folder");
  refuses(in(""), "a folder");
  refuses(folder_.string(), "a folder");
  refuses(in("new/"), "a folder");
  refuses("", "empty");
  EXPECT_EQ(entries(), 1U);
}

// A size limit is met in the middle of the writing: the program lives, the old file stands, nothing else is left.
TEST_F(WriteFile, AFailureHalfWayLeavesTheTargetAsItWas) {
  std::ofstream(in("kept")) << "old";
  const int code = in_child([&] {
    const rlimit limit{5000, 5000};
    ::setrlimit(RLIMIT_FSIZE, &limit);
    const auto written = write_file(in("kept"), std::string(100000, 'n'));
    if (written) return 1;
    if (written.error().problem != Problem::cannot_write) return 2;
    return written.error().finding == "the file would be larger than is allowed here" ? 0 : 3;
  });
  EXPECT_EQ(code, 0);
  EXPECT_EQ(contents(in("kept")), "old");
  EXPECT_EQ(entries(), 1U);
}

TEST_F(WriteFile, APipeNobodyReadsIsAnErrorAndNoEndOfTheProgram) {
  const int code = in_child([] {
    int ends[2];
    if (::pipe(ends) != 0) return 1;
    ::close(ends[0]);
    ::dup2(ends[1], STDOUT_FILENO);
    const auto written = write_file("-", "text");
    if (written) return 2;
    return written.error().place == "standard output" ? 0 : 3;
  });
  EXPECT_EQ(code, 0);
}

TEST_F(WriteFile, ADashIsStandardOutput) {
  const int code = in_child([&] {
    const int file = ::open(in("out").c_str(), O_WRONLY | O_CREAT, 0644);
    ::dup2(file, STDOUT_FILENO);
    return write_file("-", "text\n") ? 0 : 1;
  });
  EXPECT_EQ(code, 0);
  EXPECT_EQ(contents(in("out")), "text\n");
}

// Permissions mean nothing to root: the rest of the test then runs as somebody else.
TEST_F(WriteFile, AReadOnlyFolderOrFileIsLeftAlone) {
  std::ofstream(in("kept")) << "old";
  fs::permissions(folder_, fs::perms(0777));
  fs::permissions(in("kept"), fs::perms(0444));
  const auto as_user = [&](const std::string& path) {
    return in_child([&] {
      if (::geteuid() == 0 && (::setgid(65534) != 0 || ::setuid(65534) != 0)) return 10;
      const auto written = write_file(path, "new");
      if (written) return 1;
      return written.error().finding == "there is no permission to write here" ? 0 : 2;
    });
  };
  EXPECT_EQ(as_user(in("kept")), 0);
  fs::permissions(folder_, fs::perms(0555));
  EXPECT_EQ(as_user(in("another")), 0);
  EXPECT_EQ(contents(in("kept")), "old");
  EXPECT_EQ(entries(), 1U);
}

}  // namespace
}  // namespace coilassay
