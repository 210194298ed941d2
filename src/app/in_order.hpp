#pragma once
// Work on several threads, answers in the order of the work.

#include <algorithm>
#include <atomic>
#include <condition_variable>
#include <cstddef>
#include <exception>
#include <mutex>
#include <optional>
#include <thread>
#include <vector>

namespace ringwright::app {

/// Calls work(0) … work(count − 1) on `jobs` threads (0: as many as the machine has) and deliver(i, answer)
/// on this thread, in order, as soon as each and all before it are there. What deliver throws stops the rest
/// and is thrown on; work must not throw.
template <typename Answer, typename Work, typename Deliver>
void in_order(std::size_t count, unsigned jobs, Work work, Deliver deliver) {
    std::vector<std::optional<Answer>> answers(count);
    std::mutex mutex;
    std::condition_variable arrived;
    std::atomic<std::size_t> next{0};
    const unsigned hardware = std::max(1U, std::thread::hardware_concurrency());
    const std::size_t threads = std::min<std::size_t>(jobs == 0 ? hardware : jobs, count);
    std::vector<std::jthread> pool;
    for (std::size_t t = 0; t < threads; ++t)
        pool.emplace_back([&] {
            for (std::size_t i = next++; i < count; i = next++) {
                Answer answer = work(i);
                const std::lock_guard lock(mutex);
                answers[i] = std::move(answer);
                arrived.notify_one();
            }
        });
    try {
        for (std::size_t i = 0; i < count; ++i) {
            std::unique_lock lock(mutex);
            arrived.wait(lock, [&] { return answers[i].has_value(); });
            const Answer answer = std::move(*answers[i]);
            lock.unlock();
            deliver(i, answer);
        }
    } catch (...) {
        next = count;
        throw;
    }
}

}  // namespace ringwright::app
