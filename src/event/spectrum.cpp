#include "event/spectrum.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "ringwright/power_spectrum.hpp"

namespace ringwright::event_search {
namespace {

/// Beyond this damping ratio a line in the spectrum is no longer where the mode is.
constexpr double spectral_damping = 0.25;
constexpr std::size_t most_points = std::size_t{1} << 17;

double peak_between(const Periodogram& spectrum, double low_hz, double high_hz) {
    const std::vector<double>& power = spectrum.power;
    const auto first =
        std::max<std::size_t>(1, static_cast<std::size_t>(std::max(0.0, low_hz / spectrum.step_hz)));
    const auto last = std::min(power.size() - 1, static_cast<std::size_t>(high_hz / spectrum.step_hz) + 1);
    if (first >= last) return 0.0;
    const auto top = std::max_element(power.begin() + static_cast<std::ptrdiff_t>(first),
                                      power.begin() + static_cast<std::ptrdiff_t>(last));
    const auto k = static_cast<std::size_t>(top - power.begin());
    double shift = 0.0;
    if (k > 0 && k + 1 < power.size() && power[k - 1] > 0.0 && power[k + 1] > 0.0) {
        const double below = std::log(power[k - 1]), at = std::log(power[k]), above = std::log(power[k + 1]);
        const double bend = below - 2.0 * at + above;
        if (bend < 0.0) shift = std::clamp(0.5 * (below - above) / bend, -0.5, 0.5);
    }
    return (static_cast<double>(k) + shift) * spectrum.step_hz;
}

}  // namespace

Periodogram periodogram_of(std::span<const double> points, double rate_hz) {
    constexpr double padding = 4.0;
    double mean = 0.0;
    for (const double y : points) mean += y / static_cast<double>(points.size());
    std::vector<double> centred(points.begin(), points.end());
    for (double& y : centred) y -= mean;
    Periodogram spectrum;
    spectrum.power = padded_power_spectrum(centred, padding);
    spectrum.step_hz = rate_hz / static_cast<double>(2 * (spectrum.power.size() - 1));
    return spectrum;
}

double ringing_frequency(const Pyramid& pyramid, double rate_hz, const Found& found,
                         const std::optional<double>& near_hz) {
    const DecayShape& shape = found.start.shape;
    if (!shape.rings()) return 0.0;
    const double fitted = shape.damped_angular_frequency() * rate_hz / (2.0 * std::numbers::pi);
    if (shape.damping_ratio > spectral_damping && !near_hz) return fitted;
    const double highest = std::max(fitted, near_hz.value_or(fitted));
    const double per_cycle = std::max(1.0, rate_hz / highest / 12.0);
    const auto level = std::min(static_cast<std::size_t>(std::log2(per_cycle)), pyramid.levels() - 1);
    const std::span<const double> means = pyramid.level(level);
    const std::size_t first = found.begin() >> level;
    const std::size_t last = std::min({found.end() >> level, means.size(), first + most_points});
    if (last < first + 8) return fitted;
    const double rate = rate_hz / static_cast<double>(std::size_t{1} << level);
    const Periodogram spectrum = periodogram_of(means.subspan(first, last - first), rate);
    if (near_hz) return peak_between(spectrum, 0.8 * *near_hz, 1.25 * *near_hz);
    const double line = peak_between(spectrum, 0.7 * fitted, 1.4 * fitted);
    return line > 0.0 ? line : fitted;
}

}  // namespace ringwright::event_search
