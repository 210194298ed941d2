#pragma once
// Work on the pieces of a long text by several threads.

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace ringwright {

/// Pieces of about `size` bytes that end behind an end of line, in order, together the whole text.
[[nodiscard]] std::vector<std::string_view> pieces_of(std::string_view text, std::size_t size,
                                                      char end_of_line);

/// Those of the bytes `sought` that are in the text.
[[nodiscard]] std::string bytes_present(std::string_view text, std::string_view sought, unsigned threads);

}  // namespace ringwright
