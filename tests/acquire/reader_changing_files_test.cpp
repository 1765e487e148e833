// Files that grow, shrink or vanish while they are read: what was there is read or the loss is said, and nothing crashes.
#include <fmt/format.h>
#include <gtest/gtest.h>

#include <filesystem>
#include <functional>

#include "tests/acquire/made_files.h"

namespace coilassay {
namespace {

using test::MadeFiles;

class ChangingFiles : public MadeFiles {};

/// Does something to the file when the reading has come so far.
class Meddler final : public Progress {
 public:
  explicit Meddler(std::function<void()> meddle) : meddle_(std::move(meddle)) {}
  bool advance(std::string_view, std::uint64_t, std::uint64_t) override {
    if (++calls_ == 2) meddle_();
    return true;
  }

 private:
  std::function<void()> meddle_;
  int calls_ = 0;
};

std::string table(int rows) {
  std::string text = "time (s),CH1 (V)\n";
  for (int i = 0; i < rows; ++i) text += fmt::format("{:.7e},{:.4f}\n", i * 1e-7, 0.0001 * (i % 8192));
  return text;
}

constexpr int kRows = 800000;  // some 16 MB: far more than is read ahead

Result<std::vector<Capture>> read_while(const std::string& path, const std::function<void()>& meddle) {
  Meddler meddler(meddle);
  ReadOptions options;
  options.progress = &meddler;
  auto recording = read_recording(path, options);
  if (!recording) return failure(recording);
  return std::get<std::vector<Capture>>(std::move(*recording));
}

TEST_F(ChangingFiles, AFileThatGrowsIsReadToItsEnd) {
  const std::string path = made("grows.csv", table(kRows));
  const auto list = read_while(path, [&] {
    std::ofstream(path, std::ios::app) << fmt::format("{:.7e},0.5\n", kRows * 1e-7);
  });
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_EQ(list->front().samples(), std::size_t{kRows} + 1);
}

TEST_F(ChangingFiles, AFileCutShortIsReadToWhereItEndsOrRefused) {
  const std::string path = made("shrinks.csv", table(kRows));
  const auto list = read_while(path, [&] { std::filesystem::resize_file(path, 12'000'003); });
  if (list) {
    EXPECT_LT(list->front().samples(), std::size_t{kRows});
  } else {
    EXPECT_EQ(list.error().problem, Problem::damaged);
    EXPECT_NE(list.error().place.find("shrinks.csv:"), std::string::npos);
  }
}

TEST_F(ChangingFiles, AFileThatVanishesIsReadFromItsOpenHandle) {
  const std::string path = made("vanishes.csv", table(kRows));
  const auto list = read_while(path, [&] { std::filesystem::remove(path); });
  ASSERT_TRUE(list) << list.error().finding;
  EXPECT_EQ(list->front().samples(), std::size_t{kRows});
}

TEST_F(ChangingFiles, AFileOverwrittenWithOtherRowsIsNeverMixedSilently) {
  const std::string path = made("overwritten.csv", table(kRows));
  const auto list = read_while(path, [&] {
    std::fstream file(path, std::ios::in | std::ios::out | std::ios::binary);
    file.seekp(static_cast<std::streamoff>(std::filesystem::file_size(path)) - 500'000);  // beyond what was read ahead
    file << "\nrubbish, not a row\n";
  });
  EXPECT_FALSE(list);
}

}  // namespace
}  // namespace coilassay
