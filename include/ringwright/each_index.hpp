#pragma once
#include <cstddef>
#include <functional>

namespace ringwright {

/// Threads that `jobs` stands for: 0 is as many as the machine has.
[[nodiscard]] unsigned threads_for(unsigned jobs);

/// Calls work(i, thread) once for each i in [0, count) on at most `threads` threads, the calling one being
/// thread 0 and getting the first index; indices are handed out in order. When a call throws, no more are
/// handed out, and the first exception is thrown again when all threads have ended.
void for_each_index(std::size_t count, unsigned threads,
                    const std::function<void(std::size_t index, unsigned thread)>& work);

}  // namespace ringwright
