#include "event/ramped_release.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <utility>
#include <vector>

namespace ringwright::event_search {
namespace {

constexpr double shortest_ramp = 0.5;  // steps
constexpr double longest_ramp = 0.5;   // cycles: what lets go more slowly than that hardly rings

using Trial = MotionTrial<RampNumbers>;

}  // namespace

/// With y = e^(−st)[C + s·S], ẏ = −ω²·e^(−st)S and D² + 2sD + ω² = 0: ∫y = −(ẏ + 2sy)/ω².
double RampedRelease::integral_to(double t) const {
    if (t <= 0.0) return t;
    const double s = numbers_.shape.decay_rate(), omega = numbers_.shape.undamped_angular_frequency;
    const DecayTerms terms = decay_terms(numbers_.shape, t);
    const double way = terms.cosine_like + s * terms.sine_like;
    return terms.sine_like + 2.0 * s * (1.0 - way) / (omega * omega);
}

double RampedRelease::value_at(double t) const {
    const double after = t - numbers_.release;
    if (after <= 0.0) return numbers_.hold;
    const double way = (integral_to(after) - integral_to(after - numbers_.ramp)) / numbers_.ramp;
    return numbers_.rest + (numbers_.hold - numbers_.rest) * way;
}

std::optional<MotionFit<RampedRelease>> fit_ramped_release(std::span<const double> points,
                                                           const RampNumbers& like, double earliest,
                                                           double latest) {
    constexpr double moments_a_cycle = 24.0;
    constexpr std::size_t kept = 2;
    const double cycle = 2.0 * std::numbers::pi / like.shape.undamped_angular_frequency;
    std::vector<Trial> trials;
    for (double release = latest; release > earliest; release -= std::max(1.0, cycle / moments_a_cycle))
        for (const double ramp : {0.02, 0.12, 0.3}) {
            RampNumbers numbers = like;
            numbers.release = release;
            numbers.ramp = std::max(shortest_ramp, ramp * cycle);
            trials.push_back({numbers, sum_left_by(RampedRelease(numbers), points)});
        }
    // Hold, rest, release, ln ramp, ln ω, ln ζ.
    const auto make = [cycle](const Eigen::VectorXd& at) {
        return RampedRelease(
            {at(0),
             at(1),
             at(2),
             std::clamp(std::exp(at(3)), shortest_ramp, longest_ramp * cycle),
             {std::clamp(std::exp(at(4)), 1e-4, 3.0), std::clamp(std::exp(at(5)), 1e-4, 3.0)}});
    };
    return best_refined(std::move(trials), kept, [&](const RampNumbers& n) {
        const double size = 1e-3 * std::abs(n.rest - n.hold);
        Eigen::VectorXd start(6), steps(6);
        start << n.hold, n.rest, n.release, std::log(n.ramp), std::log(n.shape.undamped_angular_frequency),
            std::log(n.shape.damping_ratio);
        steps << size, size, 1e-2, 1e-3, 1e-4, 1e-4;
        return fit_motion(points, make, start, steps);
    });
}

}  // namespace ringwright::event_search
