// Isolated spikes in a decay: found in the residuals at full sampling rate and replaced.

#include <fmt/format.h>

#include <Eigen/QR>
#include <algorithm>
#include <bit>
#include <cmath>
#include <cstdint>
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

// The model at full sampling rate, a piece of the window at a time: columns for all of a long window would
// take ten times its memory.
class FullRate {
  public:
    explicit FullRate(const CurveFit& fit) : window_(fit.window), model_(fit.fit.model) {
        span_ = std::max(window_.time_of(window_.size() - 1), 1.0 / window_.rate_hz);
        // The fit's coefficients hold for block means; at full rate they are solved anew.
        coefficients_ = size() <= piece
                            ? solve_linear(model_, samples(0, size()), AutoregressiveNoise{}).coefficients
                            : solved_in_pieces();
    }

    [[nodiscard]] VectorXd residual() const {
        VectorXd all(size());
        for (Index at = 0; at < size(); at += piece) {
            const Index count = std::min(piece, size() - at);
            all.segment(at, count) = value(at, count) - columns(at, count) * coefficients_;
        }
        return all;
    }

  private:
    static constexpr Index piece = 16384;

    [[nodiscard]] Index size() const { return static_cast<Index>(window_.size()); }

    [[nodiscard]] Eigen::Map<const VectorXd> value(Index begin, Index count) const {
        return {window_.value.data() + begin, count};
    }

    [[nodiscard]] DecaySamples samples(Index begin, Index count) const {
        DecaySamples part;
        part.time.resize(count);
        for (Index i = 0; i < count; ++i) part.time(i) = window_.time_of(static_cast<std::size_t>(begin + i));
        part.step_s = 1.0 / window_.rate_hz;
        part.value = value(begin, count);
        part.stretches = {{0, count}};
        return part;
    }

    [[nodiscard]] Eigen::MatrixXd columns(Index begin, Index count) const {
        const DecaySamples part = samples(begin, count);
        Eigen::MatrixXd all = linear_columns(model_, part);
        // The drift runs to 1 at the end of the window, not of the piece.
        if (model_.drift) all.col(1) *= std::max(part.time.maxCoeff(), part.step_s) / span_;
        return all;
    }

    // The triangle of all pieces from that of those before and one more (sequential QR; Golub & Van Loan,
    // Matrix Computations, 4th ed., 5.2 and 6.5): the same least squares as that of all rows at once.
    [[nodiscard]] VectorXd solved_in_pieces() const {
        const Index width = model_.linear_count() + 1;
        Eigen::MatrixXd triangle = Eigen::MatrixXd::Zero(width, width);
        for (Index at = 0; at < size(); at += piece) {
            const Index count = std::min(piece, size() - at);
            Eigen::MatrixXd rows(width + count, width);
            rows.topRows(width) = triangle;
            rows.bottomLeftCorner(count, width - 1) = columns(at, count);
            rows.bottomRightCorner(count, 1) = value(at, count);
            const Eigen::HouseholderQR<Eigen::Ref<Eigen::MatrixXd>> factor(rows);
            triangle = rows.topRows(width).triangularView<Eigen::Upper>();
        }
        return triangle.topLeftCorner(width - 1, width - 1)
            .triangularView<Eigen::Upper>()
            .solve(triangle.topRightCorner(width - 1, 1));
    }

    const DecayWindow& window_;
    const DecayModel& model_;
    double span_ = 1.0;
    VectorXd coefficients_;
};

VectorXd residual_at_full_rate(const CurveFit& fit) {
    return FullRate(fit).residual();
}

// The value at place size/2 of the sizes in order, found among those that share its leading 16 bits: the bits
// of positive numbers stand in the order of the numbers.
double median_size(const VectorXd& values) {
    const auto leading = [](double v) { return std::bit_cast<std::uint64_t>(std::abs(v)) >> 48U; };
    std::vector<std::size_t> counts(std::size_t{1} << 16U, 0);
    for (const double v : values) ++counts[leading(v)];
    std::size_t bin = 0, before = 0;
    const auto middle = static_cast<std::size_t>(values.size() / 2);
    while (before + counts[bin] <= middle) before += counts[bin++];
    std::vector<double> sharing;
    sharing.reserve(counts[bin]);
    for (const double v : values)
        if (leading(v) == bin) sharing.push_back(std::abs(v));
    const auto place = sharing.begin() + static_cast<std::ptrdiff_t>(middle - before);
    std::nth_element(sharing.begin(), place, sharing.end());
    return *place;
}

double robust_deviation(const VectorXd& residual) {
    return median_size(residual) / 0.6744897501960817;
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
        fit.window.value.add_to(spike, around - residual(static_cast<Index>(spike)));
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
