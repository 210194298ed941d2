#include "identify/start_values.hpp"

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

#include "identify/spectrum.hpp"
#include "ringwright/each_index.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr std::array damping_grid{0.0005, 0.003, 0.015, 0.06, 0.18, 0.45, 0.9, 1.6, 3.5};
constexpr double widest_ratio_to_near = 1.4;
constexpr std::size_t refined_starts = 4;

// The two highest peaks of the spectrum, rad/s.
std::vector<double> spectral_candidates(const DecaySamples& samples) {
    const Index tail = std::max<Index>(1, samples.size() / 5);
    const VectorXd centred = samples.value.array() - samples.value.tail(tail).mean();
    const PowerSpectrum spectrum = power_spectrum(centred);
    std::vector<std::pair<double, Index>> peaks;
    for (Index i = 2; i + 1 < spectrum.power.size(); ++i)
        if (spectrum.power(i) > spectrum.power(i - 1) && spectrum.power(i) >= spectrum.power(i + 1))
            peaks.emplace_back(spectrum.power(i), i);
    std::ranges::sort(peaks, std::greater<>{});
    std::vector<double> found;
    for (std::size_t i = 0; i < std::min<std::size_t>(2, peaks.size()); ++i) {
        const Index at = peaks[i].second;
        found.push_back(two_pi * refined_peak(spectrum.power, at, at) * spectrum.bin_cycles / samples.step_s);
    }
    return found;
}

std::vector<double> candidate_frequencies(const DecaySamples& samples, double guess_hz,
                                          std::optional<double> near_hz) {
    std::vector<double> candidates = spectral_candidates(samples);
    if (guess_hz > 0.0) candidates.push_back(two_pi * guess_hz);
    const double span = samples.time.maxCoeff();
    for (double cycles = 0.15; cycles < 40.0 && cycles < 0.2 * static_cast<double>(samples.size());
         cycles *= 1.6)
        candidates.push_back(two_pi * cycles / span);
    if (near_hz) {
        candidates.push_back(two_pi * *near_hz);
        std::erase_if(candidates, [&](double omega) {
            const double ratio = omega / (two_pi * *near_hz);
            return ratio > widest_ratio_to_near || ratio < 1.0 / widest_ratio_to_near;
        });
    }
    return candidates;
}

// Residual sum by the normal equations: good to rank starts by, at a fraction of the cost of a QR.
double quick_residual_sum(const DecayModel& model, const DecaySamples& samples, double total) {
    const Eigen::MatrixXd columns = linear_columns(model, samples);
    const Eigen::MatrixXd normal = columns.transpose() * columns;
    const VectorXd right = columns.transpose() * samples.value;
    const VectorXd solution = normal.ldlt().solve(right);
    const double sum = total - solution.dot(right);
    return std::isfinite(sum) ? std::max(sum, 0.0) : total;
}

struct Candidate {
    double residual_sum = 0.0;
    DecayModel model;
};

Candidate best_damping(const DecaySamples& samples, double omega, double total) {
    Candidate best;
    for (const double damping : damping_grid) {
        DecayModel model;
        model.oscillators.push_back(Oscillator::from(damping, omega));
        const double sum = quick_residual_sum(model, samples, total);
        if (best.model.oscillators.empty() || sum < best.residual_sum) best = {sum, std::move(model)};
    }
    return best;
}

}  // namespace

std::optional<ProjectedFit> find_start(const DecaySamples& samples, double guess_hz,
                                       std::optional<double> near_hz, unsigned threads) {
    const double total = samples.value.squaredNorm();
    const std::vector<double> candidates = candidate_frequencies(samples, guess_hz, near_hz);
    std::vector<Candidate> tried(candidates.size());
    for_each_index(tried.size(), threads,
                   [&](std::size_t i, unsigned) { tried[i] = best_damping(samples, candidates[i], total); });
    std::ranges::sort(tried, {}, &Candidate::residual_sum);
    std::vector<ProjectedFit> fits(std::min(refined_starts, tried.size()));
    for_each_index(fits.size(), threads, [&](std::size_t i, unsigned) {
        fits[i] = fit_projected(tried[i].model, samples, AutoregressiveNoise{}, 40);
    });
    std::optional<ProjectedFit> found;
    for (ProjectedFit& fit : fits) {
        if (!std::isfinite(fit.residual_sum) || !fit.model.parameters().allFinite()) continue;
        if (!found || fit.residual_sum < found->residual_sum) found = std::move(fit);
    }
    return found;
}

std::optional<ProjectedFit> find_ring_on_tail(const ProjectedFit& fit, const DecaySamples& samples,
                                              double guess_hz) {
    constexpr double does_not_ring = 0.8, much_better = 0.2, most_damping = 0.6;
    if (guess_hz <= 0.0 || fit.model.oscillators.front().damping_ratio() < does_not_ring) return std::nullopt;
    std::optional<ProjectedFit> best;
    for (const double damping : {0.03, 0.1, 0.25})
        for (const double over_length : {1.0, 5.0, 20.0}) {
            DecayModel start;
            start.oscillators.push_back(Oscillator::from(damping, two_pi * guess_hz));
            start.real_poles.push_back(std::log(over_length / samples.time.maxCoeff()));
            ProjectedFit tried = fit_projected(start, samples, AutoregressiveNoise{}, 40);
            const bool rings = tried.model.parameters().allFinite() &&
                               tried.model.oscillators.front().damping_ratio() < most_damping;
            if (rings && (!best || tried.residual_sum < best->residual_sum)) best = std::move(tried);
        }
    return best && best->residual_sum < much_better * fit.residual_sum ? best : std::nullopt;
}

}  // namespace ringwright::identify
