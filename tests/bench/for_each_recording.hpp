#pragma once
// Every recording of a study, on all processors.

#include <algorithm>
#include <atomic>
#include <thread>
#include <vector>

namespace simulated {

/// Calls `one` with every number below `recordings`, from several threads at once.
template <typename Work>
void for_each_recording(int recordings, const Work& one) {
    std::atomic<int> next{0};
    const auto work = [&] {
        for (int i = next++; i < recordings; i = next++) one(i);
    };
    std::vector<std::thread> threads;
    for (unsigned i = 1; i < std::max(1u, std::thread::hardware_concurrency()); ++i)
        threads.emplace_back(work);
    work();
    for (std::thread& thread : threads) thread.join();
}

}  // namespace simulated
