#include "report/number_text.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace ringwright::report {
namespace {

/// Decimal place of the second significant digit of the uncertainty: 2 means hundredths, −1 tens.
int decimal_places(double uncertainty) {
    const int exponent = static_cast<int>(std::floor(std::log10(uncertainty)));
    // 0.0996 rounds to 0.10: one place less than its exponent says.
    const double digits = std::round(uncertainty / std::pow(10.0, exponent - 1));
    return digits >= 100.0 ? -exponent : 1 - exponent;
}

std::string in_plain_decimals(double value, int places) {
    const double step = std::pow(10.0, -places);
    const double shown = places < 0 ? std::round(value / step) * step : value;
    std::string text = fmt::format("{:.{}f}", shown, std::max(places, 0));
    const bool zero = text.find_first_of("123456789") == std::string::npos;
    if (zero && text.starts_with('-')) text.erase(0, 1);
    return text;
}

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
    if (!(uncertainty > 0.0) || !std::isfinite(uncertainty)) return fmt::format("{:.6g}", value);
    const int places = decimal_places(uncertainty);
    const double size = std::max(std::abs(value), uncertainty);
    if (places <= 9 && size < 1e7) return in_plain_decimals(value, places);
    const int exponent = static_cast<int>(std::floor(std::log10(size)));
    return fmt::format("{:.{}e}", value, std::clamp(places + exponent, 0, 15));
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
