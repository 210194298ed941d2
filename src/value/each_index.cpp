#include "ringwright/each_index.hpp"

#include <algorithm>
#include <atomic>
#include <exception>
#include <mutex>
#include <thread>
#include <vector>

namespace ringwright {

unsigned threads_for(unsigned jobs) {
    return jobs == 0 ? std::max(1U, std::thread::hardware_concurrency()) : jobs;
}

void for_each_index(std::size_t count, unsigned threads,
                    const std::function<void(std::size_t, unsigned)>& work) {
    std::atomic<std::size_t> next{1};
    std::mutex guard;
    std::exception_ptr failure;
    const auto run = [&](unsigned thread) {
        try {
            for (std::size_t i = thread == 0 ? 0 : next++; i < count; i = next++) work(i, thread);
        } catch (...) {
            next = count;
            const std::scoped_lock lock(guard);
            if (!failure) failure = std::current_exception();
        }
    };
    std::vector<std::jthread> workers;
    for (unsigned i = 1; i < std::min<std::size_t>(threads, count); ++i) workers.emplace_back(run, i);
    run(0);
    workers.clear();
    if (failure) std::rethrow_exception(failure);
}

}  // namespace ringwright
