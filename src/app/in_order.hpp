#pragma once
// Work on several threads, answers in the order of the work.

#include <algorithm>
#include <chrono>
#include <condition_variable>
#include <cstddef>
#include <map>
#include <mutex>
#include <thread>
#include <vector>

#include "ringwright/each_index.hpp"

namespace ringwright::app {

/// How many threads, and how much may be done ahead of the answer that is waited for.
struct OrderedWork {
    std::size_t begin = 0, end = 0;
    unsigned jobs = 0;  ///< 0: as many as the machine has
    std::size_t most_bytes_ahead = std::size_t{64} << 20U;
};

/// Calls work(i) for i in [begin, end) on the threads, and deliver(i, answer) on this one, in order, as soon
/// as each and all before it are there; waiting() on this thread about ten times a second meanwhile. An
/// Answer tells its size by `bytes()`; no new work begins while more than `most_bytes_ahead` wait to be
/// delivered, so that memory stays bounded however many there are. What deliver or waiting throws stops the
/// rest and is thrown on; work must not throw.
template <typename Answer, typename Work, typename Deliver, typename Waiting>
void in_order(const OrderedWork& plan, Work work, Deliver deliver, Waiting waiting) {
    std::map<std::size_t, Answer> held;
    std::size_t held_bytes = 0, next = plan.begin;
    std::mutex mutex;
    std::condition_variable arrived, taken;
    const auto labour = [&] {
        std::unique_lock lock(mutex);
        for (;;) {
            // Work is begun in order, so the answer that is waited for is always being worked on.
            taken.wait(lock, [&] { return next >= plan.end || held_bytes <= plan.most_bytes_ahead; });
            if (next >= plan.end) return;
            const std::size_t i = next++;
            lock.unlock();
            Answer answer = work(i);
            lock.lock();
            held_bytes += answer.bytes();
            held.emplace(i, std::move(answer));
            arrived.notify_one();
        }
    };
    const std::size_t count = plan.end - plan.begin;
    std::vector<std::jthread> pool;
    for (std::size_t t = 0; t < std::min<std::size_t>(threads_for(plan.jobs), count); ++t)
        pool.emplace_back(labour);
    try {
        for (std::size_t i = plan.begin; i < plan.end; ++i) {
            std::unique_lock lock(mutex);
            const auto ready = [&] { return held.contains(i); };
            while (!arrived.wait_for(lock, std::chrono::milliseconds(100), ready)) {
                lock.unlock();
                waiting();
                lock.lock();
            }
            const Answer answer = std::move(held.extract(i).mapped());
            held_bytes -= answer.bytes();
            lock.unlock();
            taken.notify_all();
            deliver(i, answer);
        }
    } catch (...) {
        {
            const std::lock_guard lock(mutex);
            next = plan.end;
        }
        taken.notify_all();
        throw;
    }
}

}  // namespace ringwright::app
