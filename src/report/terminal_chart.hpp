#pragma once
// A run of values drawn in characters.

#include <cstddef>
#include <string>
#include <utility>
#include <vector>

namespace ringwright::report {

/// A horizontal line with its name, e.g. {52.1, "upper limit"}.
struct ChartLine {
    double value = 0.0;
    std::string name;
};

struct ChartPoints {
    std::vector<double> values;
    std::vector<bool> marked;  ///< drawn as ◆ instead of •
};

/// One column a value; the last `width` of them. `rows` high, with lines and their values at the left.
[[nodiscard]] std::string draw_run(const ChartPoints& points, const std::vector<ChartLine>& lines,
                                   std::size_t width, std::size_t rows);

}  // namespace ringwright::report
