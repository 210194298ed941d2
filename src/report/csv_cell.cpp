#include "report/csv_cell.hpp"

#include <fmt/format.h>

#include <cmath>
#include <string_view>

#include "report/text_table.hpp"

namespace ringwright::report {

std::string csv_number(double value) {
    return std::isfinite(value) ? fmt::format("{}", value) : "";
}

std::string csv_cell(const std::string& text) {
    std::string cell = valid_utf8(text);
    if (!cell.empty() && std::string_view("=+-@\t\r").find(cell.front()) != std::string_view::npos &&
        cell != "-")
        cell.insert(0, 1, '\'');
    if (cell.find_first_of(",\"\r\n") == std::string::npos) return cell;
    std::string quoted = "\"";
    for (const char character : cell) {
        if (character == '"') quoted += '"';
        quoted += character;
    }
    return quoted + '"';
}

}  // namespace ringwright::report
