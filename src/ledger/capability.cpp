#include <algorithm>
#include <cmath>

#include "ringwright/distributions.hpp"
#include "ringwright/quality_statistics.hpp"

namespace ringwright {
namespace {

double overall_deviation(const std::vector<double>& values, double mean) {
    double squares = 0.0;
    for (const double value : values) squares += (value - mean) * (value - mean);
    return std::sqrt(squares / static_cast<double>(values.size() - 1));
}

/// Distance of the mean from the nearer limit in three sigma.
double nearer_limit(double mean, double sigma, std::optional<double> lower, std::optional<double> upper) {
    double index = HUGE_VAL;
    if (lower) index = std::min(index, (mean - *lower) / (3.0 * sigma));
    if (upper) index = std::min(index, (*upper - mean) / (3.0 * sigma));
    return index;
}

}  // namespace

double moving_range_degrees_of_freedom(std::size_t count) {
    const auto n = static_cast<double>(count);
    return (n - 1.0) * (n - 1.0) / (2.0 * (0.826445 * n - 1.082094));
}

CapabilityIndex capability_interval(double cp, double degrees_of_freedom, double confidence_level) {
    const double tail = (1.0 - confidence_level) / 2.0;
    const auto end = [&](double probability) {
        return cp * std::sqrt(chi_squared_quantile(probability, degrees_of_freedom) / degrees_of_freedom);
    };
    return {cp, {end(tail), end(1.0 - tail)}};
}

CapabilityIndex centred_capability_interval(double cpk, double count, double degrees_of_freedom,
                                            double confidence_level) {
    const double z = normal_quantile(0.5 + confidence_level / 2.0);
    const double half_width = z * std::sqrt(1.0 / (9.0 * count) + cpk * cpk / (2.0 * degrees_of_freedom));
    return {cpk, {cpk - half_width, cpk + half_width}};
}

std::optional<Capability> capability(const std::vector<double>& values, std::optional<double> lower,
                                     std::optional<double> upper, double confidence_level) {
    if (values.size() < 2 || (!lower && !upper)) return std::nullopt;
    const IndividualsChart chart = individuals_chart(values);
    Capability answer;
    answer.count = values.size();
    answer.mean = chart.center;
    answer.within_sigma = chart.sigma;
    answer.overall_sigma = overall_deviation(values, chart.center);
    if (!(answer.within_sigma > 0.0) || !(answer.overall_sigma > 0.0)) return std::nullopt;
    answer.within_degrees_of_freedom = moving_range_degrees_of_freedom(values.size());
    const auto count = static_cast<double>(values.size());
    const double within = answer.within_degrees_of_freedom, overall = count - 1.0;
    if (lower && upper) {
        const double width = *upper - *lower;
        answer.cp = capability_interval(width / (6.0 * answer.within_sigma), within, confidence_level);
        answer.pp = capability_interval(width / (6.0 * answer.overall_sigma), overall, confidence_level);
    }
    answer.cpk = centred_capability_interval(nearer_limit(answer.mean, answer.within_sigma, lower, upper),
                                             count, within, confidence_level);
    answer.ppk = centred_capability_interval(nearer_limit(answer.mean, answer.overall_sigma, lower, upper),
                                             count, overall, confidence_level);
    return answer;
}

}  // namespace ringwright
