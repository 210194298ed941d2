#include "identify/quiet_noise.hpp"

#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <numbers>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double false_alarm = 1e-3;
constexpr Index fewest_rows = 20;
constexpr std::size_t fewest_samples = 400;  // wanted, where the recording has them
constexpr double margin_in_periods = 0.1;    // before the decay: the release itself

// 1, t, …, t^degree on [−1, 1], then cos and sin of each tone.
MatrixXd smooth_columns(const DecaySamples& samples, const std::vector<double>& tones, Index degree) {
    const Index n = samples.size();
    const double half = 0.5 * (samples.time(n - 1) - samples.time(0));
    const Eigen::ArrayXd x = (samples.time.array() - samples.time(0) - half) / std::max(half, 1e-300);
    MatrixXd columns(n, degree + 1 + static_cast<Index>(2 * tones.size()));
    columns.col(0).setOnes();
    for (Index d = 1; d <= degree; ++d) columns.col(d) = columns.col(d - 1).array() * x;
    Index at = degree + 1;
    for (const double tone : tones) {
        const Eigen::ArrayXd phase = std::exp(tone) * samples.time.array();
        columns.col(at++) = phase.cos();
        columns.col(at++) = phase.sin();
    }
    return columns;
}

double whitened_residual_sum(const CurveFit& fit, const DecaySamples& quiet, const MatrixXd& columns) {
    MatrixXd design = columns;
    VectorXd response = quiet.value;
    whiten(fit.noise.noise, quiet.stretches, design);
    whiten(fit.noise.noise, quiet.stretches, response);
    const Eigen::HouseholderQR<MatrixXd> factor(design);
    response.applyOnTheLeft(factor.householderQ().adjoint());
    return response.tail(response.size() - design.cols()).squaredNorm();
}

DecaySamples scaled_like_decay(const CurveFit& fit, const DecayWindow& window) {
    DecaySamples quiet = block_means(window, fit.samples.block);
    if (quiet.size() == 0) return quiet;
    quiet.value *= quiet.scale / fit.samples.scale;
    quiet.value.array() -= quiet.value.mean();
    return quiet;
}

bool is_noise_of_decay(const CurveFit& fit, const DecaySamples& quiet) {
    constexpr Index level_and_slope = 1, bent = 3;
    const MatrixXd columns = smooth_columns(quiet, fit.fit.model.tones, level_and_slope);
    const MatrixXd more = smooth_columns(quiet, fit.fit.model.tones, bent);
    const double sum = whitened_residual_sum(fit, quiet, columns),
                 less = whitened_residual_sum(fit, quiet, more);
    const auto freedom = static_cast<double>(quiet.size() - columns.cols());
    const double ratio = sum / freedom / fit.noise.noise.innovation_variance;
    if (!std::isfinite(ratio)) return false;
    const double below = f_probability(ratio, freedom, fit.noise.degrees_of_freedom);
    if (below < false_alarm / 2.0 || below > 1.0 - false_alarm / 2.0) return false;
    const auto added = static_cast<double>(more.cols() - columns.cols());
    const double bend = (sum - less) / added / (less / (freedom - added));
    return std::isfinite(bend) && f_probability(bend, added, freedom - added) < 1.0 - false_alarm;
}

}  // namespace

QuietRows quiet_rows(const CurveFit& fit) {
    QuietRows rows;
    const DecaySamples quiet = scaled_like_decay(fit, fit.quiet);
    if (quiet.size() < fewest_rows || quiet.stretches.size() != 1) return rows;
    rows.value = quiet.value;
    rows.design = smooth_columns(quiet, fit.fit.model.tones, 1);
    return rows;
}

DecayWindow find_quiet(const CurveFit& fit, const Recording& recording, const Event& event) {
    const double period = 2.0 * std::numbers::pi / fit.oscillator().angular_frequency();
    const auto margin =
        static_cast<std::size_t>(std::ceil(margin_in_periods * period * fit.window.rate_hz)) + 1;
    std::size_t end = fit.window.begin > margin ? std::min(event.begin, fit.window.begin - margin) : 0;
    if (event.quiet_end > event.quiet_begin) end = std::min(end, event.quiet_end);
    end = end > margin ? end - margin : 0;
    const std::size_t wanted = std::max(event.end - event.begin, fewest_samples);
    for (std::size_t length = std::min(end, wanted);
         static_cast<Index>(length) >= fewest_rows * fit.samples.block; length /= 2) {
        const DecayWindow window = cut_window(recording, end - length, end);
        const DecaySamples quiet = scaled_like_decay(fit, window);
        if (quiet.size() >= fewest_rows && quiet.stretches.size() == 1 && is_noise_of_decay(fit, quiet))
            return window;
    }
    return {};
}

}  // namespace ringwright::identify
