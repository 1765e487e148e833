#include "base/parallel.h"

#include <gtest/gtest.h>

#include <atomic>
#include <stdexcept>
#include <vector>

namespace coilassay {
namespace {

TEST(ForEachIndex, CallsEachIndexOnce) {
  for (const unsigned threads : {0U, 1U, 2U, 7U, 64U}) {
    for (const std::size_t count : {0U, 1U, 3U, 1000U}) {
      std::vector<int> calls(count, 0);
      for_each_index(count, threads, [&](std::size_t i) { ++calls[i]; });
      EXPECT_EQ(calls, std::vector<int>(count, 1)) << threads << " threads";
    }
  }
}

TEST(ForEachIndex, PassesAnExceptionOnWhenAllThreadsHaveStopped) {
  for (const unsigned threads : {1U, 4U}) {
    std::atomic<int> running{0};
    try {
      for_each_index(1000, threads, [&](std::size_t i) {
        ++running;
        if (i == 10) {
          --running;
          throw std::runtime_error("ten");
        }
        --running;
      });
      FAIL() << "no exception";
    } catch (const std::runtime_error& error) {
      EXPECT_STREQ(error.what(), "ten");
    }
    EXPECT_EQ(running, 0);
  }
}

}  // namespace
}  // namespace coilassay
