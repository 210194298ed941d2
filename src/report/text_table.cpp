#include "report/text_table.hpp"

#include <algorithm>
#include <array>
#include <cstdint>

#include "ringwright/units.hpp"

namespace ringwright::report {
namespace {

/// One character of UTF-8; `length` 0 where the bytes are no UTF-8.
struct Character {
    std::uint32_t code = 0;
    std::size_t length = 0;
};

std::size_t length_from_lead(unsigned char lead) {
    if (lead < 0x80) return 1;
    if (lead >= 0xC2 && lead < 0xE0) return 2;
    if (lead >= 0xE0 && lead < 0xF0) return 3;
    if (lead >= 0xF0 && lead < 0xF5) return 4;
    return 0;
}

Character next_character(std::string_view text) {
    const auto lead = static_cast<unsigned char>(text.front());
    const std::size_t length = length_from_lead(lead);
    if (length == 0 || length > text.size()) return {};
    static constexpr std::array<unsigned char, 5> lead_mask{0, 0x7F, 0x1F, 0x0F, 0x07};
    std::uint32_t code = lead & lead_mask[length];
    for (std::size_t i = 1; i < length; ++i) {
        const auto byte = static_cast<unsigned char>(text[i]);
        if ((byte & 0xC0U) != 0x80U) return {};
        code = (code << 6U) | (byte & 0x3FU);
    }
    static constexpr std::array<std::uint32_t, 5> least{0, 0, 0x80, 0x800, 0x10000};
    const bool surrogate = code >= 0xD800 && code < 0xE000;
    if (code < least[length] || code > 0x10FFFF || surrogate) return {};
    return {code, length};
}

struct CodeRange {
    std::uint32_t first, last;
};

template <std::size_t Size>
bool within(std::uint32_t code, const std::array<CodeRange, Size>& ranges) {
    return std::ranges::any_of(ranges,
                               [code](CodeRange range) { return code >= range.first && code <= range.last; });
}

/// Unicode Standard Annex 11, the wide blocks that a file or channel name may hold.
std::size_t width_of(std::uint32_t code) {
    static constexpr std::array<CodeRange, 3> none{{{0x300, 0x36F}, {0x200B, 0x200F}, {0xFE00, 0xFE0F}}};
    static constexpr std::array<CodeRange, 8> wide{{{0x1100, 0x115F},
                                                    {0x2E80, 0xA4CF},
                                                    {0xAC00, 0xD7A3},
                                                    {0xF900, 0xFAFF},
                                                    {0xFE30, 0xFE6F},
                                                    {0xFF00, 0xFF60},
                                                    {0xFFE0, 0xFFE6},
                                                    {0x1F300, 0x1FAFF}}};
    if (within(code, none)) return 0;
    return within(code, wide) ? 2 : 1;
}

bool is_control(std::uint32_t code) {
    return code < 0x20 || (code >= 0x7F && code < 0xA0) || (code >= 0x202A && code <= 0x202E);
}

std::vector<std::size_t> column_widths(const TextTable& table) {
    std::vector<std::size_t> widths;
    std::size_t columns = 0;
    for (const auto& row : table.rows) columns = std::max(columns, row.size());
    widths.resize(columns);
    for (const auto& row : table.rows)
        for (std::size_t i = 0; i < row.size(); ++i)
            // The last cell of a short row runs on over the columns that it leaves empty.
            if (row.size() == columns || i + 1 < row.size())
                widths[i] = std::max(widths[i], display_width(row[i]));
    return widths;
}

void trim_end(std::string& line) {
    line.erase(line.find_last_not_of(' ') + 1);
}

std::string row_text(const TextTable& table, const std::vector<std::string>& row,
                     const std::vector<std::size_t>& widths, std::size_t indent) {
    std::string line(indent, ' ');
    for (std::size_t i = 0; i < row.size(); ++i) {
        const std::size_t width = display_width(row[i]);
        const std::string pad(widths[i] > width ? widths[i] - width : 0, ' ');
        const bool right = i < table.alignment.size() && table.alignment[i] == Align::right;
        const bool spans = i + 1 == row.size() && row.size() < widths.size();
        line += spans ? row[i] : right ? pad + row[i] : row[i] + pad;
        line += "  ";
    }
    trim_end(line);
    return line + "\n";
}

}  // namespace

std::string valid_utf8(std::string_view text) {
    std::string valid;
    while (!text.empty()) {
        const std::size_t length = next_character(text).length;
        if (length == 0)
            valid += "\xEF\xBF\xBD";
        else
            valid += text.substr(0, length);
        text.remove_prefix(std::max<std::size_t>(length, 1));
    }
    return valid;
}

std::size_t display_width(std::string_view text) {
    std::size_t width = 0;
    while (!text.empty()) {
        const Character character = next_character(text);
        width += character.length == 0 ? 1 : width_of(character.code);
        text.remove_prefix(std::max<std::size_t>(character.length, 1));
    }
    return width;
}

std::string printable(std::string_view text) {
    std::string shown;
    while (!text.empty()) {
        const Character character = next_character(text);
        const std::size_t length = std::max<std::size_t>(character.length, 1);
        if (character.length == 0 || is_control(character.code))
            shown += '?';
        else
            shown += text.substr(0, length);
        text.remove_prefix(length);
    }
    return shown;
}

std::string to_text(const TextTable& table, std::size_t indent) {
    const std::vector<std::size_t> widths = column_widths(table);
    std::string text;
    for (std::size_t i = 0; i < table.rows.size(); ++i) {
        text += row_text(table, table.rows[i], widths, indent);
        if (i > 0 || !table.header) continue;
        std::string rule(indent, ' ');
        for (const std::size_t width : widths) {
            for (std::size_t k = 0; k < width; ++k) rule += "─";
            rule += "  ";
        }
        trim_end(rule);
        text += rule + "\n";
    }
    return text;
}

namespace {

/// "95", "±0.4", "(3.2": what a unit may follow.
bool is_number(std::string_view word) {
    if (word.starts_with('(')) word.remove_prefix(1);
    if (word.ends_with(')')) word.remove_suffix(1);
    return word.find_first_of("0123456789") != std::string_view::npos &&
           word.find_first_not_of("0123456789.,+-±e–") == std::string_view::npos && word.back() != ',' &&
           word.back() != '.';
}

/// The length of the words at the front of `sentence` that stay on one line: a number, what it is ± of, and
/// its unit.
std::size_t unbroken_length(std::string_view sentence) {
    std::size_t end = std::min(sentence.find(' '), sentence.size());
    std::string_view word = sentence.substr(0, end);
    while (end < sentence.size()) {
        const std::size_t next_end = std::min(sentence.find(' ', end + 1), sentence.size());
        const std::string_view next = sentence.substr(end + 1, next_end - end - 1);
        std::string_view unit = next;
        while (!unit.empty() && std::string_view(".,;:)]").find(unit.back()) != std::string_view::npos)
            unit.remove_suffix(1);
        const bool relation =
            word == "±" || word == "=" || word == "<" || next == "±" || next == "=" || next == "<";
        if (!relation && !(is_number(word) && !unit.empty() && find_unit(unit))) break;
        word = next;
        end = next_end;
    }
    return end;
}

}  // namespace

std::string wrapped(std::string_view lead, std::string_view sentence, std::size_t width) {
    const std::size_t margin = display_width(lead);
    std::string text(lead);
    std::size_t column = margin;
    bool first_word = true;
    while (!sentence.empty()) {
        const std::size_t blank = unbroken_length(sentence);
        const std::string_view word = sentence.substr(0, blank);
        sentence.remove_prefix(std::min(blank + 1, sentence.size()));
        const std::size_t word_width = display_width(word);
        if (!first_word && column + 1 + word_width > width) {
            text += '\n';
            text.append(margin, ' ');
            column = margin;
            first_word = true;
        }
        if (!first_word) text += ' ', ++column;
        text += word;
        column += word_width;
        first_word = false;
    }
    return text + "\n";
}

}  // namespace ringwright::report
