#include "event/start.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "event/release.hpp"

namespace ringwright::event_search {
namespace {

/// Cost of leaving a value out of the decay, in noise variances. A value that belongs to the decay costs one
/// on average when it is kept; five keeps noise from cutting the start, and drops what departs by more than
/// about two standard deviations for several values.
constexpr double cost_of_leaving_out = 5.0;
/// What a real damper may differ from the model over a few cycles, as a share of the amplitude: not a reason
/// to start late.
constexpr double tolerated_misfit = 0.003;

/// Blocks of a finer level within which an onset of a coarser level is uncertain.
std::size_t reach_of(const Onset& onset, std::size_t level) {
    return std::size_t{8} << (onset.level - level);
}

std::size_t blocks_before_onset(double cycle) {
    return static_cast<std::size_t>(std::ceil(cycle));
}

struct Stretch {
    std::size_t first = 0, last_start = 0, end = 0;  ///< blocks: starts tried from first to last_start
};

std::size_t level_for(const DecayShape& shape, std::size_t level, std::size_t levels) {
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency *
                         static_cast<double>(std::size_t{1} << level);
    const double wanted = std::floor(std::log2(std::max(1.0, cycle / 12.0)));
    return std::min(static_cast<std::size_t>(wanted), levels - 1);
}

Stretch stretch_around(const Onset& onset, const DecayShape& shape, std::size_t level, std::size_t blocks,
                       const StartLimits& limits) {
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
    const std::size_t centre = onset.position >> level;
    const std::size_t fitted = (onset.fit_block << onset.level) >> level;
    const std::size_t before =
        blocks_before_onset(cycle) + (onset.level > level ? reach_of(onset, level) : 0);
    Stretch stretch;
    stretch.first = centre > before ? centre - before : 0;
    const std::size_t earliest = (limits.earliest + (std::size_t{1} << level) - 1) >> level;
    stretch.first = std::max(stretch.first, earliest);
    stretch.last_start = std::max(stretch.first, fitted + static_cast<std::size_t>(1.5 * cycle));
    const double settling = 5.0 / std::max(shape.slow_rate(), 1e-9);
    const double length = std::clamp(std::min(settling, 4.0 * cycle), std::min(3.0 * cycle, 160.0), 200.0);
    const double longest = shape.damping_ratio > 0.5 ? std::clamp(settling, length, 200.0) : length;
    stretch.end = fitted + static_cast<std::size_t>(0.5 * cycle + longest);
    stretch.end = std::min({stretch.end, blocks, limits.latest >> level});
    return stretch;
}

struct Trial {
    std::size_t first = 0;
    DecayFit fit;
};

/// Fits from every start of the stretch to its end, latest first.
std::vector<Trial> trials_over(std::span<const double> means, const Stretch& stretch,
                               const DecayShape& shape) {
    constexpr std::size_t shortest = 10;
    std::vector<Trial> trials;
    DecayShape last = shape;
    for (std::size_t first = std::min(stretch.last_start, stretch.end - shortest) + 1;
         first-- > stretch.first;) {
        const std::span<const double> points = means.subspan(first, stretch.end - first);
        std::optional<DecayFit> fit = fit_decay(points, shape);
        const std::optional<DecayFit> other = fit_decay(points, last);
        if (other && (!fit || other->residual_sum < fit->residual_sum)) fit = other;
        if (!fit) continue;
        trials.push_back({first, *fit});
        last = fit->shape;
    }
    return trials;
}

/// The noise variance of one block: the least of the trials that have enough points to show it.
double noise_variance(const std::vector<Trial>& trials, double amplitude) {
    double least = -1.0;
    for (const Trial& trial : trials) {
        const std::size_t enough = std::max<std::size_t>(20, trials.front().fit.points);
        if (trial.fit.points < enough) continue;
        const double variance = trial.fit.residual_rms() * trial.fit.residual_rms();
        if (least < 0.0 || variance < least) least = variance;
    }
    const double misfit = tolerated_misfit * amplitude;
    return std::max({least, misfit * misfit, 0.0});
}

const Trial* cheapest(const std::vector<Trial>& trials, double amplitude, std::size_t from) {
    const double price = cost_of_leaving_out * noise_variance(trials, amplitude);
    const Trial* best = nullptr;
    double least = 0.0;
    for (const Trial& trial : trials) {
        const double cost = trial.fit.residual_sum + price * static_cast<double>(trial.first - from);
        if (best == nullptr || cost < least) best = &trial, least = cost;
    }
    return best;
}

/// The start among single values (or fine blocks): back from the fitted stretch for as long as the decay
/// explains them.
void refine_position(const Pyramid& pyramid, Start& start, const StartLimits& limits) {
    const std::size_t fine = start.level > 4 ? start.level - 4 : 0;
    const std::size_t ratio = std::size_t{1} << (start.level - fine);
    const std::span<const double> values = pyramid.level(fine);
    const DecayShape shape = at_level(start.shape, 0, fine);
    const std::size_t origin = (start.fit_block + 1) * ratio;
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
    const auto wanted = static_cast<std::size_t>(std::ceil(1.5 * cycle));
    const std::size_t stop =
        std::min({values.size(), (start.fit_block + start.fit.points) * ratio, origin + wanted});
    if (stop < origin + 8) {
        start.position = std::max(start.fit_block << start.level, limits.earliest);
        return;
    }
    const DecayFit local = fit_amplitudes(values.subspan(origin, stop - origin), shape);
    start.noise_rms = local.residual_rms();
    const double floor = std::max(start.noise_rms, tolerated_misfit * start.amplitude);
    const double price = cost_of_leaving_out * floor * floor;
    const std::size_t earliest = (limits.earliest + (std::size_t{1} << fine) - 1) >> fine;
    const std::size_t back = origin > 4 * ratio ? origin - 4 * ratio : 0;
    double gain = 0.0, best = 0.0;
    std::size_t first = origin;
    for (std::size_t k = origin; k-- > std::max(back, earliest);) {
        const double t = static_cast<double>(k) - static_cast<double>(origin);
        const double r = values[k] - local.value_at(t);
        gain += price - r * r;
        if (gain > best) best = gain, first = k;
    }
    start.position = std::max(first << fine, limits.earliest);
}

}  // namespace

std::optional<Start> locate_start(const Pyramid& pyramid, const Onset& onset, const StartLimits& limits) {
    Start start;
    DecayShape shape = onset.fit.shape;
    start.level = level_for(shape, onset.level, pyramid.levels());
    const std::span<const double> means = pyramid.level(start.level);
    shape = at_level(shape, onset.level, start.level);
    const Stretch stretch = stretch_around(onset, shape, start.level, means.size(), limits);
    if (stretch.end < stretch.first + 12) return {};
    const std::vector<Trial> trials = trials_over(means, stretch, shape);
    const Trial* best = trials.empty() ? nullptr : cheapest(trials, onset.amplitude, stretch.first);
    if (best == nullptr) return {};
    start.fit = best->fit;
    start.fit_block = best->first;
    start.shape = at_level(best->fit.shape, start.level, 0);
    start.amplitude = best->fit.envelope_at(0.0);
    refine_position(pyramid, start, limits);
    if (limits.displacement) refine_release(pyramid, start, limits);
    const double ahead =
        (static_cast<double>(start.position) - static_cast<double>(start.fit_block << start.level)) /
        static_cast<double>(std::size_t{1} << start.level);
    start.amplitude = start.fit.envelope_at(ahead);
    return start;
}

}  // namespace ringwright::event_search
