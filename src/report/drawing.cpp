// The recording in braille dots: an envelope for each column of dots.

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <limits>

#include "report/text_table.hpp"
#include "ringwright/inspection.hpp"

namespace ringwright {
namespace {

struct Extremes {
    double low = 0.0;
    double high = 0.0;
};

Extremes extremes_of(const std::vector<double>& samples) {
    Extremes extremes{INFINITY, -INFINITY};
    for (const double sample : samples) {
        if (!std::isfinite(sample)) continue;
        extremes.low = std::min(extremes.low, sample);
        extremes.high = std::max(extremes.high, sample);
    }
    if (!(extremes.low <= extremes.high)) return {-1.0, 1.0};
    // A constant gets a band to lie in.
    if (extremes.low == extremes.high) {
        constexpr double most = std::numeric_limits<double>::max();
        const double room = extremes.low == 0.0 ? 1.0 : 0.1 * std::abs(extremes.low);
        return {std::max(extremes.low - room, -most), std::min(extremes.high + room, most)};
    }
    return extremes;
}

/// Where in the range, 0 at its top and 1 at its bottom. Halves, as samples of ±1e308 are further apart than
/// a double can say; a range too narrow to be divided has its middle only.
double depth_in(const Extremes& range, double value) {
    const double span = 0.5 * range.high - 0.5 * range.low;
    return span > 0.0 ? std::clamp((0.5 * range.high - 0.5 * value) / span, 0.0, 1.0) : 0.5;
}

/// Dots, 2 × 4 to a character.
class Canvas {
  public:
    Canvas(std::size_t width, std::size_t height) : width_(width), cells_(width * height, 0) {}
    [[nodiscard]] std::size_t dot_columns() const { return 2 * width_; }
    [[nodiscard]] std::size_t dot_rows() const { return 4 * (cells_.size() / width_); }

    void fill(std::size_t column, std::size_t first_row, std::size_t last_row) {
        for (std::size_t row = first_row; row <= last_row; ++row) {
            // Unicode 8-dot braille: bits 0–2 and 6 down the left, 3–5 and 7 down the right.
            static constexpr std::array<std::array<std::uint8_t, 2>, 4> bits{
                {{0x01, 0x08}, {0x02, 0x10}, {0x04, 0x20}, {0x40, 0x80}}};
            cells_[(row / 4) * width_ + column / 2] |= bits[row % 4][column % 2];
        }
    }

    [[nodiscard]] std::string line(std::size_t row) const {
        std::string text;
        for (std::size_t i = 0; i < width_; ++i) {
            const std::uint32_t code = 0x2800U + cells_[row * width_ + i];
            text += static_cast<char>(0xE0U | (code >> 12U));
            text += static_cast<char>(0x80U | ((code >> 6U) & 0x3FU));
            text += static_cast<char>(0x80U | (code & 0x3FU));
        }
        return text;
    }

  private:
    std::size_t width_;
    std::vector<std::uint8_t> cells_;
};

/// Index of the first sample at or after the time.
std::size_t first_at(const Recording& recording, double time_s) {
    std::size_t low = 0, high = recording.size();
    while (low < high) {
        const std::size_t middle = low + (high - low) / 2;
        if (recording.clock.time_of(middle) < time_s)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

/// What spans the whole recording in equal steps of time.
struct TimeAxis {
    double start_s = 0.0, end_s = 0.0;
    [[nodiscard]] double at(double part) const { return start_s + part * (end_s - start_s); }
};

TimeAxis axis_of(const Recording& recording) {
    const double end = recording.clock.time_of(recording.size() - 1);
    return {recording.clock.time_of(0), std::max(end, recording.clock.time_of(0) + 1e-12)};
}

/// Least and greatest of the samples between the times, with the sample before them, so that columns join.
Extremes column_extremes(const Recording& recording, double from_s, double to_s) {
    const std::size_t first = first_at(recording, from_s), last = first_at(recording, to_s);
    Extremes extremes{INFINITY, -INFINITY};
    for (std::size_t i = first > 0 ? first - 1 : 0; i < std::min(std::max(last, first + 1), recording.size());
         ++i) {
        if (!std::isfinite(recording.samples[i])) continue;
        extremes.low = std::min(extremes.low, recording.samples[i]);
        extremes.high = std::max(extremes.high, recording.samples[i]);
    }
    return extremes;
}

/// Few samples to the recording: the straight line between neighbours instead of steps.
Extremes interpolated_extremes(const Recording& recording, double from_s, double to_s) {
    const auto value_at = [&](double time_s) {
        const std::size_t right =
            std::clamp<std::size_t>(first_at(recording, time_s), 1, recording.size() - 1);
        const double left_s = recording.clock.time_of(right - 1);
        const double part = (time_s - left_s) / (recording.clock.time_of(right) - left_s);
        return std::lerp(recording.samples[right - 1], recording.samples[right], std::clamp(part, 0.0, 1.0));
    };
    const double first = value_at(from_s), last = value_at(to_s);
    return {std::min(first, last), std::max(first, last)};
}

void draw_curve(Canvas& canvas, const Recording& recording, const Extremes& range) {
    const TimeAxis axis = axis_of(recording);
    const auto columns = static_cast<double>(canvas.dot_columns());
    const bool sparse = recording.size() > 1 && recording.size() < canvas.dot_columns();
    const auto row_of = [&](double value) {
        const double lowest = static_cast<double>(canvas.dot_rows() - 1);
        return static_cast<std::size_t>(std::lround(depth_in(range, value) * lowest));
    };
    for (std::size_t column = 0; column < canvas.dot_columns(); ++column) {
        const double from = axis.at(static_cast<double>(column) / columns);
        const double to = axis.at(static_cast<double>(column + 1) / columns);
        const Extremes extremes =
            sparse ? interpolated_extremes(recording, from, to) : column_extremes(recording, from, to);
        if (extremes.low <= extremes.high) canvas.fill(column, row_of(extremes.high), row_of(extremes.low));
    }
}

/// "┝━━1━━━┥" under each event; a narrow one keeps its first column.
std::string event_bars(const Recording& recording, const std::vector<Event>& events, std::size_t width) {
    const TimeAxis axis = axis_of(recording);
    std::vector<std::string> cells(width, " ");
    const auto cell_of = [&](std::size_t sample) {
        const double time = recording.clock.time_of(std::min(sample, recording.size() - 1));
        const double part = (time - axis.start_s) / (axis.end_s - axis.start_s);
        const double inside = part > 0.0 ? std::min(part, 1.0) : 0.0;  // 0 too where no time passes
        return std::min(static_cast<std::size_t>(inside * static_cast<double>(width)), width - 1);
    };
    for (std::size_t i = 0; i < events.size(); ++i) {
        const std::size_t first = cell_of(events[i].begin), last = std::max(first, cell_of(events[i].end));
        for (std::size_t cell = first; cell <= last; ++cell) cells[cell] = "━";
        const std::string number = std::to_string(i + 1);
        if (last - first < number.size()) continue;
        const std::size_t at = first + (last - first + 1 - number.size()) / 2;
        for (std::size_t k = 0; k < number.size(); ++k) cells[at + k] = std::string(1, number[k]);
    }
    std::string text;
    for (const std::string& cell : cells) text += cell;
    text.erase(text.find_last_not_of(' ') + 1);
    return text;
}

std::string label(double value, const Recording& recording) {
    const double factor =
        recording.scaled && recording.unit.si_factor != 0.0 ? recording.unit.si_factor : 1.0;
    return fmt::format("{:.4g}", value / factor);
}

}  // namespace

std::string draw(const Recording& recording, const std::vector<Event>& events, std::size_t width,
                 std::size_t height) {
    if (recording.size() == 0 || width == 0 || height == 0) return {};
    const Extremes range = extremes_of(recording.samples);
    const std::string top = label(range.high, recording), bottom = label(range.low, recording);
    const std::size_t margin =
        std::max({top.size(), bottom.size(), report::display_width(recording.unit.symbol)}) + 1;
    const std::size_t columns = std::max<std::size_t>(width > margin + 11 ? width - margin - 1 : 10, 10);

    Canvas canvas(columns, height);
    draw_curve(canvas, recording, range);
    const auto in_margin = [&](const std::string& text) {
        std::string padded(margin - report::display_width(text), ' ');
        padded += text;
        return padded;
    };
    std::string text;
    for (std::size_t row = 0; row < height; ++row) {
        text += in_margin(row == 0                          ? top
                          : row + 1 == height               ? bottom
                          : row == height / 2 && height > 2 ? report::printable(recording.unit.symbol)
                                                            : std::string());
        text += "▕" + canvas.line(row) + "\n";
    }
    if (!events.empty()) text += in_margin("") + " " + event_bars(recording, events, columns) + "\n";
    const TimeAxis axis = axis_of(recording);
    const std::string start = fmt::format("{:.4g} s", axis.start_s),
                      end = fmt::format("{:.4g} s", axis.end_s);
    std::string times = in_margin("") + " " + start;
    if (columns > start.size() + end.size()) times.append(columns - start.size() - end.size(), ' ');
    return text + times + end + "\n";
}

}  // namespace ringwright
