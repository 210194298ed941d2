#pragma once
// Work on the pieces of a long text by several threads.

#include <cstddef>
#include <functional>
#include <string>
#include <string_view>
#include <vector>

namespace ringwright {

/// Pieces of about `size` bytes that end behind an end of line, in order, together the whole text.
[[nodiscard]] std::vector<std::string_view> pieces_of(std::string_view text, std::size_t size,
                                                      char end_of_line);

/// Calls work(i, thread) once for each i in [0, count) on at most `threads` threads, the calling one being
/// thread 0 and getting the first index; indices are handed out in order. When a call throws, no more are
/// handed out, and the first exception is thrown again when all threads have ended.
void for_each_piece(std::size_t count, unsigned threads,
                    const std::function<void(std::size_t index, unsigned thread)>& work);

/// Those of the bytes `sought` that are in the text.
[[nodiscard]] std::string bytes_present(std::string_view text, std::string_view sought, unsigned threads);

}  // namespace ringwright
