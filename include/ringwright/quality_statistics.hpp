#pragma once
// Statistics over many results: control charts, trend, capability, gauge study.

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/estimate.hpp"

namespace ringwright {

// ---- Individuals and moving ranges ------------------------------------------------------------------------

/// Mean of the range of two standard normal values, 2/√π; standard deviation of that range, √(2 − 4/π).
/// Tables print 1.128 and 0.8525.
inline constexpr double mean_range_of_two = 1.1283791670955126;
inline constexpr double deviation_of_range_of_two = 0.8525024664274217;

/// Chart of single values in time order (e-Handbook of Statistical Methods, 6.3.2.2). Center: mean; sigma:
/// mean moving range of two divided by `mean_range_of_two`; limits at three sigma. The moving range's upper
/// limit is 1 + 3·0.8525/1.1284 = 3.2665 times its mean, its lower limit zero.
struct IndividualsChart {
    std::vector<double> values;
    std::vector<double> moving_ranges;  ///< one fewer than values
    double center = 0.0, sigma = 0.0;
    double lower_limit = 0.0, upper_limit = 0.0;
    double range_center = 0.0, range_upper_limit = 0.0;
};
/// Precondition: at least two values.
[[nodiscard]] IndividualsChart individuals_chart(std::vector<double> values);

/// Patterns that are rare in a process that is in control, named by what they mean (Nelson 1984, J. Quality
/// Technology 16(4), 237). The probabilities are those of one window of independent normal values.
enum class RunRule {
    one_beyond_three_sigma,          ///< 0.0027
    nine_on_one_side,                ///< of the center: 0.0039
    six_steadily_rising_or_falling,  ///< 0.0028
    fourteen_alternating,            ///< up and down: 0.0046
    two_of_three_beyond_two_sigma,   ///< on one side: 0.0031
    four_of_five_beyond_one_sigma,   ///< on one side: 0.0055
    fifteen_within_one_sigma,        ///< of the center: 0.0033
    eight_outside_one_sigma,         ///< on either side: 0.0001
};
/// "one point beyond three sigma" …
[[nodiscard]] std::string_view to_text(RunRule rule);
[[nodiscard]] const std::vector<RunRule>& all_run_rules();
/// The four that are usual together: beyond three sigma, nine on one side, six steadily, two of three.
[[nodiscard]] const std::vector<RunRule>& usual_run_rules();

/// A pattern that was seen: values [first, last].
struct RunSignal {
    RunRule rule = RunRule::one_beyond_three_sigma;
    std::size_t first = 0, last = 0;
};
/// Every window that shows a pattern, in the order of its last value; windows of one rule that follow each
/// other are one signal. With sigma = 0 there is none.
[[nodiscard]] std::vector<RunSignal> run_signals(const IndividualsChart& chart,
                                                 const std::vector<RunRule>& rules);

// ---- Trend ------------------------------------------------------------------------------------------------

/// Straight line through the services of one article, by least squares.
struct LinearTrend {
    Estimate slope;               ///< per unit of x
    double value_at_first = 0.0;  /// on the line at the first x
    double p_value = 1.0;         ///< of no trend, two-sided Student t
};
/// Nothing with fewer than three values or a single x.
[[nodiscard]] std::optional<LinearTrend> linear_trend(const std::vector<double>& x,
                                                      const std::vector<double>& y, double confidence_level);

// ---- Capability -------------------------------------------------------------------------------------------

/// An index with its interval.
struct CapabilityIndex {
    double value = 0.0;
    Interval interval;
};

/// Process capability against limits (e-Handbook 6.1.6). Cp and Cpk use the sigma of the moving ranges (short
/// term), Pp and Ppk the standard deviation of all values (long term). Cp and Pp need both limits. Assumes
/// independent normal values.
struct Capability {
    std::size_t count = 0;
    double mean = 0.0, within_sigma = 0.0, overall_sigma = 0.0;
    double within_degrees_of_freedom = 0.0;
    std::optional<CapabilityIndex> cp, pp;
    CapabilityIndex cpk, ppk;
};
/// Nothing with fewer than two values, without a limit or without any scatter.
[[nodiscard]] std::optional<Capability> capability(const std::vector<double>& values,
                                                   std::optional<double> lower, std::optional<double> upper,
                                                   double confidence_level);

/// Cp·√(χ²/ν) at both tails.
[[nodiscard]] CapabilityIndex capability_interval(double cp, double degrees_of_freedom,
                                                  double confidence_level);
/// Cpk ± z·√(1/(9n) + Cpk²/(2ν)) (Bissell 1990, Applied Statistics 39, 331, with ν = n − 1).
[[nodiscard]] CapabilityIndex centred_capability_interval(double cpk, double count, double degrees_of_freedom,
                                                          double confidence_level);
/// Degrees of freedom of a sigma from the mean moving range of n values: those of a standard deviation with
/// the same relative variance, (n − 1)²/(2(0.826445 n − 1.082094)) (Cryer & Ryan 1990, J. Quality Technology
/// 22, 187; the constants follow from the bivariate normal distribution of neighbouring differences).
[[nodiscard]] double moving_range_degrees_of_freedom(std::size_t count);

// ---- Analysis of variance ---------------------------------------------------------------------------------

struct VarianceRow {
    std::string source;
    double sum_of_squares = 0.0, degrees_of_freedom = 0.0, mean_square = 0.0;
    std::optional<double> f, p_value;
};

/// One-way analysis of variance. Nothing with fewer than two groups or no degree of freedom within them.
struct OneWay {
    VarianceRow between, within;
};
[[nodiscard]] std::optional<OneWay> one_way(const std::vector<std::vector<double>>& groups);

/// Standard deviation within groups, pooled, with its degrees of freedom: one level of a nested study
/// (e-Handbook 2.4.4 and 2.6).
struct PooledDeviation {
    double standard_deviation = 0.0;
    double degrees_of_freedom = 0.0;
};
[[nodiscard]] PooledDeviation pooled_deviation(const std::vector<std::vector<double>>& groups);

/// A variance with its interval, both as variances; negative estimates are shown as zero.
struct VarianceComponent {
    double variance = 0.0;
    Interval interval;
};

/// Gauge study: every operator measures every article the same number of times. Model: value = mean + article
/// + operator + article × operator + repeat, all random.
struct GaugeStudy {
    std::size_t articles = 0, operators = 0, repeats = 0;
    std::vector<VarianceRow> table;       ///< article, operator, article × operator, repeat
    VarianceComponent repeatability;      ///< of repeats
    VarianceComponent operators_alone;    ///< of operators
    VarianceComponent interaction;        ///< of articles with operators
    VarianceComponent reproducibility;    ///< of operators and interaction
    VarianceComponent gauge;              ///< repeatability and reproducibility
    VarianceComponent article_variation;  ///< of articles
    double gauge_share = 0.0;             ///< σ(gauge)/σ(total)
    double distinct_classes = 0.0;        ///< √2 σ(article)/σ(gauge)
};

/// `values[article][operator][repeat]`. Expected mean squares after Montgomery & Runger (1993); intervals by
/// modified large samples (Graybill & Wang 1980 for sums, Ting et al. 1990 for differences; Burdick, Borror &
/// Montgomery 2003), for a repeatability alone by chi-squared. With a single operator there is no operator or
/// interaction row and reproducibility is zero. `reason` says why there is none.
struct GaugeAnswer {
    std::optional<GaugeStudy> study;
    std::string reason;
};
[[nodiscard]] GaugeAnswer gauge_study(const std::vector<std::vector<std::vector<double>>>& values,
                                      double confidence_level);

}  // namespace ringwright
