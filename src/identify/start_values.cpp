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
    const double span = samples.time.maxCoeff();
    // A guess that the record cannot tell from a peak starts the same fit.
    constexpr double apart = 0.2;  // of the width of a line
    const double guess = two_pi * guess_hz;
    const bool seen = std::ranges::any_of(
        candidates, [&](double peak) { return std::abs(peak - guess) * span < two_pi * apart; });
    if (guess_hz > 0.0 && !seen) candidates.push_back(guess);
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
    // Few columns: products of two at a time, without what a general product sets up.
    const Eigen::MatrixXd normal = columns.transpose().lazyProduct(columns);
    const VectorXd right = columns.transpose().lazyProduct(samples.value);
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

// Means of blocks within each stretch. The mean of a decaying exponential over a block of equal steps is the
// same exponential with another amplitude: the models that fit the samples fit the means.
DecaySamples averaged(const DecaySamples& samples, Index block) {
    DecaySamples means;
    means.scale = samples.scale;
    means.block = samples.block * block;
    means.step_s = samples.step_s * static_cast<double>(block);
    means.uniform = samples.uniform;
    for (const Stretch& stretch : samples.stretches) {
        const Index first = means.size(), blocks = stretch.length / block;
        if (blocks == 0) continue;
        means.stretches.push_back({first, blocks});
        means.time.conservativeResize(first + blocks);
        means.value.conservativeResize(first + blocks);
        for (Index i = 0; i < blocks; ++i) {
            means.time(first + i) = samples.time.segment(stretch.begin + i * block, block).mean();
            means.value(first + i) = samples.value.segment(stretch.begin + i * block, block).mean();
        }
    }
    return means;
}

// As coarse as the fastest candidate bears: a dozen blocks a cycle, and some hundreds in all.
Index block_to_start_with(const DecaySamples& samples, const std::vector<double>& candidates) {
    constexpr double blocks_a_cycle = 12.0;
    constexpr Index fewest_blocks = 400;
    if (!samples.uniform || candidates.empty()) return 1;
    const double cycle_s = two_pi / *std::ranges::max_element(candidates);
    const double by_rate = cycle_s / (blocks_a_cycle * samples.step_s);
    return std::max<Index>(1, std::min(static_cast<Index>(by_rate), samples.size() / fewest_blocks));
}

}  // namespace

std::optional<ProjectedFit> find_start(const DecaySamples& samples, double guess_hz,
                                       std::optional<double> near_hz, unsigned threads) {
    constexpr double rough = 1e-6;  // of the sums of squares: to tell the starts apart
    const std::vector<double> candidates = candidate_frequencies(samples, guess_hz, near_hz);
    const Index block = block_to_start_with(samples, candidates);
    const DecaySamples coarse = block > 1 ? averaged(samples, block) : samples;
    const double total = coarse.value.squaredNorm();
    std::vector<Candidate> tried(candidates.size());
    for_each_index(tried.size(), threads,
                   [&](std::size_t i, unsigned) { tried[i] = best_damping(coarse, candidates[i], total); });
    std::ranges::sort(tried, {}, &Candidate::residual_sum);
    std::vector<ProjectedFit> fits(std::min(refined_starts, tried.size()));
    for_each_index(fits.size(), threads, [&](std::size_t i, unsigned) {
        fits[i] = fit_projected(tried[i].model, coarse, AutoregressiveNoise{}, 40, rough);
    });
    std::optional<ProjectedFit> found;
    for (ProjectedFit& fit : fits) {
        if (!std::isfinite(fit.residual_sum) || !fit.model.parameters().allFinite()) continue;
        if (!found || fit.residual_sum < found->residual_sum) found = std::move(fit);
    }
    if (found) found = fit_projected(found->model, samples, AutoregressiveNoise{}, 40);
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
