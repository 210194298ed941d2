#include "recording/in_pieces.hpp"

#include <algorithm>
#include <atomic>
#include <cstring>

#include "recording/input_bytes.hpp"
#include "ringwright/each_index.hpp"

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

std::string bytes_present(std::string_view text, std::string_view sought, unsigned threads) {
    constexpr std::size_t piece = std::size_t{1} << 20;
    const std::size_t count = (text.size() + piece - 1) / piece;
    std::vector<std::atomic<bool>> seen(sought.size());
    for_each_index(count, threads, [&](std::size_t i, unsigned) {
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
