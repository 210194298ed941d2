// Isolated spikes in a decay: found in the residuals at full sampling rate and replaced.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <iterator>
#include <utility>
#include <vector>

#include "identify/curve_fit_steps.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double spike_limit = 7.0;  // robust standard deviations: 1e-11 a sample for Gaussian noise
constexpr double largest_share = 0.002;
constexpr double always_allowed = 4.0;
constexpr std::size_t longest_spike = 3;  // samples
constexpr std::size_t alone = 20;         // samples to the next one

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

// Runs of at most three samples beyond the limit that stand alone: where many stand together, the model is
// wrong there and nothing is a spike.
// A spike leaves its neighbours behind; the crest of a mode that is not yet in the model does not.
bool leaves_neighbours(const VectorXd& residual, const SampleRange& run) {
    constexpr double share = 0.6;  // of the height, above the higher of the two neighbours
    const auto n = static_cast<std::size_t>(residual.size());
    if (run.begin == 0 || run.end >= n) return true;
    const auto first = static_cast<Index>(run.begin), last = static_cast<Index>(run.end);
    const auto inside = residual.segment(first, last - first);
    const double height = inside.cwiseAbs().maxCoeff(), sign = inside.sum() > 0.0 ? 1.0 : -1.0;
    const double beside = std::max(sign * residual(first - 1), sign * residual(last));
    return height - beside > share * height;
}

std::vector<std::size_t> find_spikes(const VectorXd& residual, double limit) {
    std::vector<SampleRange> runs;
    const auto n = static_cast<std::size_t>(residual.size());
    for (std::size_t i = 0; i < n; ++i) {
        if (std::abs(residual(static_cast<Index>(i))) <= limit) continue;
        if (!runs.empty() && runs.back().end == i)
            runs.back().end = i + 1;
        else
            runs.push_back({i, i + 1});
    }
    std::vector<std::size_t> spikes;
    for (std::size_t r = 0; r < runs.size(); ++r) {
        const bool crowded = (r > 0 && runs[r].begin - runs[r - 1].end < alone) ||
                             (r + 1 < runs.size() && runs[r + 1].begin - runs[r].end < alone);
        if (crowded || runs[r].begin == 0 || runs[r].end - runs[r].begin > longest_spike) continue;
        if (!leaves_neighbours(residual, runs[r])) continue;
        for (std::size_t i = runs[r].begin; i < runs[r].end; ++i) spikes.push_back(i);
    }
    return spikes;
}

void drop_spike_finding(CurveFit& fit) {
    std::erase_if(fit.findings, [](const Finding& finding) { return finding.code == "spikes_replaced"; });
}

/// One finding for the spikes of all passes: a sample replaced twice counts once.
void tell_spikes(CurveFit& fit, const std::vector<std::size_t>& found) {
    std::vector<std::size_t> all;
    std::ranges::set_union(fit.spikes, found, std::back_inserter(all));
    fit.spikes = std::move(all);
    drop_spike_finding(fit);
    const std::size_t count = fit.spikes.size();
    fit.findings.push_back(
        {"spikes_replaced", Severity::note,
         fmt::format(
             "{} isolated sample{} far outside the noise (the first at {:.6g} s after the start of the "
             "decay) {} left out of the fit.",
             count, count == 1 ? "" : "s", fit.window.time_of(fit.spikes.front()),
             count == 1 ? "was" : "were")});
}

}  // namespace

bool replace_spikes(CurveFit& fit) {
    const VectorXd residual = residual_at_full_rate(fit);
    const double limit = spike_limit * robust_deviation(residual);
    const std::vector<std::size_t> spikes = find_spikes(residual, limit);
    if (spikes.empty() || static_cast<double>(spikes.size()) >
                              always_allowed + largest_share * static_cast<double>(residual.size()))
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
    tell_spikes(fit, spikes);
    return true;
}

void cut_again(CurveFit& fit, const Recording& recording, std::size_t begin, std::size_t end) {
    fit.window = cut_window(recording, begin, end);
    fit.spikes.clear();
    drop_spike_finding(fit);
}

}  // namespace ringwright::identify
