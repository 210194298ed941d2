#include "ringwright/comparison.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

/// A quantity with its uncertainty split into what is its own and what it shares with its counterpart.
struct Part {
    double own = 0.0;
    double common = 0.0;
    double degrees_of_freedom = 0.0;
};

/// The common part (a weighed mass, a calibrated sensor) is held as well known as it is stated: infinite
/// degrees of freedom. By Welch–Satterthwaite u⁴/ν is then own⁴/ν_own, which gives the degrees of freedom of
/// what is left when the common part cancels.
Part part_of(const Estimate& estimate, double common, double scale) {
    const double square = estimate.standard_uncertainty * estimate.standard_uncertainty;
    const double own_square = std::max(0.0, square - common * common);
    const double share = square > 0.0 ? own_square / square : 1.0;
    return {std::sqrt(own_square) / scale, common / scale, estimate.degrees_of_freedom * share * share};
}

/// Welch–Satterthwaite over the parts that are each one's own.
double degrees_of_freedom(const Part& before, const Part& after) {
    const double total = before.own * before.own + after.own * after.own;
    double sum = 0.0;
    for (const Part& part : {before, after})
        if (std::isfinite(part.degrees_of_freedom) && part.own > 0.0)
            sum += std::pow(part.own, 4) / std::max(part.degrees_of_freedom, 1e-3);
    return sum > 0.0 ? total * total / sum : std::numeric_limits<double>::infinity();
}

Estimate difference_of(double value, const Part& before, const Part& after, double confidence_level) {
    Estimate difference;
    difference.value = value;
    difference.standard_uncertainty = std::hypot(before.own, after.own, after.common - before.common);
    difference.degrees_of_freedom = degrees_of_freedom(before, after);
    const double half_width =
        student_t_factor(confidence_level, difference.degrees_of_freedom) * difference.standard_uncertainty;
    difference.interval = {value - half_width, value + half_width};
    return difference;
}

/// P(T ≥ (value − bound)/u): how likely a value this far above the bound is when the truth is at the bound.
double upper_tail(const Estimate& estimate, double bound) {
    const double excess = estimate.value - bound;
    if (!(estimate.standard_uncertainty > 0.0)) return excess > 0.0 ? 0.0 : 1.0;
    return student_t_probability(-excess / estimate.standard_uncertainty, estimate.degrees_of_freedom);
}

double lower_tail(const Estimate& estimate, double bound) {
    const double excess = estimate.value - bound;
    if (!(estimate.standard_uncertainty > 0.0)) return excess < 0.0 ? 0.0 : 1.0;
    return student_t_probability(excess / estimate.standard_uncertainty, estimate.degrees_of_freedom);
}

double two_sided(const Estimate& difference) {
    if (!(difference.standard_uncertainty > 0.0)) return difference.value == 0.0 ? 1.0 : 0.0;
    return std::min(
        1.0, 2.0 * (difference.value > 0.0 ? upper_tail(difference, 0.0) : lower_tail(difference, 0.0)));
}

Estimate exponential_of(const Estimate& logarithm) {
    Estimate ratio = logarithm;
    ratio.value = std::exp(logarithm.value);
    ratio.standard_uncertainty = ratio.value * logarithm.standard_uncertainty;
    ratio.interval = {std::exp(logarithm.interval.low), std::exp(logarithm.interval.high)};
    return ratio;
}

Equivalence test_equivalence(const EquivalenceMargin& margin, const Estimate& difference,
                             const std::optional<Estimate>& log_ratio, double confidence_level) {
    Equivalence answer;
    answer.margin = margin;
    if (margin.relative && !log_ratio) return answer;
    const Estimate& tested = margin.relative ? *log_ratio : difference;
    const double high = margin.relative ? std::log1p(margin.size) : margin.size;
    const double low = !margin.relative    ? -margin.size
                       : margin.size < 1.0 ? std::log1p(-margin.size)
                                           : -std::numeric_limits<double>::infinity();
    answer.p_value = std::max(upper_tail(tested, low), lower_tail(tested, high));
    answer.equivalent = answer.p_value < 1.0 - confidence_level;
    return answer;
}

}  // namespace

QuantityComparison compare(const Estimate& before, const Estimate& after, double confidence_level,
                           const std::optional<EquivalenceMargin>& margin, std::pair<double, double> common) {
    QuantityComparison compared;
    compared.before = before;
    compared.after = after;
    compared.difference = difference_of(after.value - before.value, part_of(before, common.first, 1.0),
                                        part_of(after, common.second, 1.0), confidence_level);
    std::optional<Estimate> log_ratio;
    if (before.value > 0.0 && after.value > 0.0)
        log_ratio =
            difference_of(std::log(after.value / before.value), part_of(before, common.first, before.value),
                          part_of(after, common.second, after.value), confidence_level);
    if (log_ratio) compared.ratio = exponential_of(*log_ratio);
    compared.p_value = two_sided(compared.difference);
    compared.changed = compared.p_value < 1.0 - confidence_level;
    if (margin)
        compared.equivalence = test_equivalence(*margin, compared.difference, log_ratio, confidence_level);
    return compared;
}

Comparison compare(const Quantities& before, const Quantities& after, const ComparisonOptions& options) {
    Comparison comparison;
    comparison.options = options;
    for (const auto& [quantity, first] : before) {
        const auto second = after.find(quantity);
        if (second == after.end()) {
            comparison.findings.push_back(
                {"only_before", Severity::note,
                 fmt::format("The {} is known before only, so it is not compared.", name_of(quantity))});
            continue;
        }
        const auto own = options.margins.find(quantity);
        const auto margin = own == options.margins.end() ? options.margin : std::optional(own->second);
        const auto common = options.common.find(quantity);
        comparison.quantities[quantity] =
            compare(first, second->second, options.confidence_level, margin,
                    common == options.common.end() ? std::pair{0.0, 0.0} : common->second);
    }
    for (const auto& [quantity, second] : after)
        if (!before.contains(quantity))
            comparison.findings.push_back(
                {"only_after", Severity::note,
                 fmt::format("The {} is known after only, so it is not compared.", name_of(quantity))});
    return comparison;
}

}  // namespace ringwright
