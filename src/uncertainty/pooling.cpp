#include "ringwright/pooling.hpp"

#include <algorithm>
#include <boost/math/special_functions/digamma.hpp>
#include <boost/math/special_functions/polygamma.hpp>
#include <boost/math/special_functions/trigamma.hpp>
#include <cassert>
#include <cmath>

#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

/// What is pooled, on the scale on which it is pooled.
struct Repeats {
    std::vector<double> values, variances, degrees_of_freedom;
    [[nodiscard]] std::size_t count() const { return values.size(); }
};

bool fits_logarithmic(const std::vector<Estimate>& releases) {
    return std::ranges::all_of(releases, [](const Estimate& release) {
        return release.value > 0.0 && release.standard_uncertainty < 0.5 * release.value;
    });
}

Repeats on_scale(const std::vector<Estimate>& releases, PoolingScale scale) {
    Repeats repeats;
    for (const Estimate& release : releases) {
        const bool logarithmic = scale == PoolingScale::logarithmic;
        const double uncertainty =
            logarithmic ? release.standard_uncertainty / release.value : release.standard_uncertainty;
        repeats.values.push_back(logarithmic ? std::log(release.value) : release.value);
        repeats.variances.push_back(uncertainty * uncertainty);
        // Beyond this the chi-squared of a variance is a point for every purpose here.
        repeats.degrees_of_freedom.push_back(std::clamp(release.degrees_of_freedom, 0.5, 1e12));
    }
    return repeats;
}

double mean_of(const std::vector<double>& values) {
    double sum = 0.0;
    for (const double value : values) sum += value;
    return sum / static_cast<double>(values.size());
}

double variance_of(const std::vector<double>& values) {
    const double mean = mean_of(values);
    double sum = 0.0;
    for (const double value : values) sum += (value - mean) * (value - mean);
    return sum / static_cast<double>(values.size() - 1);
}

/// x with trigamma(x) = y, by Newton's method on 1/trigamma, which is nearly straight (Smyth 2004, appendix).
double inverse_trigamma(double y) {
    double x = 0.5 + 1.0 / y;
    for (int step = 0; step < 50; ++step) {
        const double trigamma = boost::math::trigamma(x);
        const double change = trigamma * (1.0 - trigamma / y) / boost::math::polygamma(2, x);
        x += change;
        if (std::abs(change) < 1e-10 * x) break;
    }
    return x;
}

/// Variances drawn towards their common value (Smyth 2004, section 6.2): the scatter of ln u² beyond what the
/// degrees of freedom explain tells how far each is to be believed.
std::vector<double> moderated_variances(const Repeats& repeats) {
    std::vector<double> log_variances, explained;
    for (std::size_t i = 0; i < repeats.count(); ++i) {
        const double half_df = repeats.degrees_of_freedom[i] / 2.0;
        log_variances.push_back(std::log(repeats.variances[i]) - boost::math::digamma(half_df) +
                                std::log(half_df));
        explained.push_back(boost::math::trigamma(half_df));
    }
    const double excess = variance_of(log_variances) - mean_of(explained);
    std::vector<double> moderated(repeats.count());
    // Scatter of 1e-6 in ln u² is a part in a thousand in u: nothing that weights can feel.
    const bool alike = excess < 1e-6;
    const double prior_df = alike ? 0.0 : 2.0 * inverse_trigamma(excess);
    const double prior_variance =
        alike ? 0.0
              : std::exp(mean_of(log_variances) + boost::math::digamma(prior_df / 2.0) -
                         std::log(prior_df / 2.0));
    double weighted = 0.0, total_df = 0.0;
    for (std::size_t i = 0; i < repeats.count(); ++i) {
        weighted += repeats.degrees_of_freedom[i] * repeats.variances[i];
        total_df += repeats.degrees_of_freedom[i];
    }
    for (std::size_t i = 0; i < repeats.count(); ++i) {
        const double df = repeats.degrees_of_freedom[i];
        moderated[i] = alike ? weighted / total_df
                             : (prior_df * prior_variance + df * repeats.variances[i]) / (prior_df + df);
    }
    return moderated;
}

/// Variances no more uneven than 3 : 1 in standard uncertainty, the small ones raised. Beyond that the result
/// hangs on one release whose between-release part is unknown, and coverage was measured to fall to 91.5 %
/// (docs/decisions/pooling.md).
std::vector<double> evened_variances(std::vector<double> variances) {
    constexpr double most_uneven = 3.0;
    const double least = *std::ranges::max_element(variances) / (most_uneven * most_uneven);
    for (double& variance : variances) variance = std::max(variance, least);
    return variances;
}

struct WeightedMean {
    double mean = 0.0;
    double weight_sum = 0.0;
    double weighted_squares = 0.0;  ///< Σ w (x − mean)²
};

WeightedMean weighted_mean(const Repeats& repeats, double between_variance) {
    WeightedMean result;
    for (std::size_t i = 0; i < repeats.count(); ++i) {
        const double weight = 1.0 / (repeats.variances[i] + between_variance);
        result.weight_sum += weight;
        result.mean += weight * repeats.values[i];
    }
    result.mean /= result.weight_sum;
    for (std::size_t i = 0; i < repeats.count(); ++i) {
        const double deviation = repeats.values[i] - result.mean;
        result.weighted_squares += deviation * deviation / (repeats.variances[i] + between_variance);
    }
    return result;
}

/// The between-release variance at which Σ w (x − x̄)² equals n − 1; it falls as the variance grows, so
/// bisection finds it.
double mandel_paule_variance(const Repeats& repeats) {
    const double target = static_cast<double>(repeats.count() - 1);
    if (weighted_mean(repeats, 0.0).weighted_squares <= target) return 0.0;
    double low = 0.0;
    double high = variance_of(repeats.values);
    while (weighted_mean(repeats, high).weighted_squares > target) high *= 2.0;
    for (int step = 0; step < 200 && high - low > 1e-13 * high; ++step) {
        const double middle = 0.5 * (low + high);
        (weighted_mean(repeats, middle).weighted_squares > target ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

/// Variance of the mean after Hartung & Knapp, not below what a Q at its 5 % point would give.
double variance_of_mean(const WeightedMean& pooled, const WeightedMean& homogeneous,
                        double degrees_of_freedom) {
    const double from_scatter = pooled.weighted_squares / (degrees_of_freedom * pooled.weight_sum);
    const double least =
        chi_squared_quantile(0.05, degrees_of_freedom) / (degrees_of_freedom * homogeneous.weight_sum);
    return std::max(from_scatter, least);
}

/// Probability of a Cochran's Q as large as this were there no scatter between releases; Q over its degrees
/// of freedom follows F where the releases' own variances are themselves estimates, chi-squared where they
/// are known.
double heterogeneity(double q, const Repeats& repeats) {
    const double degrees_of_freedom = static_cast<double>(repeats.count() - 1);
    double within_df = 0.0;
    for (const double df : repeats.degrees_of_freedom) within_df += df;
    if (within_df > 1e6) return 1.0 - chi_squared_probability(q, degrees_of_freedom);
    return 1.0 - f_probability(q / degrees_of_freedom, degrees_of_freedom, within_df);
}

Estimate back_from_scale(double mean, double uncertainty, double degrees_of_freedom, double confidence_level,
                         PoolingScale scale) {
    const double half_width = student_t_factor(confidence_level, degrees_of_freedom) * uncertainty;
    if (scale == PoolingScale::linear)
        return {mean, uncertainty, {mean - half_width, mean + half_width}, degrees_of_freedom};
    const double value = std::exp(mean);
    return {value,
            value * uncertainty,
            {value * std::exp(-half_width), value * std::exp(half_width)},
            degrees_of_freedom};
}

}  // namespace

Pooled pool_repeats(const std::vector<Estimate>& releases, double confidence_level, PoolingScale scale) {
    assert(!releases.empty());
    if (releases.size() == 1) return {releases.front(), 0.0, 1.0, releases.front().standard_uncertainty};
    if (!fits_logarithmic(releases)) scale = PoolingScale::linear;

    Repeats repeats = on_scale(releases, scale);
    repeats.variances = moderated_variances(repeats);
    const double degrees_of_freedom = static_cast<double>(repeats.count() - 1);
    const WeightedMean homogeneous = weighted_mean(repeats, 0.0);
    repeats.variances = evened_variances(std::move(repeats.variances));
    const double between_variance = mandel_paule_variance(repeats);
    const WeightedMean pooled = weighted_mean(repeats, between_variance);
    const double uncertainty = std::sqrt(variance_of_mean(pooled, homogeneous, degrees_of_freedom));

    Pooled result;
    result.estimate = back_from_scale(pooled.mean, uncertainty, degrees_of_freedom, confidence_level, scale);
    const double unit = scale == PoolingScale::logarithmic ? result.estimate.value : 1.0;
    result.between_standard_deviation = std::sqrt(between_variance) * unit;
    result.heterogeneity_p_value = heterogeneity(homogeneous.weighted_squares, repeats);
    result.within_standard_uncertainty =
        std::min(uncertainty, std::sqrt(1.0 / homogeneous.weight_sum)) * unit;
    return result;
}

}  // namespace ringwright
