#pragma once
// From frequency and damping ratio to stiffness, damping coefficient and mass, with the uncertainty of what
// was weighed.

#include <optional>
#include <string>
#include <vector>

#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright {

/// What was weighed, and where. Mass and inertia exclude each other.
struct Article {
    std::optional<MeasuredValue> mass;         ///< kg
    std::optional<MeasuredValue> inertia;      ///< kg·m²
    std::optional<MeasuredValue> spring_mass;  ///< kg; a third of it moves (Rayleigh)
    std::optional<MeasuredValue> gravity;      ///< m/s² at the bench, for drops
};

/// One contribution to a combined uncertainty (JCGM 100, clause 5): |sensitivity| · u(input) = contribution.
struct BudgetLine {
    Quantity quantity = Quantity::stiffness;  ///< of which result
    std::string source;                       ///< e.g. "mass", "repeatability of the frequency"
    double value = 0.0;                       ///< of the input, SI
    double standard_uncertainty = 0.0;        ///< of the input, SI
    std::string unit;                         ///< of the input
    double sensitivity = 0.0;                 ///< ∂result/∂input
    double contribution = 0.0;                ///< to the result, SI unit of the result
    double share = 0.0;                       ///< of the variance, 0 … 1
    double degrees_of_freedom = 0.0;          ///< infinite where nothing limits them
};

/// Pooled frequency and damping of one loading of the article.
struct Loading {
    MeasuredValue added_mass;  ///< kg; zero when none
    Estimate natural_frequency;
    Estimate damping_ratio;
    double correlation = 0.0;  ///< of the two estimates
    /// Share of the variance of each estimate that is scatter between releases, 0 … 1; the budget lists it
    /// apart.
    double frequency_repeatability = 0.0;
    double damping_repeatability = 0.0;
    double repeatability_degrees_of_freedom = 0.0;
    /// Coefficients of a damping law over the moving mass (MethodResult::per_mass), clock and gain included.
    Quantities per_mass;
};

/// What all loadings share.
struct CommonInfluences {
    double time_base_relative = 0.0;  ///< relative standard uncertainty of the recorder's clock
};

struct PropertyResult {
    Quantities quantities;  ///< stiffness, damping_coefficient, mass or inertia, static_deflection where they
                            ///< can be told
    std::vector<BudgetLine> budget;
    Findings findings;
};

/// Coefficients of a damping law that is not viscous alone become forces by the same m where it is known; c is
/// then the law's viscous part. k = m ω_n², c = 2 ζ m ω_n with m = mass + spring_mass/3 + added mass (torsion: inertia, N·m/rad,
/// N·m·s/rad). Several loadings of a known mass: the mean of what each says, weighted by its own uncertainty.
/// Several loadings with an unknown mass: weighted straight line of 1/ω_n² against added mass, slope 1/k,
/// intercept m/k; the mass found is that of the article without a third of the spring where the spring's mass
/// is given, else all that moves. Three or more loadings that lie off the line more than their uncertainties
/// allow (5 %) widen the uncertainty by the Birge ratio, with a finding. Uncertainty by the law of
/// propagation (JCGM 100, 5.1.2 and 5.2.2), degrees of freedom by Welch–Satterthwaite (G.4.1), intervals as
/// in estimate_of (propagation.hpp). Nothing known of the mass and one loading: no quantities, no finding.
/// Throws UsageError when mass and inertia are both given, a mass is not positive, or the loadings of an
/// unknown mass do not differ.
[[nodiscard]] PropertyResult derive_properties(const std::vector<Loading>& loadings, const Article& article,
                                               bool torsional, double confidence_level,
                                               const CommonInfluences& influences = {});

/// k by the rule of a third over the true k, for a uniform spring of mass `spring_over_load` times the load
/// on it: exact solution β tan β = spring/load, ω = β √(k/spring). Rayleigh's principle makes the true
/// frequency the lower one, so the ratio is below one: 0.99979 at 0.1, 0.98690 at 1. Precondition: > 0.
[[nodiscard]] double rule_of_a_third_ratio(double spring_over_load);

}  // namespace ringwright
