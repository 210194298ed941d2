#pragma once
// Whether a figure that was filed comes out again.

#include <algorithm>
#include <cmath>

namespace ringwright::app {

enum class Match { exact, but_for_rounding, different };

/// Another machine's mathematics library may round the last digits otherwise: one part in 10⁹ is the same.
[[nodiscard]] inline Match match_of(double filed, double replayed) {
    constexpr double rounding = 1e-9;
    if (filed == replayed) return Match::exact;
    const double scale = std::max(std::abs(filed), std::abs(replayed));
    return std::abs(filed - replayed) <= rounding * scale ? Match::but_for_rounding : Match::different;
}

}  // namespace ringwright::app
