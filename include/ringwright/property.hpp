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

/// What was weighed. Mass and inertia exclude each other.
struct Article {
    std::optional<MeasuredValue> mass;         ///< kg
    std::optional<MeasuredValue> inertia;      ///< kg·m²
    std::optional<MeasuredValue> spring_mass;  ///< kg; a third of it moves (Rayleigh)
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
};

struct PropertyResult {
    Quantities quantities;  ///< stiffness, damping_coefficient, mass or inertia, static_deflection where they
                            ///< can be told
    std::vector<BudgetLine> budget;
    Findings findings;
};

/// k = m ω_n², c = 2 ζ m ω_n with m = mass + spring_mass/3 + added mass (torsion: inertia). Several loadings
/// with an unknown mass: 1/ω_n² against added mass, slope 1/k, intercept m/k. Uncertainty by the law of
/// propagation (JCGM 100, 5.1.2 and 5.2.2), degrees of freedom by Welch–Satterthwaite (G.4.1), interval value
/// ± t·u.
[[nodiscard]] PropertyResult derive_properties(const std::vector<Loading>& loadings, const Article& article,
                                               bool torsional, double confidence_level);

}  // namespace ringwright
