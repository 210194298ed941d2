#include "event/release.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <optional>
#include <vector>

#include "event/term_table.hpp"

namespace ringwright::event_search {
namespace {

/// Sums of squares about plateau-then-decay with the release at `moment` (blocks from the first point).
struct ReleaseFit {
    double moment = 0.0;
    DecayShape shape;
    double plateau = 0.0, offset = 0.0;
    double residual_sum = 0.0;
};

/// The points, and room for the share of the plateau that is left at each of them.
struct Fitting {
    explicit Fitting(std::span<const double> all) : points(all), terms(all.size()), share(all.size()) {}
    std::span<const double> points;
    TermTable terms;
    std::vector<double> share;
};

/// All up to the release, e^(−st)[C + s·S] from then on.
void put_share(Fitting& fitting, double moment, const DecayShape& shape) {
    const std::size_t n = fitting.share.size();
    const auto after = static_cast<std::size_t>(std::max(0.0, std::floor(moment) + 1.0));
    std::fill_n(fitting.share.begin(), std::min(n, after), 1.0);
    if (after >= n) return;
    fitting.terms.set(shape, static_cast<double>(after) - moment, n - after);
    const std::span<const double> cosine = fitting.terms.cosine_like(), sine = fitting.terms.sine_like();
    for (std::size_t k = after; k < n; ++k)
        fitting.share[k] = cosine[k - after] + shape.decay_rate() * sine[k - after];
}

ReleaseFit fit_levels(Fitting& fitting, double moment, const DecayShape& shape) {
    put_share(fitting, moment, shape);
    const std::span<const double> points = fitting.points, share = fitting.share;
    double w1 = 0.0, ww = 0.0, y1 = 0.0, wy = 0.0;
    const auto n = static_cast<double>(points.size());
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double w = share[k];
        w1 += w, ww += w * w, y1 += points[k], wy += w * points[k];
    }
    const double determinant = n * ww - w1 * w1;
    ReleaseFit fit{moment, shape, 0.0, 0.0, 0.0};
    const double height = determinant > 1e-12 * n * ww ? (n * wy - w1 * y1) / determinant : 0.0;
    fit.offset = (y1 - height * w1) / n;
    fit.plateau = fit.offset + height;
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double r = points[k] - fit.offset - height * share[k];
        fit.residual_sum += r * r;
    }
    return fit;
}

ReleaseFit moved(Fitting& fitting, const ReleaseFit& fit, const std::array<double, 3>& move) {
    return fit_levels(fitting, fit.moment + move[0],
                      {fit.shape.undamped_angular_frequency * std::exp(move[1]),
                       std::clamp(fit.shape.damping_ratio * std::exp(move[2]), 1e-6, 50.0)});
}

/// Pattern search on (τ, ln ω_n, ln ζ): the sum of squares has kinks in τ, and three numbers are few.
ReleaseFit descend(Fitting& fitting, ReleaseFit best) {
    std::array<double, 3> step{1.0, 0.05, 0.1};
    for (int round = 0; round < 60; ++round) {
        bool improved = false;
        for (std::size_t i = 0; i < 3; ++i) {
            for (const double sign : {1.0, -1.0}) {
                std::array<double, 3> move{};
                move[i] = sign * step[i];
                const ReleaseFit tried = moved(fitting, best, move);
                if (tried.residual_sum < best.residual_sum) {
                    best = tried;
                    improved = true;
                    break;
                }
            }
        }
        if (improved) continue;
        for (double& s : step) s *= 0.5;
        if (step[0] < 0.01) break;
    }
    return best;
}

/// The blocks in which a release is looked for: a flat stretch, then the decay.
struct Window {
    std::size_t first = 0, before = 0, end = 0;  ///< `before` blocks lie before the start as it was found
    double held = 0.0, spread = 0.0;             ///< mean and standard deviation of the flat stretch
};

/// The longer flat stretch of two lengths before the start; nothing when none is flat, or when it lies
/// where the decay ends.
std::optional<Window> window_before(std::span<const double> means, const Start& start, double cycle,
                                    std::size_t earliest) {
    constexpr double flat_share = 0.06, height_share = 0.2;
    const std::size_t block = start.position >> start.level;
    const auto after = static_cast<std::size_t>(
        std::clamp(std::max(1.5 * cycle, 2.0 / start.fit.shape.slow_rate()), 12.0, 120.0));
    for (const double cycles : {1.2, 0.6}) {
        Window window;
        window.before = static_cast<std::size_t>(std::clamp(cycles * cycle, 6.0, 40.0));
        if (block < window.before + earliest) continue;
        window.first = block - window.before;
        window.end = std::min({block + after, start.fit_block + start.fit.points, means.size()});
        if (window.end < block + 8) continue;
        const std::span<const double> flat = means.subspan(window.first, window.before / 2);
        const auto n = static_cast<double>(flat.size());
        for (const double y : flat) window.held += y / n;
        for (const double y : flat) window.spread += (y - window.held) * (y - window.held) / (n - 1.0);
        window.spread = std::sqrt(window.spread);
        const double height = std::abs(window.held - start.fit.offset);
        const double allowed = std::max(flat_share * height, 1.5 * start.fit.residual_rms());
        if (window.spread < allowed && height > height_share * start.amplitude) return window;
    }
    return {};
}

ReleaseFit best_release(std::span<const double> points, const Window& window, const DecayShape& shape,
                        double cycle) {
    Fitting fitting(points);
    std::vector<ReleaseFit> fits;
    for (double shift = -0.5; shift <= 1.21; shift += 0.05) {
        const double moment = static_cast<double>(window.before) + shift * cycle;
        if (moment < 0.5 * static_cast<double>(window.before) ||
            moment + 6.0 > static_cast<double>(points.size()))
            continue;
        fits.push_back(fit_levels(fitting, moment, shape));
        for (const double damping : {0.15, 0.5, 1.0, 2.5})
            fits.push_back(fit_levels(fitting, moment, {shape.undamped_angular_frequency, damping}));
    }
    if (fits.empty()) return descend(fitting, fit_levels(fitting, static_cast<double>(window.before), shape));
    const auto better = [](const ReleaseFit& a, const ReleaseFit& b) {
        return a.residual_sum < b.residual_sum;
    };
    const std::size_t kept = std::min<std::size_t>(3, fits.size());
    std::partial_sort(fits.begin(), fits.begin() + static_cast<std::ptrdiff_t>(kept), fits.end(), better);
    ReleaseFit best = descend(fitting, fits.front());
    for (std::size_t i = 1; i < kept; ++i) best = std::min(best, descend(fitting, fits[i]), better);
    return best;
}

/// Sum of squares about the flat stretch up to the start and about the decay as it was found from there on.
double unjoined_sum(std::span<const double> means, const Window& window, const Start& start) {
    double sum = 0.0;
    for (std::size_t k = window.first; k < window.end; ++k) {
        const double t = static_cast<double>(k) - static_cast<double>(start.fit_block);
        const double expected = k < window.first + window.before ? window.held : start.fit.value_at(t);
        sum += (means[k] - expected) * (means[k] - expected);
    }
    return sum;
}

/// Takes the decay over from the release where that lies far from the start as it was found.
void refit_after(std::span<const double> means, const Window& window, const ReleaseFit& release,
                 Start& start) {
    const auto block = window.first + static_cast<std::size_t>(std::ceil(std::max(0.0, release.moment)));
    if (block + 8 > window.end) return;
    start.fit_block = block;
    start.fit = fit_amplitudes(means.subspan(block, window.end - block), release.shape);
    start.shape = at_level(release.shape, start.level, 0);
    start.noise_rms = std::sqrt(release.residual_sum / static_cast<double>(window.end - window.first));
}

}  // namespace

void refine_release(const Pyramid& pyramid, Start& start, const StartLimits& limits) {
    constexpr double far = 0.15;       // of a cycle
    constexpr double tolerated = 2.5;  // block means blur the corner at the release
    const std::span<const double> means = pyramid.level(start.level);
    const double cycle = 2.0 * std::numbers::pi / start.fit.shape.undamped_angular_frequency;
    const std::optional<Window> window = window_before(means, start, cycle, limits.earliest >> start.level);
    if (!window) return;
    const std::span<const double> points = means.subspan(window->first, window->end - window->first);
    const ReleaseFit best = best_release(points, *window, start.fit.shape, cycle);
    const double unjoined = unjoined_sum(means, *window, start);
    const double smallest = 0.003 * (window->held - start.fit.offset);
    const double least = smallest * smallest * static_cast<double>(points.size());
    if (best.residual_sum > std::max(tolerated * unjoined, least)) return;
    // A block mean is centred half a block after its first value.
    const double block_length = static_cast<double>(std::size_t{1} << start.level);
    const double moment = (static_cast<double>(window->first) + best.moment + 0.5) * block_length - 0.5;
    const double earlier = static_cast<double>(start.position) - moment;
    const bool moves_far = std::abs(earlier) > far * cycle * block_length + block_length;
    // What fell freely before it touched leaves its hold quadratically too, but long before the decay begins.
    if (moves_far && earlier > 0.0 && best.residual_sum > 0.8 * unjoined) return;
    if (moves_far) refit_after(means, *window, best, start);
    start.position = std::max(static_cast<std::size_t>(std::max(0.0, std::ceil(moment))), limits.earliest);
    start.from_rest = true;
}

}  // namespace ringwright::event_search
