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

namespace {

std::vector<Forecast> forecasts_from(std::span<const double> means, std::size_t first, std::size_t cycle,
                                     const DecayShape& shape) {
    constexpr std::size_t looked_at = 8;
    std::vector<Forecast> forecasts;
    // A shape of hardly any frequency has a cycle beyond any recording.
    if (first + 2 * cycle >= means.size()) return forecasts;
    TermTable terms(cycle + cycle / 2);
    terms.set(shape, 0.0);
    for (std::size_t k = first; k + 2 * cycle < means.size() && k < first + looked_at * cycle; ++k)
        forecasts.push_back(forecast_after(means, k, cycle, shape, terms));
    return forecasts;
}

/// The last forecast that a hit surprises by at least four tenths of the amplitude. One hit surprises for as
/// long as it lies in the cycle that a forecast is made from, or in the half cycle that it foretells.
std::optional<std::size_t> last_surprise(const std::vector<Forecast>& forecasts, std::size_t cycle) {
    constexpr double surprising = 0.4, calm = 0.2;
    constexpr std::size_t calm_cycles = 2;
    const double usual = median_missed(forecasts);
    std::optional<std::size_t> last;
    std::size_t surprised = 0, followed = 0;
    for (std::size_t i = 0; i < forecasts.size(); ++i) {
        const auto [missed, amplitude] = forecasts[i];
        if (missed > std::max(surprising * amplitude, 4.0 * usual)) {
            last = i, followed = 0, ++surprised;
        } else if (last && missed < std::max(calm * amplitude, 2.0 * usual)) {
            ++followed;
        }
    }
    if (surprised > 2 * cycle || followed < calm_cycles * cycle) return {};
    return last;
}

/// The same of a weaker hit, which is one only where all goes as foretold before it and after it: another
/// mode, or another law of damping, surprises from the start on.
std::optional<std::size_t> last_weak_surprise(const std::vector<Forecast>& forecasts, std::size_t cycle) {
    constexpr double surprising = 0.1, calm = 0.05, plainly = 5.0, as_usual = 2.5, longest = 1.7, after = 1.5;
    const double usual = median_missed(forecasts);
    const auto is_above = [&](std::size_t i, double share, double times) {
        return forecasts[i].missed > std::max(share * forecasts[i].amplitude, times * usual);
    };
    std::size_t begin = 0;
    while (begin < forecasts.size() && !is_above(begin, calm, as_usual)) ++begin;
    if (begin < cycle / 4) return {};
    std::size_t end = begin;  // of all that is not calm
    bool surprised = false;
    for (std::size_t i = begin; i < forecasts.size(); ++i) {
        if (is_above(i, calm, as_usual)) end = i + 1;
        surprised = surprised || is_above(i, surprising, plainly);
    }
    const auto cycles = [&](std::size_t blocks) {
        return static_cast<double>(blocks) / static_cast<double>(cycle);
    };
    if (!surprised || cycles(end - begin) > longest || cycles(forecasts.size() - end) < after) return {};
    return end - 1;
}

/// The shape of what follows when four cycles have passed; nothing where that is not plain.
std::optional<DecayShape> later_shape(std::span<const double> means, std::size_t first, std::size_t cycle,
                                      const DecayShape& shape) {
    constexpr std::size_t passed = 4, looked_at = 8;
    constexpr double plain = 30.0, alike = 0.1;
    if (first + (passed + 2) * cycle > means.size()) return {};
    const std::span<const double> later = means.subspan(first + passed * cycle);
    const std::optional<DecayFit> fit =
        fit_decay(later.first(std::min(later.size(), looked_at * cycle)), shape);
    if (!fit || fit->explained_ratio() < plain) return {};
    const double tune = fit->shape.undamped_angular_frequency / shape.undamped_angular_frequency;
    if (std::abs(tune - 1.0) > alike || fit->shape.damping_ratio > most_damping) return {};
    return fit->shape;
}

}  // namespace

std::optional<std::size_t> after_second_hit(std::span<const double> means, std::size_t first,
                                            const DecayShape& shape) {
    constexpr std::size_t fewest_blocks = 8;
    constexpr double hides_a_weak_one = 0.1;  // of the amplitude
    if (shape.damping_ratio > most_damping) return {};
    const std::size_t cycle = cycle_of(shape);
    if (cycle < fewest_blocks) return {};
    const std::vector<Forecast> forecasts = forecasts_from(means, first, cycle, shape);
    if (forecasts.empty()) return {};
    std::optional<std::size_t> last = last_surprise(forecasts, cycle);
    if (!last && median_missed(forecasts) < hides_a_weak_one * forecasts.front().amplitude) {
        const std::optional<DecayShape> later = later_shape(means, first, cycle, shape);
        if (later) last = last_weak_surprise(forecasts_from(means, first, cycle, *later), cycle);
    }
    if (!last) return {};
    const std::size_t foretold = first + *last + cycle + cycle / 2;
    return foretold > cycle ? foretold - cycle : foretold;
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
