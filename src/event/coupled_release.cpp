#include "event/coupled_release.hpp"

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

#include "event/term_table.hpp"

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

/// The points, and room for what the amplitudes are multiplied with at each of them.
struct Fitting {
    explicit Fitting(std::span<const double> all)
        : points(all), terms(all.size()), ring(all.size()), tail(all.size()) {}
    std::span<const double> points;
    TermTable terms;
    std::vector<double> ring, tail;
};

/// h(t) and e^(−βt) at each point.
void put_rows(Fitting& fitting, const DecayShape& ring, double tail_rate, double moment) {
    const std::size_t n = fitting.points.size();
    const double fall = std::exp(-tail_rate);
    double tail = std::exp(tail_rate * moment);
    for (std::size_t k = 0; k < n; ++k, tail *= fall) fitting.ring[k] = fitting.tail[k] = tail;
    const auto after = static_cast<std::size_t>(std::max(0.0, std::floor(moment) + 1.0));
    if (after >= n) return;
    fitting.terms.set(ring, static_cast<double>(after) - moment, n - after);
    const std::span<const double> cosine = fitting.terms.cosine_like(), sine = fitting.terms.sine_like();
    for (std::size_t k = after; k < n; ++k)
        fitting.ring[k] = cosine[k - after] + (ring.decay_rate() - tail_rate) * sine[k - after];
}

CoupledRelease fit_amplitudes_of(Fitting& fitting, const Numbers& numbers) {
    const DecayShape ring = ring_of(numbers);
    const double tail_rate = std::exp(numbers[3]);
    put_rows(fitting, ring, tail_rate, numbers[0]);
    const auto n = static_cast<Eigen::Index>(fitting.points.size());
    const Eigen::Map<const Eigen::ArrayXd> h(fitting.ring.data(), n), e(fitting.tail.data(), n),
        y(fitting.points.data(), n);
    const double y0 = y(0), he = (h * e).sum();
    Normal normal;
    normal << static_cast<double>(n), h.sum(), e.sum(), h.sum(), h.square().sum(), he, e.sum(), he,
        e.square().sum();
    const Amplitudes right{(y - y0).sum(), (h * (y - y0)).sum(), (e * (y - y0)).sum()};
    const Amplitudes scale = normal.diagonal().cwiseMax(1e-300).cwiseSqrt().cwiseInverse();
    Normal scaled = scale.asDiagonal() * normal * scale.asDiagonal();
    constexpr double ridge = 1e-10;  // a slow tail and the offset are nearly alike
    scaled.diagonal().array() += ridge;
    const Amplitudes found = scale.cwiseProduct(scaled.ldlt().solve(scale.cwiseProduct(right)));
    const double left = (y - y0 - found(0) - found(1) * h - found(2) * e).square().sum();
    return {numbers[0], ring, tail_rate, found(0) + y0, found(1), found(2), left, fitting.points.size()};
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
Trial descend(Fitting& fitting, Trial best, const DecayShape& ring) {
    constexpr int most_rounds = 60;
    Numbers step{1.0, 0.05, 0.2, 0.3};
    for (int round = 0; round < most_rounds && step[0] > 0.02; ++round) {
        bool improved = false;
        for (std::size_t i = 0; i < step.size(); ++i)
            for (const double way : {step[i], -step[i]}) {
                Trial tried = best;
                tried.numbers[i] += way;
                tried.numbers = bounded(tried.numbers, ring);
                tried.fit = fit_amplitudes_of(fitting, tried.numbers);
                if (!better(tried, best)) continue;
                best = tried, improved = true;
                break;
            }
        if (improved) continue;
        for (double& s : step) s *= 0.5;
    }
    return best;
}

std::vector<Trial> grid(Fitting& fitting, const DecayShape& ring, double earliest, double latest) {
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
                trial.fit = fit_amplitudes_of(fitting, trial.numbers);
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
    Fitting fitting(points);
    std::vector<Trial> trials = grid(fitting, ring, earliest, latest);
    const std::size_t count = std::min(kept, trials.size());
    std::partial_sort(trials.begin(), trials.begin() + static_cast<std::ptrdiff_t>(count), trials.end(),
                      better);
    Trial best = descend(fitting, trials.front(), ring);
    for (std::size_t i = 1; i < count; ++i) best = std::min(best, descend(fitting, trials[i], ring), better);
    if (!std::isfinite(best.fit.residual_sum) || best.numbers[0] < earliest - 1.0 ||
        best.numbers[0] > latest + 1.0)
        return {};
    return best.fit;
}

}  // namespace ringwright::event_search
