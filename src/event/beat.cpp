#include "event/beat.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>
#include <utility>

namespace ringwright::event_search {
namespace {

constexpr double most_damping = 0.1;
/// Natural logarithm of the ratio of the frequencies, and ratio of the amplitudes at the start.
constexpr double widest_tune = 0.35, weakest = 0.25;
/// What the pair may leave: as a share of its amplitude (to which the noise adds), and of what one decay
/// leaves.
constexpr double left_of_amplitude = 0.03, left_of_single = 0.3;

double amplitude(double cosine, double sine, const DecayShape& shape) {
    return std::hypot(cosine, sine / shape.damped_angular_frequency());
}

/// The best of pairs that start on both sides of the single decay's frequency.
std::optional<TwoTermFit> best_pair(std::span<const double> points, const DecayShape& single) {
    std::optional<TwoTermFit> best = fit_two_terms(points, single);
    const double beat = 2.0 * std::numbers::pi / static_cast<double>(points.size());
    for (const double beats : {0.7, 1.3, 2.0, 3.0}) {
        const double half = 0.5 * beats * beat / single.undamped_angular_frequency;
        if (2.0 * half > widest_tune) break;
        DecayShape low = single, high = single;
        low.damping_ratio = high.damping_ratio = std::min(single.damping_ratio, 0.02);
        low.undamped_angular_frequency *= 1.0 - half, high.undamped_angular_frequency *= 1.0 + half;
        const std::optional<TwoTermFit> fit = fit_two_terms(points, low, high);
        if (fit && (!best || fit->residual_sum < best->residual_sum)) best = fit;
    }
    return best;
}

void stronger_first(TwoTermFit& pair) {
    if (amplitude(pair.first_cosine, pair.first_sine, pair.first) >=
        amplitude(pair.second_cosine, pair.second_sine, pair.second))
        return;
    std::swap(pair.first, pair.second);
    std::swap(pair.first_cosine, pair.second_cosine);
    std::swap(pair.first_sine, pair.second_sine);
}

bool beats(const TwoTermFit& pair, double points) {
    const double widest = std::max(pair.first.damping_ratio, pair.second.damping_ratio);
    const double tune =
        std::abs(std::log(pair.second.undamped_angular_frequency / pair.first.undamped_angular_frequency));
    if (widest > most_damping || tune < 2.0 * widest || tune > widest_tune) return false;
    const double strong = amplitude(pair.first_cosine, pair.first_sine, pair.first);
    const double weak = amplitude(pair.second_cosine, pair.second_sine, pair.second);
    return weak > weakest * strong && points > beat_length(pair);
}

}  // namespace

double beat_length(const TwoTermFit& pair) {
    return 2.0 * std::numbers::pi /
           std::abs(pair.first.damped_angular_frequency() - pair.second.damped_angular_frequency());
}

std::optional<TwoTermFit> find_beat(const Pyramid& pyramid, const Start& start, std::size_t limit) {
    if (start.fit.shape.damping_ratio > 2.0 * most_damping) return {};
    const std::span<const double> means = pyramid.level(start.level);
    const std::size_t first = (start.position + (std::size_t{1} << start.level) - 1) >> start.level;
    const std::size_t end = std::min(limit >> start.level, means.size());
    const double cycle = 2.0 * std::numbers::pi / start.fit.shape.undamped_angular_frequency;
    for (const double cycles : {12.0, 24.0, 48.0}) {
        const auto length = static_cast<std::size_t>(cycles * cycle);
        if (first + length > end) return {};
        const std::span<const double> points = means.subspan(first, length);
        const std::optional<DecayFit> single = fit_decay(points, start.fit.shape);
        if (!single || single->residual_rms() < left_of_amplitude * start.amplitude) continue;
        std::optional<TwoTermFit> pair = best_pair(points, start.fit.shape);
        if (!pair || pair->residual_rms() > left_of_single * single->residual_rms()) continue;
        stronger_first(*pair);
        const double noise = std::min(start.noise_rms, start.fit.residual_rms());
        const double both = amplitude(pair->first_cosine, pair->first_sine, pair->first) +
                            amplitude(pair->second_cosine, pair->second_sine, pair->second);
        if (pair->residual_rms() > left_of_amplitude * both + 1.5 * noise) continue;
        if (beats(*pair, static_cast<double>(length))) return pair;
    }
    return {};
}

}  // namespace ringwright::event_search
