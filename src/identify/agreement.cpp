#include "identify/agreement.hpp"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

struct Differences {
    VectorXd observed;
    MatrixXd replicates;  // one row a replicate
};

template <typename Reading>
void append(Differences& differences, const CurveFit& fit, const Reading& reading,
            const MethodErrors& errors) {
    const Oscillator& o = fit.oscillator();
    const auto n = static_cast<Index>(errors.errors.size());
    const Index rows = differences.replicates.rows() == 0 ? n : std::min(n, differences.replicates.rows());
    const Index columns = differences.replicates.cols();
    differences.replicates.conservativeResize(rows, columns + 2);
    differences.observed.conservativeResize(columns + 2);
    const double log_frequency = std::log(2.0 * std::numbers::pi * reading.natural_frequency_hz);
    differences.observed(columns) = log_frequency - errors.bias[0] - o.log_frequency;
    differences.observed(columns + 1) = reading.damping_ratio - errors.bias[1] - o.damping_ratio();
    for (Index i = 0; i < rows; ++i)
        for (Index k = 0; k < 2; ++k) {
            const auto row = static_cast<std::size_t>(i), column = static_cast<std::size_t>(k);
            differences.replicates(i, columns + k) =
                errors.errors[row][column] - errors.bias[column] - errors.fit_errors[row][column];
        }
}

// Two ways to the p-value, of which the larger is taken: Hotelling's T², which owns up to what is not known
// of the noise, and the rank of the observed distance among those of the replicates, which knows how skewed
// the errors of logarithms of small amplitudes are.
double p_value_of(const Differences& differences, double degrees_of_freedom) {
    const auto n = static_cast<double>(differences.replicates.rows());
    const auto q = static_cast<double>(differences.observed.size());
    const VectorXd scale = (differences.replicates.colwise().squaredNorm() / (n - 1.0)).cwiseSqrt();
    const MatrixXd scaled = differences.replicates * scale.cwiseInverse().asDiagonal();
    const VectorXd observed = differences.observed.cwiseQuotient(scale);
    const MatrixXd covariance =
        scaled.transpose() * scaled / (n - 1.0) + 1e-9 * MatrixXd::Identity(observed.size(), observed.size());
    const auto factor = covariance.ldlt();
    const double t_squared = observed.dot(factor.solve(observed));
    Index farther = 0;
    for (Index i = 0; i < scaled.rows(); ++i)
        farther += scaled.row(i).dot(factor.solve(scaled.row(i).transpose())) > t_squared;
    const double by_rank = static_cast<double>(farther) / n;
    const double freedom = std::max(q + 1.0, std::min(n - 1.0, degrees_of_freedom));
    const double f = t_squared * (freedom - q + 1.0) / (q * freedom);
    return std::max(by_rank, 1.0 - f_probability(f, q, freedom - q + 1.0));
}

bool has(const Findings& findings, std::string_view code) {
    return std::ranges::any_of(findings, [&](const Finding& f) { return f.code == code; });
}

std::string suggestion(const CurveFit& fit, const MethodBootstrap& bootstrap, const Findings& findings) {
    if (has(findings, "clipped_samples")) return "samples are clipped; lower the gain and repeat the test";
    if (has(findings, "dry_friction"))
        return "the decay quickens as it gets smaller, as dry friction makes it";
    if (has(findings, "second_mode"))
        return "another mode rings along; place the sensor or the tap so that it is not excited";
    const DecrementReading& decrement = bootstrap.readings.decrement;
    if (decrement.valid && decrement.half_cycle.size() >= 6 && decrement.bend != 0.0) {
        const double last = decrement.half_cycle.back();
        const double sag = decrement.bend * last * last / 4.0;  // of the log amplitude at mid-record
        if (sag < -0.02) return "the decay quickens as it gets smaller, as dry friction makes it";
        if (sag > 0.02)
            return "the decay slows as it gets smaller, as quadratic (orifice) damping or a second mode "
                   "makes it";
    }
    const double half = bootstrap.half_power.usable
                            ? bootstrap.readings.half_power.damping_ratio - bootstrap.half_power.bias[1]
                            : 0.0;
    if (bootstrap.half_power.usable && half > 1.05 * fit.oscillator().damping_ratio())
        return "the spectrum is broader than the decay is fast, as a frequency that moves with amplitude or "
               "a short record makes it";
    return "look at the residuals: the decay is not that of one linear mode";
}

}  // namespace

Agreement test_agreement(const CurveFit& fit, const MethodBootstrap& bootstrap, const Findings& findings) {
    Agreement agreement;
    Differences differences;
    if (bootstrap.decrement.usable)
        append(differences, fit, bootstrap.readings.decrement, bootstrap.decrement);
    if (bootstrap.half_power.usable)
        append(differences, fit, bootstrap.readings.half_power, bootstrap.half_power);
    if (differences.observed.size() == 0) {
        agreement.reading = "Only the curve fit answered, so there is nothing to compare it with.";
        return agreement;
    }
    agreement.tested = true;
    agreement.p_value = p_value_of(differences, fit.noise.degrees_of_freedom);
    agreement.consistent = agreement.p_value >= disagreement_level;
    agreement.reading = agreement.consistent
                            ? "The methods agree within their uncertainties."
                            : fmt::format("The methods disagree by more than their uncertainties allow: {}.",
                                          suggestion(fit, bootstrap, findings));
    return agreement;
}

}  // namespace ringwright::identify
