#include "report/number_text.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "ringwright/measured_value.hpp"

namespace ringwright::report {
namespace {

bool is_symmetric(const Estimate& estimate) {
    const double above = estimate.interval.high - estimate.value;
    const double below = estimate.value - estimate.interval.low;
    // Sides that differ by less than the second digit of the uncertainty shows are one ± to a reader.
    return std::abs(above - below) <= 0.05 * std::max(above, below);
}

double half_width(const Estimate& estimate) {
    return 0.5 * (estimate.interval.high - estimate.interval.low);
}

std::string unit_suffix(std::string_view unit) {
    return unit == "1" || unit.empty() ? "" : fmt::format(" {}", unit);
}

}  // namespace

std::string rounded(double value, double uncertainty) {
    if (!std::isfinite(value)) return "—";
    return round_to_uncertainty(Estimate{value, uncertainty, {value, value}}).value;
}

std::string with_interval(const Estimate& estimate, std::string_view unit) {
    const double u = estimate.standard_uncertainty;
    const std::string suffix = unit_suffix(unit);
    const bool low_known = std::isfinite(estimate.interval.low),
               high_known = std::isfinite(estimate.interval.high);
    const std::string value = rounded(estimate.value, u) + suffix;
    if (!low_known && !high_known) return "about " + value + ", no interval";
    if (!high_known)
        return fmt::format("about {}, at least {}{}", value, rounded(estimate.interval.low, u), suffix);
    if (!low_known)
        return fmt::format("about {}, at most {}{}", value, rounded(estimate.interval.high, u), suffix);
    if (!is_symmetric(estimate))
        return fmt::format("{}, between {}{} and {}{}", value, rounded(estimate.interval.low, u), suffix,
                           rounded(estimate.interval.high, u), suffix);
    const std::string plain =
        fmt::format("{} ± {}", rounded(estimate.value, u), rounded(half_width(estimate), u));
    return suffix.empty() ? plain : fmt::format("({}){}", plain, suffix);
}

std::string in_table(const Estimate& estimate) {
    const double u = estimate.standard_uncertainty;
    const Interval& interval = estimate.interval;
    if (std::isfinite(interval.low) && std::isfinite(interval.high) && is_symmetric(estimate))
        return fmt::format("{} ± {}", rounded(estimate.value, u), rounded(half_width(estimate), u));
    const auto end = [&](double value) {
        return std::isfinite(value) ? rounded(value, u) : std::string("—");
    };
    return fmt::format("{} [{}, {}]", rounded(estimate.value, u), end(interval.low), end(interval.high));
}

}  // namespace ringwright::report
