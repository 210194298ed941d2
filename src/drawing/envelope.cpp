// Many samples under few columns, without losing a spike.

#include <algorithm>
#include <cmath>
#include <limits>

#include "drawing/canvas.hpp"
#include "ringwright/figures.hpp"

namespace ringwright {
namespace drawing {
namespace {

/// Positions of the first, lowest, highest and last point of one column.
struct Column {
    std::size_t first = 0, lowest = 0, highest = 0, last = 0;
};

void append(Polyline& line, const Column& column, const std::vector<double>& x,
            const std::vector<double>& y) {
    std::size_t order[] = {column.first, column.lowest, column.highest, column.last};
    std::ranges::sort(order);
    const auto end = std::unique(std::begin(order), std::end(order));
    for (auto index = std::begin(order); index != end; ++index) {
        line.x.push_back(x[*index]);
        line.y.push_back(y[*index]);
    }
}

long column_of(double x, double low, double high, std::size_t columns) {
    const double share = (x - low) / (high - low) * static_cast<double>(columns);
    return static_cast<long>(std::clamp(std::floor(share), -1.0, static_cast<double>(columns)));
}

}  // namespace

Polyline under_columns(const std::vector<double>& x, const std::vector<double>& y, double low, double high,
                       std::size_t columns) {
    const std::size_t count = std::min(x.size(), y.size());
    Polyline line;
    if (count <= 4 * columns || !(high > low)) {
        line.x.assign(x.begin(), x.begin() + static_cast<std::ptrdiff_t>(count));
        line.y.assign(y.begin(), y.begin() + static_cast<std::ptrdiff_t>(count));
        return line;
    }
    for (std::size_t begin = 0; begin < count;) {
        if (!std::isfinite(y[begin])) {
            line.x.push_back(x[begin]);
            line.y.push_back(y[begin++]);
            continue;
        }
        Column column{begin, begin, begin, begin};
        const long here = column_of(x[begin], low, high, columns);
        std::size_t at = begin;
        for (; at < count && std::isfinite(y[at]) && column_of(x[at], low, high, columns) == here; ++at) {
            if (y[at] < y[column.lowest]) column.lowest = at;
            if (y[at] > y[column.highest]) column.highest = at;
            column.last = at;
        }
        append(line, column, x, y);
        begin = at;
    }
    return line;
}

}  // namespace drawing

SampleEnvelope envelope_of(const Recording& recording, std::size_t columns, double unit_factor) {
    constexpr double none = std::numeric_limits<double>::quiet_NaN();
    SampleEnvelope envelope;
    if (recording.samples.empty() || columns == 0) return envelope;
    envelope.begin_s = recording.clock.time_of(0);
    envelope.end_s = recording.clock.time_of(recording.size() - 1);
    envelope.low.assign(columns, none);
    envelope.high.assign(columns, none);
    const double span = std::max(envelope.end_s - envelope.begin_s, std::numeric_limits<double>::min());
    const double last = static_cast<double>(columns - 1);
    for (std::size_t i = 0; i < recording.size(); ++i) {
        const double value = recording.samples[i] / unit_factor;
        if (!std::isfinite(value)) continue;
        const double share = (recording.clock.time_of(i) - envelope.begin_s) / span;
        const auto column =
            static_cast<std::size_t>(std::clamp(share * static_cast<double>(columns), 0.0, last));
        double& low = envelope.low[column];
        double& high = envelope.high[column];
        if (!(low <= value)) low = value;
        if (!(high >= value)) high = value;
    }
    return envelope;
}

}  // namespace ringwright
