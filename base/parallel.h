// Work shared among a fixed number of threads; results never depend on how many.
#pragma once

#include <cstddef>
#include <functional>

namespace coilassay {

/// Calls work(i) for every i in [0, count), on at most `threads` threads, each index exactly once. The work must write
/// only to its own place. An exception is passed on after all threads have stopped.
void for_each_index(std::size_t count, unsigned threads, const std::function<void(std::size_t)>& work);

}  // namespace coilassay
