#include "drawing/ticks.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace ringwright::drawing {
namespace {

double round_step(double rough) {
    const double decade = std::pow(10.0, std::floor(std::log10(rough)));
    for (const double factor : {1.0, 2.0, 5.0})
        if (factor * decade >= rough * 0.8) return factor * decade;
    return 10.0 * decade;
}

int decimals_of(double step) {
    return std::clamp(static_cast<int>(std::ceil(-std::log10(step) - 1e-9)), 0, 9);
}

std::string superscript(int exponent) {
    static const char* const digits[] = {"⁰", "¹", "²", "³", "⁴", "⁵", "⁶", "⁷", "⁸", "⁹"};
    std::string text = exponent < 0 ? "⁻" : "";
    for (const char digit : std::to_string(std::abs(exponent))) text += digits[digit - '0'];
    return text;
}

/// Power of ten taken out of numbers that would need many zeros; 0 for none.
int common_exponent(double largest) {
    if (largest >= 1e-2 && largest < 1e5) return 0;
    return 3 * static_cast<int>(std::floor(std::log10(largest) / 3.0));
}

void widen_if_flat(double& low, double& high) {
    if (!std::isfinite(low) || !std::isfinite(high)) low = 0.0, high = 1.0;
    if (low > high) std::swap(low, high);
    const double size = std::max(std::abs(low), std::abs(high));
    if (high - low > 1e-12 * size && high > low) return;
    const double half = size > 0.0 ? 0.1 * size : 1.0;
    low -= half;
    high += half;
}

void label_ticks(Axis& axis, double step) {
    const int exponent = common_exponent(std::max(std::abs(axis.low), std::abs(axis.high)));
    const double scale = std::pow(10.0, exponent);
    for (Tick& tick : axis.ticks) tick.label = number_label(tick.value / scale, decimals_of(step / scale));
    if (exponent != 0) axis.label += ", ×10" + superscript(exponent);
}

std::string logarithmic_label(double value) {
    if (value >= 0.999e-3 && value < 1e5) return fmt::format("{:.6g}", value);
    const int exponent = static_cast<int>(std::floor(std::log10(value) + 1e-9));
    const double mantissa = value / std::pow(10.0, exponent);
    const std::string power = "10" + superscript(exponent);
    return std::abs(mantissa - 1.0) < 1e-6 ? power : fmt::format("{:.0f}·{}", mantissa, power);
}

}  // namespace

std::string number_label(double value, int decimals) {
    std::string text = fmt::format("{:.{}f}", std::abs(value), decimals);
    const bool zero = text.find_first_of("123456789") == std::string::npos;
    return value < 0.0 && !zero ? "−" + text : text;
}

Axis linear_axis(double low, double high, std::string label, int count, double margin) {
    widen_if_flat(low, high);
    const double spare = margin * (high - low);
    Axis axis{low - spare, high + spare, false, std::move(label), {}};
    const double step = round_step((axis.high - axis.low) / std::max(count, 1));
    const double first = std::ceil(axis.low / step - 1e-9), last = std::floor(axis.high / step + 1e-9);
    for (double number = first; number <= last; number += 1.0) axis.ticks.push_back({number * step, {}});
    label_ticks(axis, step);
    return axis;
}

Axis logarithmic_axis(double low, double high, std::string label, double margin) {
    const bool usable = low > 0.0 && high >= low && std::isfinite(low) && std::isfinite(high);
    if (!usable) low = 1.0, high = 10.0;
    if (!(high > low * 1.0001)) low /= 1.5, high *= 1.5;
    const double spare = std::pow(high / low, margin);
    Axis axis{low / spare, high * spare, true, std::move(label), {}};
    const double decades = std::log10(axis.high / axis.low);
    const int first = static_cast<int>(std::floor(std::log10(axis.low)));
    const int last = static_cast<int>(std::ceil(std::log10(axis.high)));
    const int every = std::max(1, static_cast<int>(decades / 6.0));
    for (int exponent = first; exponent <= last; exponent += every)
        for (const double factor : {1.0, 2.0, 3.0, 5.0, 7.0}) {
            if (factor > 1.0 && decades > 2.5) continue;
            const bool fine = factor == 3.0 || factor == 7.0;
            if (fine && decades > 1.0) continue;
            const double value = factor * std::pow(10.0, exponent);
            if (value < axis.low || value > axis.high) continue;
            axis.ticks.push_back({value, logarithmic_label(value)});
        }
    return axis;
}

Axis counting_axis(std::size_t count, std::string label) {
    const double last = static_cast<double>(std::max<std::size_t>(count, 1));
    Axis axis{0.5, last + 0.5, false, std::move(label), {}};
    const double step = std::max(1.0, round_step(last / 10.0));
    for (double number = step; number <= last; number += step)
        axis.ticks.push_back({number, number_label(number, 0)});
    return axis;
}

std::string axis_label(const std::string& name, const std::string& unit) {
    return unit.empty() || unit == "1" ? name : name + " in " + unit;
}

void Range::include(double value) {
    if (!std::isfinite(value)) return;
    low = empty ? value : std::min(low, value);
    high = empty ? value : std::max(high, value);
    empty = false;
}

void Range::include(const std::vector<double>& values) {
    for (const double value : values) include(value);
}

}  // namespace ringwright::drawing
