// Another PATH for the length of a test.
#pragma once

#include <cstdlib>
#include <string>

namespace coilassay::test {

class PathSetting {
 public:
  explicit PathSetting(const std::string& path) {
    const char* now = ::getenv("PATH");
    before_ = now != nullptr ? now : "";
    ::setenv("PATH", path.c_str(), 1);
  }
  ~PathSetting() { ::setenv("PATH", before_.c_str(), 1); }
  PathSetting(const PathSetting&) = delete;
  PathSetting& operator=(const PathSetting&) = delete;

 private:
  std::string before_;
};

}  // namespace coilassay::test
