#include "event/second_hit.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "event/term_table.hpp"

namespace ringwright::event_search {
namespace {

constexpr double most_damping = 0.3;

std::size_t cycle_of(const DecayShape& shape) {
    return static_cast<std::size_t>(std::ceil(2.0 * std::numbers::pi / shape.undamped_angular_frequency));
}

/// Largest departure of the half cycle after a cycle from what that cycle foretells, and its amplitude.
struct Forecast {
    double missed = 0.0, amplitude = 0.0;
};

/// `terms` are those of the shape over a cycle and a half.
Forecast forecast_after(std::span<const double> means, std::size_t k, std::size_t cycle,
                        const DecayShape& shape, const TermTable& terms) {
    const DecayFit fit = fit_amplitudes(means.subspan(k, cycle), shape);
    Forecast forecast{0.0, fit.envelope_at(0.0)};
    for (std::size_t i = cycle; i < cycle + cycle / 2; ++i) {
        const double foretold =
            fit.offset + fit.cosine_part * terms.cosine_like()[i] + fit.sine_part * terms.sine_like()[i];
        forecast.missed = std::max(forecast.missed, std::abs(means[k + i] - foretold));
    }
    return forecast;
}

double median_missed(const std::vector<Forecast>& forecasts) {
    std::vector<double> missed;
    for (const Forecast& forecast : forecasts) missed.push_back(forecast.missed);
    const auto middle = missed.begin() + static_cast<std::ptrdiff_t>(missed.size() / 2);
    std::nth_element(missed.begin(), middle, missed.end());
    return *middle;
}

/// First block from which the recording moves, going back from the start until it is still for half a cycle.
std::size_t motion_begins(std::span<const double> means, std::size_t start, std::size_t cycle, double moves) {
    const std::size_t quiet = std::max<std::size_t>(3, cycle / 2);
    std::size_t k = start;
    while (k > quiet) {
        const auto [low, high] = std::minmax_element(means.begin() + static_cast<std::ptrdiff_t>(k - quiet),
                                                     means.begin() + static_cast<std::ptrdiff_t>(k));
        if (*high - *low < moves) return k;
        --k;
    }
    return 0;
}

}  // namespace

std::optional<std::size_t> after_second_hit(std::span<const double> means, std::size_t first,
                                            const DecayShape& shape) {
    constexpr std::size_t fewest_blocks = 8, looked_at = 8, calm_cycles = 2;
    constexpr double surprising = 0.4, calm = 0.2;
    if (shape.damping_ratio > most_damping) return {};
    const std::size_t cycle = cycle_of(shape);
    if (cycle < fewest_blocks) return {};
    // A shape of hardly any frequency has a cycle beyond any recording.
    if (first + 2 * cycle >= means.size()) return {};
    TermTable terms(cycle + cycle / 2);
    terms.set(shape, 0.0);
    std::vector<Forecast> forecasts;
    for (std::size_t k = first; k + 2 * cycle < means.size() && k < first + looked_at * cycle; ++k)
        forecasts.push_back(forecast_after(means, k, cycle, shape, terms));
    const double usual = median_missed(forecasts);
    std::size_t last = 0, surprised = 0, followed = 0;
    for (std::size_t i = 0; i < forecasts.size(); ++i) {
        const auto [missed, amplitude] = forecasts[i];
        if (missed > std::max(surprising * amplitude, 4.0 * usual)) {
            last = first + i + cycle + cycle / 2, followed = 0, ++surprised;
        } else if (last > 0 && missed < std::max(calm * amplitude, 2.0 * usual)) {
            ++followed;
        }
    }
    // One hit surprises for as long as it lies in the cycle or the half cycle after it.
    if (last == 0 || surprised > 2 * cycle || followed < calm_cycles * cycle) return {};
    return last > cycle ? last - cycle : last;
}

bool rings_before(const Pyramid& pyramid, const Start& start) {
    constexpr double shortest = 0.35, longest = 6.0, margin = 0.1, moves_share = 0.15, explained = 30.0;
    if (start.from_rest || start.fit.shape.damping_ratio > most_damping) return false;
    const std::span<const double> means = pyramid.level(start.level);
    const std::size_t block = start.position >> start.level, cycle = cycle_of(start.fit.shape);
    const double moves = moves_share * start.amplitude + 5.0 * start.fit.residual_rms();
    const std::size_t since = motion_begins(means, block, cycle, moves);
    const auto cycles = static_cast<double>(block - since) / static_cast<double>(cycle);
    if (since == 0 || cycles < shortest || cycles > longest) return false;
    const auto gap = static_cast<std::size_t>(std::ceil(margin * static_cast<double>(cycle)));
    if (since + 2 * gap + 4 > block) return false;
    const std::size_t length = std::min(block - since - 2 * gap, cycle);
    const std::span<const double> points = means.subspan(since + gap, length);
    return fit_amplitudes(points, start.fit.shape).explained_ratio() > explained;
}

bool moves_before(const Pyramid& pyramid, const Start& start) {
    constexpr double shortest = 0.35, moves_share = 0.15;
    // Beside another mode a crest of the one may pass for a plateau.
    if (start.from_rest && !start.companion) return false;
    const std::span<const double> means = pyramid.level(start.level);
    const std::size_t block = std::min(start.position >> start.level, means.size());
    // What one decay leaves where two are known is the other, and no noise.
    const double noise = start.companion ? start.noise_rms : start.fit.residual_rms();
    const double moves = moves_share * start.amplitude + 5.0 * noise;
    const std::size_t since = motion_begins(means, block, cycle_of(start.fit.shape), moves);
    return static_cast<double>(block - since) > shortest * static_cast<double>(cycle_of(start.fit.shape));
}

}  // namespace ringwright::event_search
