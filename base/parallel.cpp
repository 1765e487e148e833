#include "base/parallel.h"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <system_error>
#include <thread>
#include <vector>

namespace coilassay {

void for_each_index(std::size_t count, unsigned threads, const std::function<void(std::size_t)>& work) {
  const std::size_t workers = std::min<std::size_t>(std::max(threads, 1U), count);
  if (workers <= 1) {
    for (std::size_t i = 0; i < count; ++i) work(i);
    return;
  }

  std::atomic<std::size_t> next{0};
  std::atomic<bool> failed{false};
  std::exception_ptr first_failure;
  std::mutex failure_lock;
  const auto take_indices = [&] {
    for (std::size_t i = next++; i < count && !failed; i = next++) {
      try {
        work(i);
      } catch (...) {
        const std::lock_guard guard(failure_lock);
        if (!first_failure) first_failure = std::current_exception();
        failed = true;
      }
    }
  };
  {
    std::vector<std::jthread> others;
    others.reserve(workers - 1);
    try {
      while (others.size() < workers - 1) others.emplace_back(take_indices);
    } catch (const std::system_error&) {
      // No more threads to be had: those that run, and this one, do all of the work.
    }
    take_indices();
  }
  if (first_failure) std::rethrow_exception(first_failure);
}

}  // namespace coilassay
