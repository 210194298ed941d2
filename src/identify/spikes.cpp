// Isolated spikes in a decay: found in the residuals at full sampling rate and replaced.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "identify/curve_fit_steps.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double spike_limit = 7.0;  // robust standard deviations: 1e-11 a sample for Gaussian noise
constexpr double largest_share = 0.01;
constexpr std::size_t longest_spike = 3;  // samples

VectorXd residual_at_full_rate(const CurveFit& fit) {
    DecaySamples full;
    const auto n = static_cast<Index>(fit.window.size());
    full.time.resize(n);
    for (Index i = 0; i < n; ++i) full.time(i) = fit.window.time_of(static_cast<std::size_t>(i));
    full.step_s = 1.0 / fit.window.rate_hz;
    // The fit's coefficients hold for block means; at full rate they are solved anew.
    DecayWindow unclipped = fit.window;
    full.value = Eigen::Map<const VectorXd>(unclipped.value.data(), n);
    full.stretches = {{0, n}};
    const ProjectedFit solved = solve_linear(fit.fit.model, full, AutoregressiveNoise{});
    return full.value - linear_columns(solved.model, full) * solved.coefficients;
}

double robust_deviation(const VectorXd& residual) {
    std::vector<double> size(residual.begin(), residual.end());
    for (double& r : size) r = std::abs(r);
    const auto middle = size.begin() + static_cast<std::ptrdiff_t>(size.size() / 2);
    std::nth_element(size.begin(), middle, size.end());
    return *middle / 0.6744897501960817;
}

std::vector<std::size_t> find_spikes(const VectorXd& residual, double limit) {
    std::vector<std::size_t> spikes;
    const auto n = static_cast<std::size_t>(residual.size());
    for (std::size_t i = 0; i < n;) {
        if (std::abs(residual(static_cast<Index>(i))) <= limit) {
            ++i;
            continue;
        }
        std::size_t end = i;
        while (end < n && std::abs(residual(static_cast<Index>(end))) > limit) ++end;
        if (i > 0 && end - i <= longest_spike)
            for (std::size_t j = i; j < end; ++j) spikes.push_back(j);
        i = end;
    }
    return spikes;
}

}  // namespace

bool replace_spikes(CurveFit& fit) {
    const VectorXd residual = residual_at_full_rate(fit);
    const double limit = spike_limit * robust_deviation(residual);
    const std::vector<std::size_t> spikes = find_spikes(residual, limit);
    if (spikes.empty() ||
        static_cast<double>(spikes.size()) > largest_share * static_cast<double>(residual.size()))
        return false;
    const auto n = residual.size();
    for (const std::size_t spike : spikes) {
        double sum = 0.0;
        int count = 0;
        for (Index j = static_cast<Index>(spike) - 4; j <= static_cast<Index>(spike) + 4; ++j) {
            if (j < 0 || j >= n || std::abs(residual(j)) > limit) continue;
            sum += residual(j);
            ++count;
        }
        const double around = count > 0 ? sum / count : 0.0;
        fit.window.value[spike] += around - residual(static_cast<Index>(spike));
    }
    fit.findings.push_back(
        {"spikes_replaced", Severity::note,
         fmt::format("{} isolated sample{} far outside the noise (the first at {:.6g} s after the "
                     "start of the decay) {} left out of the fit.",
                     spikes.size(), spikes.size() == 1 ? "" : "s", fit.window.time_of(spikes.front()),
                     spikes.size() == 1 ? "was" : "were")});
    return true;
}

}  // namespace ringwright::identify
