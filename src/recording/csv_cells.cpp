#include "recording/csv_cells.hpp"

#include <fast_float/fast_float.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstring>

namespace ringwright {
namespace {

bool is_blank(char c) {
    return c == ' ' || c == '\t';
}
bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

std::optional<double> plain_number(const char* first, const char* last, char decimal) {
    double value = 0.0;
    const fast_float::parse_options options{fast_float::chars_format::general, decimal};
    const auto result = fast_float::from_chars_advanced(first, last, value, options);
    if (result.ec != std::errc() || result.ptr != last || !std::isfinite(value)) return std::nullopt;
    return value;
}

// "1,234,567.8" with the grouping marks taken out, where they stand before each third digit. No group of
// thousands begins with a zero: "0,013" is a decimal.
std::optional<double> grouped_number(std::string_view cell, const Dialect& dialect) {
    std::array<char, 64> digits{};
    std::size_t used = 0, since_mark = 0;
    bool marked = false, whole = true;
    const std::size_t lead = cell.find_first_not_of("+-");
    if (lead == std::string_view::npos || cell[lead] == '0') return std::nullopt;
    for (const char c : cell) {
        if (used == digits.size()) return std::nullopt;
        if (whole && c == dialect.grouping) {
            if (marked ? since_mark != 3 : (since_mark < 1 || since_mark > 3)) return std::nullopt;
            marked = true;
            since_mark = 0;
            continue;
        }
        if (is_digit(c) && whole) ++since_mark;
        if (!is_digit(c) && c != '-' && c != '+') {
            if (marked && whole && since_mark != 3) return std::nullopt;
            whole = false;
        }
        digits[used++] = c;
    }
    if (!marked || (whole && since_mark != 3)) return std::nullopt;
    return plain_number(digits.data(), digits.data() + used, dialect.decimal);
}

// Without signs and blanks, in lower case, for comparison with the marks; empty when too long for a mark.
std::string_view plain_mark(std::string_view cell, std::array<char, 24>& buffer) {
    while (!cell.empty() && (cell.front() == '+' || cell.front() == '-' || cell.front() == ' '))
        cell.remove_prefix(1);
    if (cell.size() > buffer.size()) return {};
    std::transform(cell.begin(), cell.end(), buffer.begin(),
                   [](char c) { return c >= 'A' && c <= 'Z' ? static_cast<char>(c + 32) : c; });
    return {buffer.data(), cell.size()};
}

bool only_of(std::string_view text, std::string_view signs) {
    return text.find_first_not_of(signs) == std::string_view::npos;
}

// A scanner over the digits and signs of a date or a time.
struct Scanner {
    std::string_view rest;

    std::optional<int> digits(std::size_t at_least, std::size_t at_most) {
        std::size_t count = 0;
        int value = 0;
        while (count < rest.size() && count < at_most && is_digit(rest[count]))
            value = 10 * value + (rest[count++] - '0');
        if (count < at_least) return std::nullopt;
        rest.remove_prefix(count);
        return value;
    }
    bool take(char sign) {
        if (rest.empty() || rest.front() != sign) return false;
        rest.remove_prefix(1);
        return true;
    }
    char take_any(std::string_view signs) {
        if (rest.empty() || signs.find(rest.front()) == std::string_view::npos) return '\0';
        const char sign = rest.front();
        rest.remove_prefix(1);
        return sign;
    }
};

// Days from 1970-01-01 in the Gregorian calendar, by counting leap days.
std::int64_t days_since_1970(int year, int month, int day) {
    static constexpr std::array<int, 12> before = {0, 31, 59, 90, 120, 151, 181, 212, 243, 273, 304, 334};
    const bool leap = (year % 4 == 0 && year % 100 != 0) || year % 400 == 0;
    const std::int64_t past = year - 1;
    const std::int64_t days = past * 365 + past / 4 - past / 100 + past / 400;
    constexpr std::int64_t days_to_1970 = 719162;
    return days - days_to_1970 + before[static_cast<std::size_t>(month - 1)] + (leap && month > 2 ? 1 : 0) +
           day - 1;
}

// Differences of nanoseconds between these years fit in 64 bits; no recorder is older or newer.
bool valid_date(int year, int month, int day) {
    return year >= 1900 && year <= 2100 && month >= 1 && month <= 12 && day >= 1 && day <= 31;
}

constexpr std::int64_t second_ns = 1'000'000'000;

struct Date {
    std::int64_t days = 0;
    bool open = false;
};

// 2031-04-02, 2031/04/02, 02.04.2031, 4/2/2031
std::optional<Date> take_date(Scanner& scanner) {
    Scanner probe = scanner;
    const std::size_t before = probe.rest.size();
    const auto first = probe.digits(1, 4);
    if (!first) return std::nullopt;
    const bool year_first = before - probe.rest.size() == 4;
    const char sign = probe.take_any("-/.");
    if (sign == '\0') return std::nullopt;
    const auto second = probe.digits(1, 2);
    if (!second || !probe.take(sign)) return std::nullopt;
    const auto third = probe.digits(year_first ? 1 : 4, year_first ? 2 : 4);
    if (!third) return std::nullopt;
    int year = year_first ? *first : *third, month = *second, day = year_first ? *third : *first;
    bool open = false;
    if (!year_first && sign == '/') {  // month first unless that cannot be
        open = *first <= 12 && *second <= 12;
        if (*first <= 12) std::swap(month, day);
    }
    if (!valid_date(year, month, day)) return std::nullopt;
    scanner = probe;
    return Date{days_since_1970(year, month, day), open};
}

std::int64_t take_fraction(Scanner& scanner, int& decimals) {
    std::int64_t value = 0, scale = second_ns;
    decimals = 0;
    while (!scanner.rest.empty() && is_digit(scanner.rest.front()) && decimals < 18) {
        if (scale >= 10) {
            scale /= 10;
            value += (scanner.rest.front() - '0') * scale;
        }
        scanner.rest.remove_prefix(1);
        ++decimals;
    }
    return value;
}

// 10:15:30.250, 10:15:30:250, 10:15, 15:30.250 (minutes and seconds, told by the decimal mark)
std::optional<std::int64_t> take_time(Scanner& scanner, int& decimals) {
    Scanner probe = scanner;
    const auto first = probe.digits(1, 3);
    if (!first || !probe.take(':')) return std::nullopt;
    const auto second = probe.digits(2, 2);
    if (!second || *second > 59) return std::nullopt;
    std::optional<int> third;
    if (probe.take(':')) {
        third = probe.digits(2, 2);
        if (!third || *third > 60) return std::nullopt;
    }
    const bool fraction = probe.take_any(third ? ".,:" : ".,") != '\0';
    const std::int64_t nanoseconds = fraction ? take_fraction(probe, decimals) : 0;
    if (fraction && decimals == 0) return std::nullopt;
    scanner = probe;
    const bool minutes_first = !third && fraction;
    const std::int64_t seconds =
        minutes_first ? *first * 60 + *second : *first * 3600 + *second * 60 + third.value_or(0);
    return seconds * second_ns + nanoseconds;
}

// "Z", "+02:00", "+0200", "-05"; nanoseconds to subtract. Nothing when what follows is something else.
std::optional<std::int64_t> take_zone(Scanner& scanner) {
    if (scanner.rest.empty() || scanner.take('Z')) return 0;
    const char sign = scanner.take_any("+-");
    if (sign == '\0') return std::nullopt;
    const auto hours = scanner.digits(2, 2);
    if (!hours) return std::nullopt;
    scanner.take(':');
    const int minutes = scanner.digits(2, 2).value_or(0);
    const std::int64_t offset = (*hours * 3600 + minutes * 60) * second_ns;
    return sign == '+' ? offset : -offset;
}

// " AM", " PM"
std::int64_t take_half_day(Scanner& scanner, std::int64_t time) {
    std::string_view rest = trimmed_cell(scanner.rest);
    constexpr std::int64_t half = 12 * 3600 * second_ns;
    if (rest == "AM" || rest == "am") {
        scanner.rest = {};
        return time >= half ? time - half : time;
    }
    if (rest == "PM" || rest == "pm") {
        scanner.rest = {};
        return time < half ? time + half : time;
    }
    return time;
}

}  // namespace

std::string_view trimmed_cell(std::string_view cell) {
    while (!cell.empty() && (is_blank(cell.front()) || cell.front() == '\r')) cell.remove_prefix(1);
    while (!cell.empty() && (is_blank(cell.back()) || cell.back() == '\r')) cell.remove_suffix(1);
    return cell;
}

namespace {

std::string_view unquoted(std::string_view cell) {
    cell = trimmed_cell(cell);
    if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"')
        return trimmed_cell(cell.substr(1, cell.size() - 2));
    return cell;
}

// The end of the cell that begins at `at`: the next delimiter outside quotes.
std::size_t cell_end(std::string_view line, std::size_t at, char delimiter) {
    std::size_t start = at;
    while (start < line.size() && is_blank(line[start]) && line[start] != delimiter) ++start;
    if (start < line.size() && line[start] == '"') {
        const std::size_t close = line.find('"', start + 1);
        if (close != std::string_view::npos) return std::min(line.find(delimiter, close), line.size());
    }
    return std::min(line.find(delimiter, at), line.size());
}

void split_on_blanks(std::string_view line, std::vector<std::string_view>& cells) {
    std::size_t at = 0;
    for (;;) {
        while (at < line.size() && (is_blank(line[at]) || line[at] == '\r')) ++at;
        if (at == line.size()) return;
        std::size_t end = at;
        if (line[at] == '"' && line.find('"', at + 1) != std::string_view::npos)
            end = line.find('"', at + 1) + 1;
        while (end < line.size() && !is_blank(line[end])) ++end;
        cells.push_back(unquoted(line.substr(at, end - at)));
        at = end;
    }
}

}  // namespace

void split_cells(std::string_view line, char delimiter, std::vector<std::string_view>& cells) {
    cells.clear();
    if (delimiter == ' ') return split_on_blanks(line, cells);
    for (std::size_t at = 0;;) {
        const std::size_t end = cell_end(line, at, delimiter);
        cells.push_back(unquoted(line.substr(at, end - at)));
        if (end == line.size()) return;
        at = end + 1;
    }
}

std::optional<double> number_in_cell(std::string_view cell, const Dialect& dialect) {
    if (cell.empty()) return std::nullopt;
    if (cell.front() == '+') cell.remove_prefix(1);
    if (cell.starts_with("\xE2\x88\x92")) {  // U+2212, the minus sign of typesetters
        const auto value = number_in_cell(cell.substr(3), dialect);
        return value ? std::optional<double>(-*value) : std::nullopt;
    }
    if (const auto value = plain_number(cell.data(), cell.data() + cell.size(), dialect.decimal))
        return value;
    if (dialect.grouping == '\0') return std::nullopt;
    return grouped_number(cell, dialect);
}

Absence absence_of(std::string_view cell) {
    if (cell.empty()) return Absence::empty;
    std::array<char, 24> buffer{};
    const std::string_view mark = plain_mark(cell, buffer);
    static constexpr std::array<std::string_view, 16> absent = {
        "nan",     "na",      "n/a",    "#n/a",   "null",    "none",     "nil",       "missing",
        "invalid", "1.#qnan", "1.#ind", "1.#nan", "#value!", "nan(ind)", "nan(snan)", "open"};
    static constexpr std::array<std::string_view, 19> overflow = {
        "over",     "ol",       "o.l",      "o.l.",      "ovl",         "ovf",       "ovfl",
        "ovrflw",   "overflow", "overload", "overrange", "under",       "underflow", "inf",
        "infinity", "1.#inf",   "#div/0!",  "#num!",     "\xE2\x88\x9E"};
    if (mark.empty()) return cell.size() <= 24 ? Absence::not_a_number : Absence::text;  // only signs: "--"
    if (std::find(absent.begin(), absent.end(), mark) != absent.end()) return Absence::not_a_number;
    if (std::find(overflow.begin(), overflow.end(), mark) != overflow.end()) return Absence::overflow;
    if (only_of(mark, "#") || only_of(mark, "*")) return Absence::overflow;
    if (only_of(mark, "-. ") || mark == "?") return Absence::not_a_number;
    return Absence::text;
}

std::optional<ClockStamp> stamp_in_cell(std::string_view cell) {
    cell = trimmed_cell(cell);
    if (cell.size() < 4 || cell.size() > 48 || !is_digit(cell.front())) return std::nullopt;
    Scanner scanner{cell};
    ClockStamp stamp;
    if (const auto date = take_date(scanner)) {
        stamp.has_date = true;
        stamp.day_month_open = date->open;
        stamp.nanoseconds = date->days * 86400 * second_ns;
        if (scanner.rest.empty()) return stamp;
        if (scanner.take_any("T t_") == '\0') return std::nullopt;
        scanner.rest = trimmed_cell(scanner.rest);
    }
    const auto time = take_time(scanner, stamp.decimals);
    if (!time) return std::nullopt;
    stamp.has_time = true;
    const std::int64_t of_day = take_half_day(scanner, *time);
    scanner.rest = trimmed_cell(scanner.rest);
    const auto zone = take_zone(scanner);
    if (!zone || !scanner.rest.empty()) return std::nullopt;
    stamp.nanoseconds += of_day - *zone;
    return stamp;
}

int decimals_in_cell(std::string_view cell, char decimal) {
    int decimals = 0, exponent = 0;
    bool after = false;
    for (std::size_t i = 0; i < cell.size(); ++i) {
        if (is_digit(cell[i]) && after) ++decimals;
        if (cell[i] == decimal) after = true;
        if (cell[i] != 'e' && cell[i] != 'E') continue;
        bool minus = false;
        for (std::size_t j = i + 1; j < cell.size() && j < i + 6; ++j) {
            minus = minus || cell[j] == '-';
            if (is_digit(cell[j])) exponent = 10 * exponent + (cell[j] - '0');
        }
        if (minus) exponent = -exponent;
        break;
    }
    return std::clamp(decimals - exponent, -18, 30);
}

}  // namespace ringwright
