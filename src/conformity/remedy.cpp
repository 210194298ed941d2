#include "conformity/remedy.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>

#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

constexpr double two_sigma_coverage = 0.954499736103642;
constexpr std::size_t most_releases = 1000;

double distance_to_nearest_limit(const Limit& limit, double value) {
    double distance = std::numeric_limits<double>::infinity();
    if (limit.lower) distance = std::min(distance, std::abs(value - *limit.lower));
    if (limit.upper) distance = std::min(distance, std::abs(value - *limit.upper));
    return distance;
}

/// Uncertainty that `releases` releases would leave. Scatter between releases brings n − 1 degrees of
/// freedom.
double guard_band_with(std::size_t releases, const UncertaintyParts& parts, const DecisionOptions& options,
                       double degrees_of_freedom) {
    const double ratio = static_cast<double>(parts.releases) / static_cast<double>(releases);
    const double scatter = parts.from_releases * std::sqrt(ratio);
    const double grown =
        std::isfinite(degrees_of_freedom) && parts.releases > 1
            ? degrees_of_freedom * static_cast<double>(releases - 1) / static_cast<double>(parts.releases - 1)
            : degrees_of_freedom;
    return guard_factor(options, grown) * std::hypot(scatter, parts.from_inputs);
}

std::optional<std::size_t> releases_needed(double distance, const UncertaintyParts& parts,
                                           const DecisionOptions& options, double degrees_of_freedom) {
    for (std::size_t total = parts.releases + 1; total <= most_releases; ++total)
        if (guard_band_with(total, parts, options, degrees_of_freedom) <= distance)
            return total - parts.releases;
    return std::nullopt;
}

std::optional<double> inputs_needed(double uncertainty_needed, const UncertaintyParts& parts) {
    if (!(parts.from_inputs > 0.0) || parts.from_releases >= uncertainty_needed) return std::nullopt;
    return std::sqrt(uncertainty_needed * uncertainty_needed - parts.from_releases * parts.from_releases);
}

std::string reading_of(const Remedy& remedy, const Estimate& estimate) {
    std::string text = fmt::format(
        "If the value stays where it is, a standard uncertainty {:.3g} times as large "
        "as now would settle it",
        remedy.standard_uncertainty_needed / estimate.standard_uncertainty);
    if (remedy.more_releases)
        text += fmt::format("; about {} more release{} would do", *remedy.more_releases,
                            *remedy.more_releases == 1 ? "" : "s");
    if (remedy.inputs_needed)
        text += fmt::format(
            "; so would a contribution of the weighed mass and the other inputs of at most {:.3g}",
            *remedy.inputs_needed);
    return text + ".";
}

}  // namespace

double guard_factor(const DecisionOptions& options, double degrees_of_freedom) {
    const double coverage = options.coverage_factor
                                ? *options.coverage_factor
                                : student_t_factor(two_sigma_coverage, degrees_of_freedom);
    return options.guard_multiple * coverage;
}

Remedy find_remedy(const Limit& limit, const Estimate& estimate, const DecisionOptions& options,
                   const std::optional<UncertaintyParts>& parts) {
    const double distance = distance_to_nearest_limit(limit, estimate.value);
    Remedy remedy;
    remedy.standard_uncertainty_needed = distance / guard_factor(options, estimate.degrees_of_freedom);
    if (distance <= 0.0) {
        remedy.reading = "The value lies on the limit: no smaller uncertainty would settle it.";
        return remedy;
    }
    if (parts) {
        remedy.more_releases = releases_needed(distance, *parts, options, estimate.degrees_of_freedom);
        remedy.inputs_needed = inputs_needed(remedy.standard_uncertainty_needed, *parts);
    }
    remedy.reading = reading_of(remedy, estimate);
    return remedy;
}

}  // namespace ringwright
