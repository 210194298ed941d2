#include "report/terminal_chart.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "report/text_table.hpp"

namespace ringwright::report {
namespace {

/// The stretch of values that is drawn, and the row of a value in it (0 at the top).
struct Scale {
    double low = 0.0, high = 1.0;
    std::size_t rows = 1;
    [[nodiscard]] std::size_t row_of(double value) const {
        const double share = (high - value) / (high - low);
        const double row = std::round(share * static_cast<double>(rows - 1));
        return static_cast<std::size_t>(std::clamp(row, 0.0, static_cast<double>(rows - 1)));
    }
};

Scale scale_of(const std::vector<double>& values, const std::vector<ChartLine>& lines, std::size_t rows) {
    std::vector<double> all = values;
    for (const ChartLine& line : lines) all.push_back(line.value);
    const auto [low, high] = std::ranges::minmax(all);
    const double margin = high > low ? 0.04 * (high - low) : std::max(1.0, std::abs(high)) * 0.5;
    return {low - margin, high + margin, rows};
}

std::string label_of(const ChartLine& line) {
    return fmt::format("{} {:.5g}", line.name, line.value);
}

std::string padded(const std::string& text, std::size_t width) {
    return std::string(width - std::min(width, display_width(text)), ' ') + text;
}

}  // namespace

std::string draw_run(const ChartPoints& points, const std::vector<ChartLine>& lines, std::size_t width,
                     std::size_t rows) {
    const std::size_t shown = std::min(width, points.values.size());
    const std::size_t first = points.values.size() - shown;
    const std::vector<double> values(points.values.end() - static_cast<std::ptrdiff_t>(shown),
                                     points.values.end());
    const Scale scale = scale_of(values, lines, rows);
    std::vector<std::vector<const char*>> picture(rows, std::vector<const char*>(shown, " "));
    std::vector<std::string> labels(rows);
    for (const ChartLine& line : lines) {
        std::ranges::fill(picture[scale.row_of(line.value)], "╌");
        labels[scale.row_of(line.value)] = label_of(line);
    }
    for (std::size_t i = 0; i < shown; ++i)
        picture[scale.row_of(values[i])][i] = points.marked[first + i] ? "◆" : "•";
    std::size_t label_width = 0;
    for (const std::string& label : labels) label_width = std::max(label_width, display_width(label));
    std::string text;
    for (std::size_t row = 0; row < rows; ++row) {
        text += fmt::format("  {} │", padded(labels[row], label_width));
        for (const char* mark : picture[row]) text += mark;
        text += "\n";
    }
    return text;
}

}  // namespace ringwright::report
