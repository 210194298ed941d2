#pragma once
// Whether the releases of a series are repeats of one thing: drift, dependence on amplitude, outlying
// releases.

#include <string>
#include <vector>

#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"

namespace ringwright {

/// One quantity over the releases of a series, in the order in which they were made.
struct ReleaseSeries {
    std::string name;  ///< of the quantity, for people
    std::string unit;  ///< for messages; "1" for a ratio
    std::vector<Estimate> releases;
    std::vector<double> amplitudes;   ///< at the start of each decay, > 0, any unit; empty when not known
    std::vector<std::string> labels;  ///< how each release is named to people
};

/// Chance that one of the tests below finds something in a series of true repeats with normal scatter; each
/// test of each quantity on its own.
inline constexpr double repeats_false_alarm_rate = 0.01;

/// A straight line of the quantity's logarithm (or the quantity itself where it is not positive) against a
/// regressor.
struct TrendTest {
    bool tested = false;           ///< four releases or more, and a regressor that varies
    double relative_change = 0.0;  ///< over the whole range of the regressor, of the value
    double p_value = 1.0;          ///< two-sided, Student's t with n − 2 degrees of freedom
};

/// Weighted regression on the release number; the weights are those of pooling, the scale of the scatter is
/// estimated.
[[nodiscard]] TrendTest test_drift(const ReleaseSeries& series);
/// The same on the logarithm of the amplitude; tested where the amplitudes differ by a tenth or more.
[[nodiscard]] TrendTest test_amplitude_dependence(const ReleaseSeries& series);

/// Indices of releases whose deleted studentised residual about the weighted mean is beyond Student's t with
/// n − 2 degrees of freedom at repeats_false_alarm_rate/n (Bonferroni). Needs four releases; one release at a
/// time is put aside, the rest tested again, never more than a quarter of them.
[[nodiscard]] std::vector<std::size_t> outlying_releases(const ReleaseSeries& series);

/// All of it in words: `repeats_scatter` (note), `drift_in_series`, `amplitude_dependent`, `outlying_release`
/// (cautions). Where drift and amplitude explain each other (both significant) the likelier is named with the
/// other beside it. Nothing is dropped from the series.
[[nodiscard]] Findings examine_repeats(const ReleaseSeries& series, double confidence_level);

}  // namespace ringwright
