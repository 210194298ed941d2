#include "ledger/variance_interval.hpp"

#include <algorithm>
#include <cmath>

#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

/// How far a mean square may lie below and above its expectation: 1 − 1/F_{α;ν,∞} and 1/F_{1−α;ν,∞} − 1.
struct Reach {
    double down = 0.0, up = 0.0;
};

Reach reach_of(double degrees_of_freedom, double tail) {
    return {1.0 - degrees_of_freedom / chi_squared_quantile(1.0 - tail, degrees_of_freedom),
            degrees_of_freedom / chi_squared_quantile(tail, degrees_of_freedom) - 1.0};
}

/// Half-widths of the interval on either side of the estimate.
struct HalfWidths {
    double down = 0.0, up = 0.0;
};

HalfWidths of_sum(const std::vector<WeightedSquare>& squares, double tail) {
    double down = 0.0, up = 0.0;
    for (const WeightedSquare& square : squares) {
        const Reach reach = reach_of(square.degrees_of_freedom, tail);
        const double term = square.weight * square.mean_square;
        const bool added = term >= 0.0;
        down += std::pow((added ? reach.down : reach.up) * term, 2);
        up += std::pow((added ? reach.up : reach.down) * term, 2);
    }
    return {std::sqrt(down), std::sqrt(up)};
}

HalfWidths of_difference(const WeightedSquare& plus, const WeightedSquare& minus, double tail) {
    const double a = plus.weight * plus.mean_square, b = -minus.weight * minus.mean_square;
    const Reach first = reach_of(plus.degrees_of_freedom, tail),
                second = reach_of(minus.degrees_of_freedom, tail);
    const double high = f_quantile(1.0 - tail, plus.degrees_of_freedom, minus.degrees_of_freedom);
    const double low = f_quantile(tail, plus.degrees_of_freedom, minus.degrees_of_freedom);
    const double cross_down =
        (std::pow(high - 1.0, 2) - std::pow(first.down * high, 2) - std::pow(second.up, 2)) / high;
    const double cross_up =
        (std::pow(1.0 - low, 2) - std::pow(first.up * low, 2) - std::pow(second.down, 2)) / low;
    const double down = std::pow(first.down * a, 2) + std::pow(second.up * b, 2) + cross_down * a * b;
    const double up = std::pow(first.up * a, 2) + std::pow(second.down * b, 2) + cross_up * a * b;
    return {std::sqrt(std::max(0.0, down)), std::sqrt(std::max(0.0, up))};
}

}  // namespace

VarianceComponent component_of(const std::vector<WeightedSquare>& squares, double confidence_level) {
    const double tail = (1.0 - confidence_level) / 2.0;
    double variance = 0.0;
    for (const WeightedSquare& square : squares) variance += square.weight * square.mean_square;
    const bool difference = squares.size() == 2 && squares[1].weight < 0.0;
    const HalfWidths widths =
        difference ? of_difference(squares[0], squares[1], tail) : of_sum(squares, tail);
    return {std::max(0.0, variance),
            {std::max(0.0, variance - widths.down), std::max(0.0, variance + widths.up)}};
}

}  // namespace ringwright
