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
/// What a real damper may differ from the model over a few cycles, as a share of the amplitude: no reason to
/// start late. The first guess of the start bears with it; the last one fits the first cycle by itself.
constexpr double tolerated_misfit = 0.04;
/// The same where the decay is over within a cycle or two: less, lest a held plateau pass for its beginning.
constexpr double tolerated_when_damped = 0.01;
/// The same over one cycle with the shape fitted to that cycle.
constexpr double tolerated_in_cycle = 0.002;

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
    const std::size_t before =
        blocks_before_onset(cycle) + (onset.level > level ? reach_of(onset, level) : 0);
    Stretch stretch;
    stretch.first = centre > before ? centre - before : 0;
    const std::size_t earliest = (limits.earliest + (std::size_t{1} << level) - 1) >> level;
    stretch.first = std::max(stretch.first, earliest);
    // A limit may lie cycles behind the onset, as where the first swings are clipped.
    const std::size_t fitted = std::max((onset.fit_block << onset.level) >> level, earliest);
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

/// How many neighbouring residuals are worth one independent one, (1 + ρ)/(1 − ρ) with the correlation ρ of
/// neighbours; 1 for white noise.
double correlation_length(std::span<const double> means, const Trial& trial) {
    double last = 0.0, products = 0.0, squares = 0.0;
    for (std::size_t k = 0; k < trial.fit.points; ++k) {
        const double r = means[trial.first + k] - trial.fit.value_at(static_cast<double>(k));
        products += r * last, squares += r * r, last = r;
    }
    const double rho = squares > 0.0 ? std::clamp(products / squares, 0.0, 0.95) : 0.0;
    return (1.0 + rho) / (1.0 - rho);
}

double explained_sum(const Trial& trial) {
    return trial.fit.total_sum - trial.fit.residual_sum;
}

/// The noise variance of one block: the least of the trials that have enough points to show it and that hold
/// enough of the decay. Five numbers fitted to correlated noise take more of it away than five to white
/// noise.
double noise_variance(std::span<const double> means, const std::vector<Trial>& trials, bool drop) {
    constexpr double least_share = 0.15, parameters = 5.0;
    double most = 0.0, least = -1.0;
    for (const Trial& trial : trials) most = std::max(most, explained_sum(trial));
    for (const Trial& trial : trials) {
        const std::size_t enough = std::max<std::size_t>(20, trials.front().fit.points);
        if (trial.fit.points < enough || explained_sum(trial) < (drop ? 0.0 : least_share) * most) continue;
        const auto n = static_cast<double>(trial.fit.points);
        // What a bounce leaves unexplained is correlated, and is no noise; the bounces hold most of the
        // motion.
        const double freedom = n - parameters * (drop ? 1.0 : correlation_length(means, trial));
        const double variance = trial.fit.residual_sum / std::max(freedom, 0.2 * n);
        if (least < 0.0 || variance < least) least = variance;
    }
    return std::max(least, 0.0);
}

/// The noise variance of one block: of the rest where it is long, else of the rest or the trials, whichever
/// shows more.
double block_noise(std::span<const double> means, std::size_t level, const std::vector<Trial>& trials,
                   const StartLimits& limits) {
    const double fitted = noise_variance(means, trials, limits.drop);
    const std::optional<RestNoise> rest = noise_of_rest(means, level, limits.rest);
    if (!rest) return fitted;
    return !rest->is_long() && !limits.drop ? std::max(rest->variance, fitted) : rest->variance;
}

const Trial* cheapest(const std::vector<Trial>& trials, double variance, std::size_t from) {
    const double price = cost_of_leaving_out * variance;
    const Trial* best = nullptr;
    double least = 0.0;
    for (const Trial& trial : trials) {
        const double cost = trial.fit.residual_sum + price * static_cast<double>(trial.first - from);
        if (best == nullptr || cost < least) best = &trial, least = cost;
    }
    return best;
}

/// The strict guess, unless it comes so much later than the tolerant one that the damper, not the release,
/// explains the difference.
const Trial* first_guess(const std::vector<Trial>& trials, double noise, double amplitude, std::size_t from) {
    constexpr double late = 0.4, late_when_damped = 0.8;  // of a cycle
    const double strict_misfit = tolerated_in_cycle * amplitude;
    const Trial* strict = cheapest(trials, std::max(noise, strict_misfit * strict_misfit), from);
    const bool damped = strict->fit.shape.damping_ratio > 0.3;
    const double misfit = (damped ? tolerated_when_damped : tolerated_misfit) * amplitude;
    const Trial* tolerant = cheapest(trials, std::max(noise, misfit * misfit), from);
    const double cycle = 2.0 * std::numbers::pi / strict->fit.shape.undamped_angular_frequency;
    const double allowed = (damped ? late_when_damped : late) * cycle;
    const bool much_later =
        static_cast<double>(strict->first) > static_cast<double>(tolerant->first) + allowed;
    // Bounces keep the time of flight, not that of the mode: a start that shifts the frequency takes them in.
    const double shift =
        tolerant->fit.shape.undamped_angular_frequency / strict->fit.shape.undamped_angular_frequency;
    return much_later && std::abs(shift - 1.0) < 0.04 ? tolerant : strict;
}

/// The first cycle or so fitted by itself, from a little after the first guess of the start.
struct Local {
    std::size_t origin = 0;
    DecayFit fit;
};

std::optional<Local> fit_locally(std::span<const double> values, std::size_t origin, std::size_t end,
                                 const DecayShape& shape, double noise_rms) {
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
    const double length = std::max(1.25 * cycle, std::min(2.0 / shape.slow_rate(), 2.5 * cycle));
    const std::size_t stop = std::min(end, origin + static_cast<std::size_t>(std::ceil(length)));
    if (stop < origin + 8) return {};
    const std::span<const double> points = values.subspan(origin, stop - origin);
    Local local{origin, fit_amplitudes(points, shape)};
    if (local.fit.residual_rms() > 1.3 * noise_rms) {
        if (const std::optional<DecayFit> own = fit_decay(points, shape)) local.fit = *own;
    }
    return local;
}

/// The earliest of three origins from which the first cycle is as well explained as from the best of them.
std::optional<Local> choose_origin(std::span<const double> values, std::size_t guess, std::size_t ratio,
                                   std::size_t end, const DecayShape& shape, double noise_rms) {
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
    std::vector<Local> choices;
    for (const double later : {static_cast<double>(ratio), 0.12 * cycle, 0.25 * cycle}) {
        const std::size_t origin = guess + std::max<std::size_t>(1, static_cast<std::size_t>(later));
        if (const auto local = fit_locally(values, origin, end, shape, noise_rms)) choices.push_back(*local);
    }
    double least = -1.0;
    for (const Local& local : choices)
        if (least < 0.0 || local.fit.residual_rms() < least) least = local.fit.residual_rms();
    for (const Local& local : choices)
        if (local.fit.residual_rms() <= 1.25 * std::max(least, noise_rms)) return local;
    return {};
}

/// Whether one decay fits from the first value of the recording, less than a quarter of a cycle before, as
/// well as from `first` but for what noise may cost: then it was running when the recording began.
bool fits_from_first(std::span<const double> values, const Local& local, std::size_t first, double floor) {
    constexpr double share_of_cycle = 0.25, cost_of_value = 3.0, cost_of_fit = 8.0;
    const DecayShape& shape = local.fit.shape;
    const double time = std::max(2.0 * std::numbers::pi / shape.undamped_angular_frequency,
                                 shape.rings() ? 0.0 : 2.0 / shape.slow_rate());
    if (first == 0 || static_cast<double>(first) > share_of_cycle * time) return false;
    const std::size_t end = local.origin + local.fit.points;
    const std::optional<DecayFit> whole = fit_decay(values.subspan(0, end), shape);
    const std::optional<DecayFit> part = fit_decay(values.subspan(first, end - first), shape);
    if (!whole || !part) return false;
    const double allowed = cost_of_value * static_cast<double>(first) + cost_of_fit;
    return whole->residual_sum < part->residual_sum + allowed * floor * floor;
}

/// The start among single values (or fine blocks): back from the fitted stretch for as long as the decay
/// explains them.
void refine_position(const Pyramid& pyramid, Start& start, const StartLimits& limits,
                     double noise_block_rms) {
    const std::size_t fine = start.level > 4 ? start.level - 4 : 0;
    const std::size_t ratio = std::size_t{1} << (start.level - fine);
    const std::span<const double> values = pyramid.level(fine);
    const DecayShape shape = at_level(start.shape, 0, fine);
    const std::size_t guess = start.fit_block * ratio;
    const std::size_t end = std::min(values.size(), (start.fit_block + start.fit.points) * ratio);
    const std::optional<RestNoise> shown = noise_of_rest(values, fine, limits.rest);
    const double rest = shown ? std::sqrt(shown->variance) : noise_block_rms;
    const std::optional<Local> local = choose_origin(values, guess, ratio, end, shape, rest);
    start.position = std::max(guess << fine, limits.earliest);
    start.noise_rms = start.fit.residual_rms();
    if (!local) return;
    start.noise_rms = local->fit.residual_rms();
    const double floor = std::max({start.noise_rms, rest, tolerated_in_cycle * start.amplitude});
    const double price = cost_of_leaving_out * floor * floor;
    const std::size_t earliest = (limits.earliest + (std::size_t{1} << fine) - 1) >> fine;
    const auto back = static_cast<std::size_t>(std::numbers::pi / shape.undamped_angular_frequency);
    const std::size_t stop = std::max(guess > back ? guess - back : 0, earliest);
    double gain = 0.0, best = 0.0;
    std::size_t first = local->origin;
    for (std::size_t k = local->origin; k-- > stop;) {
        const double t = static_cast<double>(k) - static_cast<double>(local->origin);
        const double r = values[k] - local->fit.value_at(t);
        gain += price - r * r;
        if (gain > best) best = gain, first = k;
    }
    if (earliest == 0 && fits_from_first(values, *local, first, floor)) first = 0;
    start.position = std::max(first << fine, limits.earliest);
}

}  // namespace

std::optional<RestNoise> noise_of_rest(std::span<const double> values, std::size_t level,
                                       const std::optional<SampleRange>& rest) {
    if (!rest) return {};
    constexpr std::size_t fewest = 12, most = 4096;
    const std::size_t begin = (rest->begin >> level) + 1, end = std::min(rest->end >> level, begin + most);
    if (end < begin + fewest) return {};
    const auto n = static_cast<double>(end - begin);
    double y1 = 0.0, yy = 0.0, xy = 0.0, xx = 0.0, steps = 0.0;
    for (std::size_t k = begin; k < end; ++k) {
        const double x = static_cast<double>(k - begin) - 0.5 * (n - 1.0), y = values[k] - values[begin];
        y1 += y, yy += y * y, xy += x * y, xx += x * x;
        if (k > begin) steps += (values[k] - values[k - 1]) * (values[k] - values[k - 1]);
    }
    const double about_line = std::max(0.0, yy - y1 * y1 / n - xy * xy / xx);
    const double rho = about_line > 0.0 ? std::clamp(1.0 - 0.5 * steps / about_line, 0.0, 0.98) : 0.0;
    const double length = (1.0 + rho) / (1.0 - rho);
    return RestNoise{about_line / std::max(n - 2.0 * length, 0.3 * n), n / length};
}

std::optional<Start> locate_start(const Pyramid& pyramid, const Onset& onset, const StartLimits& limits) {
    Start start;
    DecayShape shape = onset.fit.shape;
    start.level = level_for(shape, onset.level, pyramid.levels());
    const std::span<const double> means = pyramid.level(start.level);
    shape = at_level(shape, onset.level, start.level);
    const Stretch stretch = stretch_around(onset, shape, start.level, means.size(), limits);
    if (stretch.end < stretch.first + 12) return {};
    const std::vector<Trial> trials = trials_over(means, stretch, shape);
    if (trials.empty()) return {};
    const double noise = block_noise(means, start.level, trials, limits);
    const double strict_misfit = tolerated_in_cycle * onset.amplitude;
    const Trial* best = limits.drop
                            ? cheapest(trials, std::max(noise, strict_misfit * strict_misfit), stretch.first)
                            : first_guess(trials, noise, onset.amplitude, stretch.first);
    start.fit = best->fit;
    start.fit_block = best->first;
    start.shape = at_level(best->fit.shape, start.level, 0);
    start.amplitude = best->fit.envelope_at(0.0);
    refine_position(pyramid, start, limits, std::sqrt(noise));
    if (limits.displacement && !limits.drop) refine_release(pyramid, start, limits);
    const double ahead =
        (static_cast<double>(start.position) - static_cast<double>(start.fit_block << start.level)) /
        static_cast<double>(std::size_t{1} << start.level);
    start.amplitude = start.fit.envelope_at(ahead);
    return start;
}

}  // namespace ringwright::event_search
