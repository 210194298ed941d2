#include "event/onset.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

constexpr std::size_t reach = 8;           ///< blocks on either side that are compared
constexpr std::size_t memory = 24;         ///< blocks back over which the activity before is the largest
constexpr std::size_t fit_blocks = 40;     ///< blocks of a trial fit
constexpr std::size_t shortest_fit = 12;   ///< blocks, at the end of a recording
constexpr double rise = 2.0;               ///< of the activity at an onset, at least
constexpr double weakest = 0.02;           ///< activity against the largest of the level
constexpr std::size_t most_places = 1500;  ///< per level
constexpr double least_explained = 3.0;    ///< explained to residual sum of squares of a trial fit

/// Range of the `reach` blocks from k on.
std::vector<double> activity_of(std::span<const double> means) {
    std::vector<double> activity(means.size() >= reach ? means.size() - reach + 1 : 0);
    for (std::size_t k = 0; k < activity.size(); ++k) {
        const auto [low, high] = std::minmax_element(means.begin() + static_cast<std::ptrdiff_t>(k),
                                                     means.begin() + static_cast<std::ptrdiff_t>(k + reach));
        activity[k] = *high - *low;
    }
    return activity;
}

struct Place {
    std::size_t block = 0;
    double activity = 0.0;
};

std::vector<Place> places_of(const std::vector<double>& activity) {
    std::vector<Place> places;
    if (activity.empty()) return places;
    const double largest = *std::max_element(activity.begin(), activity.end());
    if (!(largest > 0.0)) return places;
    places.push_back({0, activity.front()});
    const std::size_t n = activity.size();
    std::vector<double> ratio(n, 0.0);
    for (std::size_t k = 2; k < n; ++k) {
        if (activity[k] < weakest * largest) continue;
        double before = k >= reach ? activity[k - reach] : activity[0] * static_cast<double>(k) / reach;
        for (std::size_t i = k > memory ? k - memory : 0; i + reach < k; ++i)
            before = std::max(before, activity[i]);
        ratio[k] = activity[k] / (before + 1e-6 * largest);
    }
    for (std::size_t k = 2; k < n; ++k) {
        if (ratio[k] < rise) continue;
        const auto from = ratio.begin() + static_cast<std::ptrdiff_t>(k > reach ? k - reach : 0);
        const auto to = ratio.begin() + static_cast<std::ptrdiff_t>(std::min(n, k + reach + 1));
        if (ratio[k] >= *std::max_element(from, to)) places.push_back({k, activity[k]});
    }
    const auto stronger = [](const Place& a, const Place& b) { return a.activity > b.activity; };
    if (places.size() > most_places) {
        std::nth_element(places.begin(), places.begin() + most_places, places.end(), stronger);
        places.resize(most_places);
    }
    return places;
}

/// Whether the points show the shape: neither a sliver of a cycle nor cycles finer than the blocks.
bool resolved(const DecayFit& fit, std::size_t level) {
    const auto n = static_cast<double>(fit.points);
    if (!fit.shape.rings()) return fit.shape.slow_rate() * n > 1.0 && fit.shape.slow_rate() < 0.7;
    const double frequency = fit.shape.damped_angular_frequency();
    const bool settles = fit.shape.decay_rate() * n > 2.0;
    const double cycles = frequency * n / (2.0 * std::numbers::pi);
    return (cycles > 1.2 || settles) &&
           fit.shape.undamped_angular_frequency < 2.0 * std::numbers::pi / (level == 0 ? 2.4 : 4.5);
}

/// Explained to residual sum of squares of the shape on points eight times finer: a step that hides a ringing
/// in its blocks explains little there.
double finely_explained(const Pyramid& pyramid, std::size_t level, std::size_t first, const DecayFit& fit) {
    const std::size_t finer = std::min<std::size_t>(level, 3);
    const std::span<const double> values =
        pyramid.level(level - finer).subspan(first << finer, fit.points << finer);
    return fit_amplitudes(values, at_level(fit.shape, level, level - finer)).explained_ratio();
}

/// Whether even the best of a coarse grid of shapes explains little: most places of a noisy recording.
bool hopeless(std::span<const double> means, const Place& place) {
    constexpr double little = 0.6;
    constexpr std::size_t skipped = 3;
    const std::size_t first = place.block + skipped;
    if (first + shortest_fit > means.size()) return false;
    return roughly_explained(means.subspan(first, std::min(fit_blocks, means.size() - first))) < little;
}

}  // namespace

std::optional<Onset> onset_at(const Pyramid& pyramid, std::size_t level, std::size_t block) {
    const std::span<const double> means = pyramid.level(level);
    std::optional<Onset> best;
    for (const std::size_t skipped : {std::size_t{0}, std::size_t{3}, std::size_t{7}}) {
        const std::size_t first = block + skipped;
        if (first + shortest_fit > means.size()) break;
        const std::size_t count = std::min(fit_blocks, means.size() - first);
        const std::optional<DecayFit> fit = fit_decay(means.subspan(first, count));
        if (!fit || !resolved(*fit, level) || fit->explained_ratio() < least_explained) continue;
        Onset onset{level, block, block << level, *fit, first, fit->envelope_at(0.0), 0.0};
        const double explained = (fit->total_sum - fit->residual_sum) / static_cast<double>(count);
        onset.score = std::sqrt(explained) * std::log1p(finely_explained(pyramid, level, first, *fit));
        if (!best || onset.score > best->score) best = onset;
    }
    return best;
}

std::vector<Onset> find_onsets(const Pyramid& pyramid) {
    std::vector<Onset> onsets;
    for (std::size_t level = 0; level < pyramid.levels(); ++level) {
        const std::span<const double> means = pyramid.level(level);
        for (const Place& place : places_of(activity_of(means))) {
            if (hopeless(means, place)) continue;
            if (const auto onset = onset_at(pyramid, level, place.block)) onsets.push_back(*onset);
        }
    }
    std::stable_sort(onsets.begin(), onsets.end(),
                     [](const Onset& a, const Onset& b) { return a.score > b.score; });
    return onsets;
}

}  // namespace ringwright::event_search
