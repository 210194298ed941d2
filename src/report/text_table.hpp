#pragma once
// Text for a terminal: columns that line up whatever the characters, wrapped sentences, no control
// characters.

#include <cstddef>
#include <string>
#include <string_view>
#include <vector>

namespace ringwright::report {

/// The text with U+FFFD in place of each byte that is no UTF-8.
[[nodiscard]] std::string valid_utf8(std::string_view text);

/// Columns that the UTF-8 text takes on a terminal: combining marks none, East Asian wide characters and
/// emoji two.
[[nodiscard]] std::size_t display_width(std::string_view text);

/// The text with control characters and broken UTF-8 shown as "?", so that a file name cannot steer the
/// terminal.
[[nodiscard]] std::string printable(std::string_view text);

enum class Align { left, right };

/// Rows of cells; the last cell of a row may be left out, and a row shorter than the others spans what is
/// left.
struct TextTable {
    std::vector<Align> alignment;
    std::vector<std::vector<std::string>> rows;
    bool header = true;  ///< a rule under the first row
};
/// Each line begins with `indent` blanks and ends without blanks, with a line feed.
[[nodiscard]] std::string to_text(const TextTable& table, std::size_t indent);

/// Breaks the sentence at blanks so that no line exceeds `width` columns; the first line begins with `lead`,
/// the others with as many blanks.
[[nodiscard]] std::string wrapped(std::string_view lead, std::string_view sentence, std::size_t width = 100);

}  // namespace ringwright::report
