// A knock on the bench while the decay runs: the stretch it spoils is left out, or ends the decay.

#include <fmt/format.h>

#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <vector>

#include "identify/curve_fit_steps.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr Index looked_at = 5;          // blocks whose mean square is taken together
constexpr double loud = 9.0;            // of the robust variance: 2e-8 for five normal values
constexpr double largest_share = 0.12;  // of the blocks; more is no knock but a wrong model
constexpr std::size_t most_knocks = 3;
constexpr double same_decay_level = 1e-4;  // of the test whether the decay goes on unchanged behind a knock

struct Blocks {
    Index begin = 0, end = 0;
};

double robust_variance(const VectorXd& innovations) {
    std::vector<double> squares(static_cast<std::size_t>(innovations.size()));
    for (std::size_t i = 0; i < squares.size(); ++i)
        squares[i] = innovations(static_cast<Index>(i)) * innovations(static_cast<Index>(i));
    const auto middle = squares.begin() + static_cast<std::ptrdiff_t>(squares.size() / 2);
    std::nth_element(squares.begin(), middle, squares.end());
    constexpr double median_of_chi_squared_1 = 0.4549364231195727;
    return *middle / median_of_chi_squared_1;
}

std::vector<Blocks> loud_stretches(const VectorXd& innovations) {
    const double limit = loud * robust_variance(innovations) * static_cast<double>(looked_at);
    std::vector<Blocks> found;
    double sum = 0.0;
    for (Index i = 0; i < innovations.size(); ++i) {
        sum += innovations(i) * innovations(i);
        if (i >= looked_at) sum -= innovations(i - looked_at) * innovations(i - looked_at);
        if (i + 1 < looked_at || sum < limit) continue;
        const Index begin = i + 1 - looked_at;
        if (!found.empty() && found.back().end >= begin - looked_at)
            found.back().end = i + 1;
        else
            found.push_back({begin, i + 1});
    }
    return found;
}

// A knock rings out: its end is where five blocks are as quiet as the rest.
Blocks with_tail(const VectorXd& innovations, Blocks stretch) {
    constexpr double quiet = 1.8;  // mean square of five normal values: below it in nine of ten cases
    const double limit = quiet * robust_variance(innovations) * static_cast<double>(looked_at);
    while (stretch.end + looked_at < innovations.size() &&
           innovations.segment(stretch.end, looked_at).squaredNorm() > limit)
        ++stretch.end;
    return stretch;
}

bool is_knocks(const std::vector<Blocks>& found, const CurveFit& fit) {
    if (found.empty() || found.size() > most_knocks) return false;
    const Index rows = fit.innovations.size();
    Index blocks = 0;
    for (const Blocks& stretch : found) blocks += stretch.end - stretch.begin;
    const auto start = std::max<Index>(12, rows / 20);  // there the release itself may still go on
    return found.front().begin >= start && found.back().end + looked_at < rows &&
           static_cast<double>(blocks) < largest_share * static_cast<double>(rows);
}

// Sample of the window at which a block begins: blocks fill the runs one after another.
std::size_t sample_of_block(const CurveFit& fit, Index block) {
    const auto width = static_cast<std::size_t>(fit.samples.block);
    for (const SampleRange& run : fit.window.runs) {
        const auto blocks = static_cast<Index>((run.end - run.begin) / width);
        if (block < blocks) return run.begin + static_cast<std::size_t>(block) * width;
        block -= blocks;
    }
    return fit.window.size();
}

void leave_out(DecayWindow& window, SampleRange range) {
    std::vector<SampleRange> kept;
    for (const SampleRange& run : window.runs) {
        const SampleRange before{run.begin, std::min(run.end, range.begin)},
            behind{std::max(run.begin, range.end), run.end};
        if (before.end > before.begin) kept.push_back(before);
        if (behind.end > behind.begin) kept.push_back(behind);
    }
    window.runs = std::move(kept);
}

// Whether the mode has another amplitude or phase behind block `from`: F test of two more columns, to first
// order.
bool goes_on_unchanged(const CurveFit& fit, Index from) {
    const Index behind = fit.samples.size() - from;
    if (behind < 12) return true;
    MatrixXd design(fit.basis.rows(), fit.basis.cols() + 2);
    MatrixXd step =
        linear_columns(fit.fit.model, fit.samples).middleCols(fit.fit.model.first_oscillator_column(), 2);
    step.topRows(from).setZero();
    design << fit.basis, step;
    VectorXd response = fit.residual;
    whiten(fit.noise.noise, fit.samples.stretches, design);
    whiten(fit.noise.noise, fit.samples.stretches, response);
    const auto sum_left = [&](Index columns) {
        const Eigen::HouseholderQR<MatrixXd> factor(design.leftCols(columns));
        VectorXd rotated = response;
        rotated.applyOnTheLeft(factor.householderQ().adjoint());
        return rotated.tail(rotated.size() - columns).squaredNorm();
    };
    const double less = sum_left(design.cols()), more = sum_left(fit.basis.cols());
    const auto freedom = static_cast<double>(design.rows() - design.cols());
    const double ratio = (more - less) / 2.0 / (less / freedom);
    return !std::isfinite(ratio) || f_probability(ratio, 2.0, freedom) < 1.0 - same_decay_level;
}

}  // namespace

Knocks leave_out_knocks(CurveFit& fit) {
    Knocks knocks;
    std::vector<Blocks> found = loud_stretches(fit.innovations);
    for (Blocks& stretch : found) stretch = with_tail(fit.innovations, stretch);
    if (!is_knocks(found, fit)) return knocks;
    for (const Blocks& stretch : found) {
        const SampleRange range{sample_of_block(fit, std::max<Index>(0, stretch.begin - 1)),
                                sample_of_block(fit, stretch.end + 2)};
        leave_out(fit.window, range);
        knocks.ranges.push_back(range);
    }
    return knocks;
}

std::optional<std::size_t> changed_behind(const CurveFit& fit, const Knocks& knocks) {
    for (const SampleRange& range : knocks.ranges) {
        const double end_s = fit.window.time_of(std::min(range.end, fit.window.size() - 1));
        const Index from = std::lower_bound(fit.samples.time.begin(), fit.samples.time.end(), end_s) -
                           fit.samples.time.begin();
        if (!goes_on_unchanged(fit, from)) return range.begin;
    }
    return std::nullopt;
}

Finding knock_finding(const CurveFit& fit, const Knocks& knocks, bool ends_the_decay) {
    const double begin_s = fit.window.time_of(knocks.ranges.front().begin);
    const char* what = ends_the_decay
                           ? "it moved the article too, and only what came before is used. Repeat the test"
                           : "that stretch is left out of the fit; behind it the same decay goes on";
    return {
        "knock", Severity::caution,
        fmt::format("Something knocked on the bench or the sensor {:.4g} s after the start of the decay; {}.",
                    begin_s, what)};
}

}  // namespace ringwright::identify
