#include "recording/in_pieces.hpp"

#include <algorithm>
#include <atomic>
#include <cstring>
#include <exception>
#include <mutex>
#include <thread>

#include "recording/input_bytes.hpp"

namespace ringwright {

std::vector<std::string_view> pieces_of(std::string_view text, std::size_t size, char end_of_line) {
    std::vector<std::string_view> pieces;
    while (!text.empty()) {
        std::size_t end = text.size();
        if (size < text.size()) {
            const std::size_t line_end = text.find(end_of_line, size);
            if (line_end != std::string_view::npos) end = line_end + 1;
        }
        pieces.push_back(text.substr(0, end));
        text.remove_prefix(end);
    }
    return pieces;
}

void for_each_piece(std::size_t count, unsigned threads,
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

std::string bytes_present(std::string_view text, std::string_view sought, unsigned threads) {
    constexpr std::size_t piece = std::size_t{1} << 20;
    const std::size_t count = (text.size() + piece - 1) / piece;
    std::vector<std::atomic<bool>> seen(sought.size());
    for_each_piece(count, threads, [&](std::size_t i, unsigned) {
        const std::string_view part = text.substr(i * piece, piece);
        will_read(part);
        for (std::size_t k = 0; k < sought.size(); ++k)
            if (!seen[k] && std::memchr(part.data(), sought[k], part.size()) != nullptr) seen[k] = true;
        was_read(part);
    });
    std::string present;
    for (std::size_t k = 0; k < sought.size(); ++k)
        if (seen[k]) present += sought[k];
    return present;
}

}  // namespace ringwright
