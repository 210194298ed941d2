#include "event/coupled_release.hpp"

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

namespace ringwright::event_search {
namespace {

constexpr std::size_t fewest_points = 24;
constexpr Eigen::Index amplitudes = 3;
using Normal = Eigen::Matrix<double, amplitudes, amplitudes>;
using Amplitudes = Eigen::Matrix<double, amplitudes, 1>;

/// Moment in steps, ln ω, ln ζ, ln β.
using Numbers = std::array<double, 4>;

DecayShape ring_of(const Numbers& numbers) {
    return {std::exp(numbers[1]), std::exp(numbers[2])};
}

/// What the offset and each amplitude is multiplied with at t after the release.
Amplitudes row_at(const DecayShape& ring, double tail_rate, double t) {
    const double tail = std::exp(-tail_rate * t);
    if (t <= 0.0) return {1.0, tail, tail};
    const DecayTerms terms = decay_terms(ring, t);
    return {1.0, terms.cosine_like + (ring.decay_rate() - tail_rate) * terms.sine_like, tail};
}

CoupledRelease fit_amplitudes_of(std::span<const double> points, const Numbers& numbers) {
    const DecayShape ring = ring_of(numbers);
    const double tail_rate = std::exp(numbers[3]);
    Normal normal = Normal::Zero();
    Amplitudes right = Amplitudes::Zero();
    std::vector<Amplitudes> rows(points.size());
    for (std::size_t k = 0; k < points.size(); ++k) {
        rows[k] = row_at(ring, tail_rate, static_cast<double>(k) - numbers[0]);
        normal += rows[k] * rows[k].transpose();
        right += rows[k] * (points[k] - points[0]);
    }
    const Amplitudes scale = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
    Normal scaled = scale.asDiagonal() * normal * scale.asDiagonal();
    constexpr double ridge = 1e-10;  // a slow tail and the offset are nearly alike
    scaled.diagonal().array() += ridge;
    const Amplitudes found = scale.cwiseProduct(scaled.ldlt().solve(scale.cwiseProduct(right)));
    CoupledRelease fit{numbers[0], ring,     tail_rate, found(0) + points[0],
                       found(1),   found(2), 0.0,       points.size()};
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double r = points[k] - points[0] - rows[k].dot(found);
        fit.residual_sum += r * r;
    }
    return fit;
}

struct Trial {
    Numbers numbers{};
    CoupledRelease fit;
};

bool better(const Trial& a, const Trial& b) {
    return a.fit.residual_sum < b.fit.residual_sum;
}

/// The ring stays within a factor of three of where it began, its damping ratio below 0.6, the tail slower
/// than the ring.
Numbers bounded(Numbers numbers, const DecayShape& ring) {
    const double centre = std::log(ring.undamped_angular_frequency);
    numbers[1] = std::clamp(numbers[1], centre - std::log(3.0), centre + std::log(3.0));
    numbers[2] = std::clamp(numbers[2], std::log(1e-4), std::log(0.6));
    numbers[3] = std::clamp(numbers[3], numbers[1] - std::log(200.0), numbers[1]);
    return numbers;
}

/// Pattern search: the sum of squares has kinks in the moment.
Trial descend(std::span<const double> points, Trial best, const DecayShape& ring) {
    constexpr int most_rounds = 60;
    Numbers step{1.0, 0.05, 0.2, 0.3};
    for (int round = 0; round < most_rounds && step[0] > 0.02; ++round) {
        bool improved = false;
        for (std::size_t i = 0; i < step.size(); ++i)
            for (const double way : {step[i], -step[i]}) {
                Trial tried = best;
                tried.numbers[i] += way;
                tried.numbers = bounded(tried.numbers, ring);
                tried.fit = fit_amplitudes_of(points, tried.numbers);
                if (!better(tried, best)) continue;
                best = tried, improved = true;
                break;
            }
        if (improved) continue;
        for (double& s : step) s *= 0.5;
    }
    return best;
}

std::vector<Trial> grid(std::span<const double> points, const DecayShape& ring, double earliest,
                        double latest) {
    constexpr double moments_a_cycle = 16.0;
    const double cycle = 2.0 * std::numbers::pi / ring.undamped_angular_frequency;
    std::vector<Trial> trials;
    for (double moment = earliest; moment <= latest; moment += std::max(1.0, cycle / moments_a_cycle))
        for (const double damping : {0.05, 0.2})
            for (const double slower : {2.0, 6.0, 20.0, 40.0}) {
                Trial trial;
                trial.numbers = {moment, std::log(ring.undamped_angular_frequency),
                                 std::log(ring.damping_ratio < 0.4 ? ring.damping_ratio : damping),
                                 std::log(ring.undamped_angular_frequency / slower)};
                trial.numbers = bounded(trial.numbers, ring);
                trial.fit = fit_amplitudes_of(points, trial.numbers);
                trials.push_back(trial);
            }
    return trials;
}

}  // namespace

double CoupledRelease::residual_rms() const {
    return std::sqrt(residual_sum / std::max(1.0, static_cast<double>(points) - 7.0));
}

double CoupledRelease::ring_amplitude() const {
    const double sine = (ring.decay_rate() - tail_rate) / ring.damped_angular_frequency();
    return std::abs(ring_part) * std::hypot(1.0, sine);
}

std::optional<CoupledRelease> fit_coupled_release(std::span<const double> points, const DecayShape& ring,
                                                  double earliest, double latest) {
    constexpr std::size_t kept = 3;
    if (points.size() < fewest_points || !(latest >= earliest)) return {};
    std::vector<Trial> trials = grid(points, ring, earliest, latest);
    const std::size_t count = std::min(kept, trials.size());
    std::partial_sort(trials.begin(), trials.begin() + static_cast<std::ptrdiff_t>(count), trials.end(),
                      better);
    Trial best = descend(points, trials.front(), ring);
    for (std::size_t i = 1; i < count; ++i) best = std::min(best, descend(points, trials[i], ring), better);
    if (!std::isfinite(best.fit.residual_sum) || best.numbers[0] < earliest - 1.0 ||
        best.numbers[0] > latest + 1.0)
        return {};
    return best.fit;
}

}  // namespace ringwright::event_search
