#pragma once
// Limits, decision rules and the probability that an article conforms (JCGM 106:2012).

#include <cstddef>
#include <map>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"

namespace ringwright {

/// Who bears the doubt of a measured value near a limit.
enum class DecisionRule {
    simple_acceptance,   ///< the limits themselves decide; the risk is shared (JCGM 106, 8.2)
    guarded_acceptance,  ///< accepted only inside the limits by the guard band: protects who relies on the
                         ///< article (8.3.2)
    guarded_rejection,   ///< rejected only outside the limits by the guard band: protects who supplied it
                         ///< (8.3.3)
};
/// "simple acceptance", "guarded acceptance", "guarded rejection".
[[nodiscard]] std::string_view to_text(DecisionRule rule);
[[nodiscard]] std::optional<DecisionRule> decision_rule_from_text(std::string_view text);

enum class Decision { conforms, does_not_conform, undecided };
/// "conforms", "does_not_conform", "undecided".
[[nodiscard]] std::string_view to_text(Decision decision);
[[nodiscard]] std::optional<Decision> decision_from_text(std::string_view text);

/// Permitted values of one quantity, SI units. At least one end is there; lower ≤ upper.
struct Limit {
    Quantity quantity = Quantity::damping_ratio;
    std::optional<double> lower, upper;
};

/// How a value near a limit is decided. The guard band is w = guard_multiple · U with the expanded
/// uncertainty U = k·u. k is `coverage_factor` where given; else Student's t for a coverage of 95.45 % at the
/// estimate's degrees of freedom (JCGM 100, G.3), which is 2.00 where nothing limits them.
struct DecisionOptions {
    DecisionRule rule = DecisionRule::guarded_acceptance;
    double guard_multiple = 1.0;            ///< ≥ 0; 1 is the usual choice (ILAC-G8:09/2019, 4.2.2)
    std::optional<double> coverage_factor;  ///< > 0
};

/// Probability that the true value lies within the limits, given a normal distribution about the estimate
/// (JCGM 106, 7.2 and 7.4): Φ((T_U − y)/u) − Φ((T_L − y)/u). Depends on value and standard uncertainty only;
/// with u = 0 it is 0 or 1 (a value on the limit conforms). Precondition: u ≥ 0.
[[nodiscard]] double probability_of_conformity(const Limit& limit, double value, double standard_uncertainty);

/// What part of a standard uncertainty further releases would reduce. `from_releases` falls as 1/√n,
/// `from_inputs` (mass, sensor, clock) stays. SI units of the quantity.
struct UncertaintyParts {
    double from_releases = 0.0;
    double from_inputs = 0.0;
    std::size_t releases = 1;
};

/// What would settle an undecided limit if the value stayed where it is.
struct Remedy {
    double standard_uncertainty_needed = 0.0;  ///< SI; at or below it the rule decides
    std::optional<std::size_t> more_releases;  ///< absent: releases alone never settle it, or parts not known
    std::optional<double> inputs_needed;  ///< SI; the part from inputs must fall to this (releases as now);
                                          ///< absent: inputs alone never settle it
    std::string reading;                  ///< the same as a sentence
};

/// One limit, decided.
struct LimitDecision {
    Limit limit;
    std::optional<Estimate> estimate;  ///< absent: the result does not hold the quantity
    double guard_band = 0.0;           ///< w, SI
    std::optional<double> acceptance_lower, acceptance_upper;  ///< what the value was held to, SI
    std::optional<double> probability_of_conformity;
    Decision decision = Decision::undecided;
    /// Specific risk of the decision (JCGM 106, 9.3.2 and 9.3.3): of a wrong acceptance 1 − p_c (consumer's)
    /// when it conforms, of a wrong rejection p_c (producer's) when it does not; absent when undecided.
    std::optional<double> risk;
    std::optional<Remedy> remedy;  ///< where undecided and the quantity was measured
    std::string reading;           ///< the decision and its risk as a sentence
};

struct Verdict {
    Decision decision = Decision::undecided;
    DecisionOptions options;
    std::vector<LimitDecision> limits;
    Findings findings;
};

/// Decides one limit. Under simple acceptance a value within the limits conforms, any other does not. Under
/// guarded acceptance a value inside the limits by w conforms, one outside them by more than w does not, and
/// between the two the uncertainty is too large to decide. Under guarded rejection a value outside the limits
/// by more than w does not conform, any other does. `estimate` absent: undecided.
[[nodiscard]] LimitDecision decide(const Limit& limit, const std::optional<Estimate>& estimate,
                                   const DecisionOptions& options,
                                   const std::optional<UncertaintyParts>& parts = std::nullopt);

/// Decides every limit. Overall: does_not_conform where any limit does not, else undecided where any limit
/// (or no limit at all) is, else conforms.
[[nodiscard]] Verdict judge(const Quantities& quantities, const std::vector<Limit>& limits,
                            const DecisionOptions& options,
                            const std::map<Quantity, UncertaintyParts>& parts = {});

/// Risks over a whole production, not of one article (JCGM 106, 9.5).
struct GlobalRisk {
    double conforming = 0.0;  ///< share of the production that conforms
    double consumer = 0.0;    ///< share that is accepted and does not conform
    double producer = 0.0;    ///< share that is rejected and conforms
};

/// Normal production (mean, standard deviation > 0), normal measurement error (standard uncertainty > 0),
/// tolerance interval and acceptance interval (ends may be infinite). Relative accuracy about 1e-9.
[[nodiscard]] GlobalRisk global_risk(double production_mean, double production_standard_deviation,
                                     double measurement_uncertainty, const Interval& tolerance,
                                     const Interval& acceptance);

}  // namespace ringwright
