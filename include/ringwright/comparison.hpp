#pragma once
// Before against after service, or one prototype against another: what changed, by how much, how surely.

#include <map>
#include <optional>
#include <utility>

#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"

namespace ringwright {

/// How far two values may lie apart and still count as the same.
struct EquivalenceMargin {
    double size = 0.0;     ///< > 0; SI units, or a share of the value before (0.05: 5 %) where `relative`
    bool relative = true;  ///< relative: after/before within [1 − size, 1 + size]
};

/// Answer of two one-sided tests (Schuirmann 1987, J. Pharmacokinet. Biopharm. 15, 657).
struct Equivalence {
    EquivalenceMargin margin;
    bool equivalent = false;  ///< p_value below one minus the confidence level
    double p_value = 1.0;     ///< the larger of the two one-sided tests'
};

/// One quantity, before against after.
struct QuantityComparison {
    Estimate before, after;
    Estimate difference;            ///< after − before
    std::optional<Estimate> ratio;  ///< after/before; absent unless both are positive
    double p_value = 1.0;           ///< of no change, two-sided
    bool changed = false;           ///< p_value below one minus the confidence level
    std::optional<Equivalence> equivalence;
};

/// Standard uncertainty, before and after, that comes from one and the same input (the same weighed mass, the
/// same sensor) and so goes together: its contributions before and after, SI units of the quantity, signed
/// alike.
using CommonContributions = std::map<Quantity, std::pair<double, double>>;

struct ComparisonOptions {
    double confidence_level =
        0.95;  ///< a quantity that did not change is called changed in 1 − this of cases
    std::map<Quantity, EquivalenceMargin> margins;
    std::optional<EquivalenceMargin> margin;  ///< for every quantity without one of its own
    CommonContributions common;
};

struct Comparison {
    ComparisonOptions options;
    std::map<Quantity, QuantityComparison> quantities;  ///< those that both results hold
    Findings findings;
};

/// Compares two estimates. Difference d with u² = u₁² + u₂² − 2 c₁c₂ (JCGM 100, 5.2.2, the common
/// contributions c fully correlated), degrees of freedom after Welch–Satterthwaite (Welch 1947; JCGM 100,
/// G.4.1) of what does not cancel, the common part itself taken as known with infinite degrees of freedom;
/// interval d ± t·u, p-value of Student's t at d/u. Ratio: the same on the logarithm, so its interval is
/// lopsided. Assumes that releases before and after are independent.
[[nodiscard]] QuantityComparison compare(const Estimate& before, const Estimate& after,
                                         double confidence_level,
                                         const std::optional<EquivalenceMargin>& margin = std::nullopt,
                                         std::pair<double, double> common = {0.0, 0.0});

[[nodiscard]] Comparison compare(const Quantities& before, const Quantities& after,
                                 const ComparisonOptions& options = {});

}  // namespace ringwright
