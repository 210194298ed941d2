#include "event/release.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

/// Sums of squares about plateau-then-decay with the release at `moment` (blocks from the first point).
struct ReleaseFit {
    double moment = 0.0;
    DecayShape shape;
    double plateau = 0.0, offset = 0.0;
    double residual_sum = 0.0;
};

double share_of_plateau(const DecayShape& shape, double t) {
    if (t <= 0.0) return 1.0;
    const DecayTerms terms = decay_terms(shape, t);
    return terms.cosine_like + shape.decay_rate() * terms.sine_like;
}

ReleaseFit fit_levels(std::span<const double> points, double moment, const DecayShape& shape) {
    double w1 = 0.0, ww = 0.0, y1 = 0.0, wy = 0.0;
    const auto n = static_cast<double>(points.size());
    std::vector<double> share(points.size());
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double w = share[k] = share_of_plateau(shape, static_cast<double>(k) - moment);
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

ReleaseFit moved(std::span<const double> points, const ReleaseFit& fit, const std::array<double, 3>& move) {
    return fit_levels(points, fit.moment + move[0],
                      {fit.shape.undamped_angular_frequency * std::exp(move[1]),
                       std::clamp(fit.shape.damping_ratio * std::exp(move[2]), 1e-6, 50.0)});
}

/// Pattern search on (τ, ln ω_n, ln ζ): the sum of squares has kinks in τ, and three numbers are few.
ReleaseFit descend(std::span<const double> points, ReleaseFit best) {
    std::array<double, 3> step{1.0, 0.05, 0.1};
    for (int round = 0; round < 60; ++round) {
        bool improved = false;
        for (std::size_t i = 0; i < 3; ++i) {
            for (const double sign : {1.0, -1.0}) {
                std::array<double, 3> move{};
                move[i] = sign * step[i];
                const ReleaseFit tried = moved(points, best, move);
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

}  // namespace

void refine_release(const Pyramid& pyramid, Start& start, const StartLimits& limits) {
    const std::span<const double> means = pyramid.level(start.level);
    const double cycle = 2.0 * std::numbers::pi / start.fit.shape.undamped_angular_frequency;
    const auto before = static_cast<std::size_t>(std::clamp(0.6 * cycle, 6.0, 24.0));
    const std::size_t block = start.position >> start.level;
    if (block < before + (limits.earliest >> start.level)) return;
    const std::size_t first = block - before;
    const auto after = static_cast<std::size_t>(
        std::clamp(std::max(1.5 * cycle, 2.0 / start.fit.shape.slow_rate()), 12.0, 120.0));
    const std::size_t end = std::min({block + after, start.fit_block + start.fit.points, means.size()});
    if (end < block + 8) return;
    const std::span<const double> points = means.subspan(first, end - first);
    double held = 0.0, spread = 0.0;
    const std::size_t flat = before / 2;
    for (std::size_t k = 0; k < flat; ++k) held += points[k] / static_cast<double>(flat);
    for (std::size_t k = 0; k < flat; ++k) spread += (points[k] - held) * (points[k] - held);
    spread = std::sqrt(spread / static_cast<double>(flat));
    const double height = std::abs(held - start.fit.offset);
    if (spread > 0.06 * height || height < 0.2 * start.amplitude) return;
    ReleaseFit best;
    best.residual_sum = -1.0;
    for (double shift = -0.3; shift <= 0.31; shift += 0.05) {
        const ReleaseFit tried =
            fit_levels(points, static_cast<double>(before) + shift * cycle, start.fit.shape);
        if (best.residual_sum < 0.0 || tried.residual_sum < best.residual_sum) best = tried;
    }
    best = descend(points, best);
    const double rms = std::sqrt(best.residual_sum / static_cast<double>(points.size()));
    const double allowed = std::max({2.0 * start.fit.residual_rms(), 2.5 * spread, 0.003 * height});
    if (rms > allowed) return;
    // A block mean is centred half a block after its first value.
    const double block_length = static_cast<double>(std::size_t{1} << start.level);
    const double moment = (static_cast<double>(first) + best.moment + 0.5) * block_length - 0.5;
    // What fell freely before it touched leaves its hold quadratically too, but long before the decay begins.
    const double earlier = static_cast<double>(start.position) - moment;
    if (earlier > 0.15 * cycle * block_length + block_length) return;
    start.position = std::max(static_cast<std::size_t>(std::max(0.0, std::ceil(moment))), limits.earliest);
    start.from_rest = true;
}

}  // namespace ringwright::event_search
