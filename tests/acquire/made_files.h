// Files made for one test, in a folder of their own.
#pragma once

#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <sstream>
#include <string>

#include "acquire/reader.h"
#include "gtest/gtest.h"

namespace coilassay::test {

inline std::string bytes_of(const std::string& path) {
  std::ostringstream bytes;
  bytes << std::ifstream(path, std::ios::binary).rdbuf();
  return bytes.str();
}

class MadeFiles : public testing::Test {
 protected:
  MadeFiles() {
    std::string pattern = (std::filesystem::temp_directory_path() / "coilassay-XXXXXX").string();
    if (::mkdtemp(pattern.data()) != nullptr) folder_ = pattern;
  }
  ~MadeFiles() override {
    std::error_code ignored;
    std::filesystem::remove_all(folder_, ignored);
  }

  std::string path(const std::string& name) const { return (folder_ / name).string(); }

  std::string made(const std::string& name, const std::string& bytes) const {
    std::ofstream(path(name), std::ios::binary) << bytes;
    return path(name);
  }

  static Result<std::vector<Capture>> captures(const std::string& path, const ReadOptions& options = {}) {
    auto recording = read_recording(path, options);
    if (!recording) return failure(recording);
    return std::get<std::vector<Capture>>(std::move(*recording));
  }

  /// The only capture of a file with these bytes.
  Capture capture_of(const std::string& bytes, const ReadOptions& options = {}) const {
    const auto list = captures(made("capture.csv", bytes), options);
    EXPECT_TRUE(list) << list.error().place << ": " << list.error().finding;
    if (!list) return {};
    EXPECT_EQ(list->size(), 1U);
    return list->front();
  }

  Error error_of(const std::string& bytes, const ReadOptions& options = {}) const {
    const auto list = captures(made("capture.csv", bytes), options);
    EXPECT_FALSE(list) << "was read, with " << (list ? list->front().samples() : 0) << " samples";
    if (list) return {};
    Error error = list.error();
    // The folder is of no interest.
    if (error.place.starts_with(folder_.string())) error.place.erase(0, folder_.string().size() + 1);
    return error;
  }

 private:
  std::filesystem::path folder_;
};

inline const Finding* found(const Capture& capture, std::string_view code) {
  for (const Finding& finding : capture.findings) {
    if (finding.code == code) return &finding;
  }
  return nullptr;
}

}  // namespace coilassay::test
