#include "identify/residual_checks.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

double autocorrelation(const VectorXd& x, Index lag) {
    return x.head(x.size() - lag).dot(x.tail(x.size() - lag)) / x.squaredNorm();
}

// Ljung and Box's statistic.
double portmanteau(const VectorXd& x, Index lags) {
    const auto n = static_cast<double>(x.size());
    double sum = 0.0;
    for (Index lag = 1; lag <= lags; ++lag) {
        const double r = autocorrelation(x, lag);
        sum += r * r / (n - static_cast<double>(lag));
    }
    return n * (n + 2.0) * sum;
}

// Share of white normal series as long as this one whose statistic is larger. Its chi-squared limit is
// reached slowly: of 100 values, 2.2 % are beyond its 1 % point at 15 lags.
double share_of_white_beyond(double statistic, Index size, Index lags) {
    constexpr int draws = 2000;
    boost::random::mt19937_64 generator(20260401);
    boost::random::normal_distribution<double> normal;
    VectorXd x(size);
    int beyond = 0;
    for (int i = 0; i < draws; ++i) {
        for (double& value : x) value = normal(generator);
        beyond += portmanteau(x, lags) > statistic;
    }
    return static_cast<double>(beyond) / draws;
}

// The noise model has spent its order on the first lags.
double whiteness_p_value(const CurveFit& fit) {
    constexpr Index lags_tested = 15, many = 2000;  // values, of which the limit holds
    constexpr double not_suspicious = 0.05;
    const VectorXd& x = fit.innovations;
    const Index order = fit.noise.noise.order(), lags = std::min<Index>(order + lags_tested, x.size() / 4);
    const double statistic = portmanteau(x, lags);
    const double limit = 1.0 - chi_squared_probability(statistic, static_cast<double>(lags - order));
    if (limit > not_suspicious || x.size() > many) return limit;
    return share_of_white_beyond(statistic, x.size(), lags - order);
}

double normality_p_value(const VectorXd& x) {
    const auto n = static_cast<double>(x.size());
    const Eigen::ArrayXd centred = x.array() - x.mean();
    const double variance = centred.square().mean();
    const double skewness = centred.cube().mean() / std::pow(variance, 1.5);
    const double excess = centred.square().square().mean() / (variance * variance) - 3.0;
    return 1.0 - chi_squared_probability(n / 6.0 * (skewness * skewness + excess * excess / 4.0), 2.0);
}

// Spearman-like: correlation of |innovation| with the amplitude of the decay.
double trend_statistic(const CurveFit& fit) {
    const Eigen::ArrayXd size = fit.innovations.array().abs();
    const Eigen::ArrayXd envelope = (-fit.oscillator().slowest_rate() * fit.samples.time.array()).exp();
    const Eigen::ArrayXd a = size - size.mean(), b = envelope - envelope.mean();
    const double correlation = (a * b).sum() / std::sqrt(a.square().sum() * b.square().sum() + 1e-300);
    return correlation * std::sqrt(static_cast<double>(size.size()));
}

}  // namespace

Findings check_residuals(const CurveFit& fit) {
    Findings findings;
    if (fit.innovations.size() < 40) return findings;
    if (whiteness_p_value(fit) < residual_check_level)
        findings.push_back(
            {"residuals_not_white", Severity::note,
             "What the fit leaves over is not explained by the noise model; another mode or a drift may lie "
             "under the decay. Look at the residuals."});
    if (fit.innovations.size() >= 200 && normality_p_value(fit.innovations) < residual_check_level / 2.5)
        findings.push_back({"residuals_not_normal", Severity::note,
                            "The noise is not normally distributed (spikes, steps or coarse resolution)."});
    if (std::abs(trend_statistic(fit)) > normal_quantile(1.0 - residual_check_level / 2.0))
        findings.push_back(
            {"residuals_follow_amplitude", Severity::caution,
             "What the fit leaves over changes with the amplitude of the decay: the damping or the stiffness "
             "may depend on amplitude."});
    return findings;
}

}  // namespace ringwright::identify
