#include "ringwright/repeats.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "ringwright/distributions.hpp"
#include "ringwright/pooling.hpp"

namespace ringwright {
namespace {

constexpr std::size_t fewest_releases = 4;

/// Values on the scale of the test and weights of pooling, up to a common factor.
struct WeightedValues {
    std::vector<double> values, weights;
    bool logarithmic = false;
};

WeightedValues weighted_values(const std::vector<Estimate>& releases) {
    WeightedValues result;
    result.logarithmic =
        std::ranges::all_of(releases, [](const Estimate& release) { return release.value > 0.0; });
    // The confidence level plays no part in the between-release variance.
    const double between = pool_repeats(releases, 0.95).between_standard_deviation;
    for (const Estimate& release : releases) {
        const double scale = result.logarithmic ? release.value : 1.0;
        result.values.push_back(result.logarithmic ? std::log(release.value) : release.value);
        result.weights.push_back(
            scale * scale /
            (release.standard_uncertainty * release.standard_uncertainty + between * between));
    }
    return result;
}

double weighted_mean(const std::vector<double>& values, const std::vector<double>& weights) {
    return std::inner_product(values.begin(), values.end(), weights.begin(), 0.0) /
           std::accumulate(weights.begin(), weights.end(), 0.0);
}

TrendTest test_trend(const std::vector<Estimate>& releases, const std::vector<double>& regressor) {
    if (releases.size() < fewest_releases) return {};
    const WeightedValues data = weighted_values(releases);
    const double mean_x = weighted_mean(regressor, data.weights);
    const double mean_y = weighted_mean(data.values, data.weights);
    double xx = 0.0, xy = 0.0, yy = 0.0;
    for (std::size_t i = 0; i < releases.size(); ++i) {
        const double x = regressor[i] - mean_x, y = data.values[i] - mean_y;
        xx += data.weights[i] * x * x;
        xy += data.weights[i] * x * y;
        yy += data.weights[i] * y * y;
    }
    if (!(xx > 0.0)) return {};
    const double slope = xy / xx;
    const double degrees_of_freedom = static_cast<double>(releases.size() - 2);
    const double residual = std::max(yy - slope * xy, 0.0) / degrees_of_freedom;
    const auto [least, most] = std::ranges::minmax(regressor);
    TrendTest test{true, slope * (most - least) / (data.logarithmic ? 1.0 : std::abs(mean_y)), 1.0};
    if (residual > 0.0)
        test.p_value =
            2.0 * student_t_probability(-std::abs(slope) / std::sqrt(residual / xx), degrees_of_freedom);
    return test;
}

/// The release farthest out and the chance of one as far out among true repeats.
struct Farthest {
    std::size_t index = 0;
    double p_value = 1.0;
};

Farthest farthest_release(const std::vector<Estimate>& releases) {
    const WeightedValues data = weighted_values(releases);
    const double total = std::accumulate(data.weights.begin(), data.weights.end(), 0.0);
    const double mean = weighted_mean(data.values, data.weights);
    const double count = static_cast<double>(releases.size());
    double squares = 0.0;
    for (std::size_t i = 0; i < releases.size(); ++i)
        squares += data.weights[i] * (data.values[i] - mean) * (data.values[i] - mean);
    Farthest farthest;
    for (std::size_t i = 0; i < releases.size(); ++i) {
        const double own = data.weights[i] * (data.values[i] - mean) * (data.values[i] - mean) /
                           (1.0 - data.weights[i] / total);
        const double others = std::max(squares - own, 0.0) / (count - 2.0);
        if (!(own > 0.0)) continue;
        const double p_value =
            others > 0.0
                ? std::min(1.0, count * 2.0 * student_t_probability(-std::sqrt(own / others), count - 2.0))
                : 0.0;
        if (p_value < farthest.p_value) farthest = {i, p_value};
    }
    return farthest;
}

std::string percent(double part) {
    return fmt::format("{:.2g} %", 100.0 * std::abs(part));
}

void add_trends(Findings& findings, const ReleaseSeries& series) {
    const TrendTest drift = test_drift(series), amplitude = test_amplitude_dependence(series);
    const bool drifts = drift.tested && drift.p_value < repeats_false_alarm_rate;
    const bool depends = amplitude.tested && amplitude.p_value < repeats_false_alarm_rate;
    const auto direction = [](double change) { return change > 0.0 ? "rises" : "falls"; };
    const char* both = drifts && depends
                           ? " The amplitude changed with the release number too, so the two causes "
                             "cannot be told apart; vary the amplitude in mixed order."
                           : "";
    if (drifts && (!depends || drift.p_value <= amplitude.p_value))
        findings.push_back(
            {"drift_in_series", Severity::caution,
             fmt::format("The {} {} by {} from the first release to the last (p = {:.2g}), so the "
                         "article may have changed during the series: warmed, settled or worked loose.{}",
                         series.name, direction(drift.relative_change), percent(drift.relative_change),
                         drift.p_value, both)});
    else if (depends)
        findings.push_back(
            {"amplitude_dependent", Severity::caution,
             fmt::format("The {} {} by {} from the weakest release to the strongest (p = {:.2g}), so "
                         "it may depend on amplitude; state the amplitude with the result.{}",
                         series.name, direction(amplitude.relative_change),
                         percent(amplitude.relative_change), amplitude.p_value, both)});
}

void add_outliers(Findings& findings, const ReleaseSeries& series) {
    for (const std::size_t index : outlying_releases(series))
        findings.push_back(
            {"outlying_release", Severity::caution,
             fmt::format(
                 "{} stands apart from the others in {}; it is included in the result. Look at it, and "
                 "leave it out by hand only for a cause that you know (a slip, a second knock)",
                 series.labels[index], series.name)});
}

}  // namespace

TrendTest test_drift(const ReleaseSeries& series) {
    std::vector<double> number(series.releases.size());
    std::iota(number.begin(), number.end(), 1.0);
    return test_trend(series.releases, number);
}

TrendTest test_amplitude_dependence(const ReleaseSeries& series) {
    if (series.amplitudes.size() != series.releases.size() || series.amplitudes.empty()) return {};
    const auto [least, most] = std::ranges::minmax(series.amplitudes);
    if (!(least > 0.0) || most < 1.1 * least) return {};
    std::vector<double> log_amplitudes;
    for (const double amplitude : series.amplitudes) log_amplitudes.push_back(std::log(amplitude));
    return test_trend(series.releases, log_amplitudes);
}

std::vector<std::size_t> outlying_releases(const ReleaseSeries& series) {
    std::vector<Estimate> kept = series.releases;
    std::vector<std::size_t> index(kept.size());
    std::iota(index.begin(), index.end(), std::size_t{0});
    std::vector<std::size_t> outlying;
    const std::size_t most = kept.size() / 4;
    while (kept.size() >= fewest_releases && outlying.size() < most) {
        const Farthest farthest = farthest_release(kept);
        if (farthest.p_value >= repeats_false_alarm_rate) break;
        outlying.push_back(index[farthest.index]);
        kept.erase(kept.begin() + static_cast<std::ptrdiff_t>(farthest.index));
        index.erase(index.begin() + static_cast<std::ptrdiff_t>(farthest.index));
    }
    std::ranges::sort(outlying);
    return outlying;
}

Findings examine_repeats(const ReleaseSeries& series, double confidence_level) {
    Findings findings;
    if (series.releases.size() < 2) return findings;
    const Pooled pooled = pool_repeats(series.releases, confidence_level, PoolingScale::logarithmic);
    if (pooled.heterogeneity_p_value < repeats_false_alarm_rate)
        findings.push_back(
            {"repeats_scatter", Severity::note,
             fmt::format("The releases differ in {} by more than the noise in each explains: scatter between "
                         "releases {} (standard deviation), included in the interval",
                         series.name, percent(pooled.between_standard_deviation / pooled.estimate.value))});
    add_trends(findings, series);
    add_outliers(findings, series);
    return findings;
}

}  // namespace ringwright
