#pragma once
// Where the numbers of an axis stand and how they read.

#include <string>
#include <vector>

namespace ringwright::drawing {

struct Tick {
    double value = 0.0;
    std::string label;
};

/// An axis from `low` to `high` (low < high; both > 0 where logarithmic). `label` names quantity and unit.
struct Axis {
    double low = 0.0, high = 1.0;
    bool logarithmic = false;
    std::string label;
    std::vector<Tick> ticks;
};

/// An axis that holds [low, high] with `margin` (share of the range) to spare at each end and about `count`
/// ticks at 1, 2 or 5 times a power of ten. A power of ten common to all ticks moves into the label. Values
/// that are not finite or do not differ get a range of their own.
[[nodiscard]] Axis linear_axis(double low, double high, std::string label, int count = 5,
                               double margin = 0.0);
/// The same on a logarithmic scale; where not 0 < low ≤ high, from 1 to 10.
[[nodiscard]] Axis logarithmic_axis(double low, double high, std::string label, double margin = 0.05);
/// An axis that shows the numbers 1 … count, or some of them.
[[nodiscard]] Axis counting_axis(std::size_t count, std::string label);

/// "displacement in mm"; the name alone where the unit is "" or "1".
[[nodiscard]] std::string axis_label(const std::string& name, const std::string& unit);
/// A number with a true minus sign.
[[nodiscard]] std::string number_label(double value, int decimals);

/// Lowest and highest finite value of several sequences.
struct Range {
    double low = 0.0, high = 0.0;
    bool empty = true;
    void include(double value);
    void include(const std::vector<double>& values);
};

}  // namespace ringwright::drawing
