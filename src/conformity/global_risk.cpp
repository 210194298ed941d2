#include <boost/math/quadrature/gauss_kronrod.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/conformity.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

double below(double z) {
    return std::isinf(z) ? (z > 0 ? 1.0 : 0.0) : normal_probability(z);
}

/// Probability that a normal variable of this mean and standard deviation lies in the interval.
double share_within(const Interval& interval, double mean, double standard_deviation) {
    return below((interval.high - mean) / standard_deviation) -
           below((interval.low - mean) / standard_deviation);
}

double density(double z) {
    return std::exp(-0.5 * z * z) / std::sqrt(2.0 * std::numbers::pi);
}

}  // namespace

GlobalRisk global_risk(double production_mean, double production_standard_deviation,
                       double measurement_uncertainty, const Interval& tolerance,
                       const Interval& acceptance) {
    // z is the true value in standard deviations from the mean of the production.
    const auto accepted = [&](double z) {
        const double truth = production_mean + z * production_standard_deviation;
        return density(z) * share_within(acceptance, truth, measurement_uncertainty);
    };
    const auto integral = [&](double from, double to) {
        if (!(from < to)) return 0.0;
        return boost::math::quadrature::gauss_kronrod<double, 61>::integrate(accepted, from, to, 15, 1e-12);
    };
    const double low = (tolerance.low - production_mean) / production_standard_deviation;
    const double high = (tolerance.high - production_mean) / production_standard_deviation;
    GlobalRisk risk;
    risk.conforming = share_within(tolerance, production_mean, production_standard_deviation);
    risk.consumer = integral(-HUGE_VAL, low) + integral(high, HUGE_VAL);
    risk.producer = risk.conforming - integral(low, high);
    return risk;
}

}  // namespace ringwright
