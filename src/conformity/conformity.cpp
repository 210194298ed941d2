#include "ringwright/conformity.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "conformity/remedy.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright {
namespace {

bool within(const Limit& limit, double value) {
    return !(limit.lower && value < *limit.lower) && !(limit.upper && value > *limit.upper);
}

/// The limits moved inwards by `band` (outwards where it is negative).
Limit tightened(const Limit& limit, double band) {
    Limit moved = limit;
    if (moved.lower) *moved.lower += band;
    if (moved.upper) *moved.upper -= band;
    return moved;
}

/// Signed offset of the acceptance limits from the limits, as a multiple of the guard band.
double acceptance_offset(DecisionRule rule) {
    if (rule == DecisionRule::guarded_acceptance) return 1.0;
    return rule == DecisionRule::guarded_rejection ? -1.0 : 0.0;
}

Decision decide_value(const Limit& limit, double value, double guard_band, DecisionRule rule) {
    if (within(tightened(limit, acceptance_offset(rule) * guard_band), value)) return Decision::conforms;
    const bool gap = rule == DecisionRule::guarded_acceptance;
    if (gap && within(tightened(limit, -guard_band), value)) return Decision::undecided;
    return Decision::does_not_conform;
}

/// A probability for people: per cent, and never "0 %" or "100 %" where it is neither.
std::string percent(double probability) {
    if (probability < 1e-4) return "less than 0.01 %";
    if (probability > 1.0 - 1e-4) return "more than 99.99 %";
    return fmt::format("{:.4g} %", 100.0 * probability);
}

/// The probability of conformity with Student's t in place of the normal distribution.
double probability_by_student(const Limit& limit, const Estimate& estimate) {
    if (!(estimate.standard_uncertainty > 0.0)) return within(limit, estimate.value) ? 1.0 : 0.0;
    const auto below = [&](double end) {
        return student_t_probability((end - estimate.value) / estimate.standard_uncertainty,
                                     estimate.degrees_of_freedom);
    };
    return (limit.upper ? below(*limit.upper) : 1.0) - (limit.lower ? below(*limit.lower) : 0.0);
}

std::string reading_of(const LimitDecision& decided) {
    const double conforming = *decided.probability_of_conformity;
    if (decided.decision == Decision::conforms)
        return fmt::format("Conforms; the risk that it does not (consumer's risk) is {}.",
                           percent(1.0 - conforming));
    if (decided.decision == Decision::does_not_conform)
        return fmt::format("Does not conform; the risk that it does (producer's risk) is {}.",
                           percent(conforming));
    return fmt::format("Undecided: the uncertainty is too large; the probability of conformity is {}.",
                       percent(conforming));
}

/// What gives a quantity that the result lacks.
const char* what_gives(Quantity quantity) {
    switch (quantity) {
        case Quantity::stiffness:
        case Quantity::damping_coefficient:
            return "Give --mass (of a torsion test --inertia), or mass under [article] in the test sheet.";
        case Quantity::friction_force:
        case Quantity::quadratic_damping:
            return "It is given where the decay shows it and the mass is known; else leave this limit out.";
        case Quantity::mass:
        case Quantity::inertia:
            return "Record with at least two different added masses (--added-mass).";
        default:
            return "Leave this limit out of the test sheet, or check with identify what the recordings give.";
    }
}

LimitDecision not_measured(const Limit& limit) {
    LimitDecision decided;
    decided.limit = limit;
    decided.reading = fmt::format("Not judged: the result holds no {}. {}", name_of(limit.quantity),
                                  what_gives(limit.quantity));
    return decided;
}

/// Says so where few degrees of freedom would make the probability another one.
void note_few_degrees_of_freedom(const LimitDecision& decided, Findings& findings) {
    constexpr double worth_saying = 0.001;
    if (!decided.estimate || !decided.probability_of_conformity) return;
    const double heavier = probability_by_student(decided.limit, *decided.estimate);
    if (std::abs(heavier - *decided.probability_of_conformity) < worth_saying) return;
    findings.push_back(
        {"few_degrees_of_freedom", Severity::caution,
         fmt::format(
             "The uncertainty of the {} rests on {:.3g} degrees of freedom. Its probability of conformity "
             "assumes a normal distribution; by Student's t it is {}. More releases would mend that.",
             name_of(decided.limit.quantity), decided.estimate->degrees_of_freedom, percent(heavier))});
}

void note_narrow_limits(const LimitDecision& decided, Findings& findings) {
    if (!decided.acceptance_lower || !decided.acceptance_upper) return;
    if (*decided.acceptance_lower <= *decided.acceptance_upper) return;
    findings.push_back({"no_acceptance_zone", Severity::caution,
                        fmt::format("The guard bands fill the whole range between the limits of the {}: with "
                                    "this uncertainty no value could be accepted.",
                                    name_of(decided.limit.quantity))});
}

Decision overall(const std::vector<LimitDecision>& limits) {
    const auto any = [&](Decision wanted) {
        return std::ranges::any_of(limits, [&](const auto& limit) { return limit.decision == wanted; });
    };
    if (any(Decision::does_not_conform)) return Decision::does_not_conform;
    return limits.empty() || any(Decision::undecided) ? Decision::undecided : Decision::conforms;
}

}  // namespace

double probability_of_conformity(const Limit& limit, double value, double standard_uncertainty) {
    if (!(standard_uncertainty > 0.0)) return within(limit, value) ? 1.0 : 0.0;
    const double low = limit.lower ? (*limit.lower - value) / standard_uncertainty : -HUGE_VAL;
    const double high = limit.upper ? (*limit.upper - value) / standard_uncertainty : HUGE_VAL;
    const auto below = [](double z) { return std::isinf(z) ? (z > 0 ? 1.0 : 0.0) : normal_probability(z); };
    // In the upper tail the difference of two numbers near one is taken from the other side.
    const double probability = low > 0.0 ? below(-low) - below(-high) : below(high) - below(low);
    return std::clamp(probability, 0.0, 1.0);
}

LimitDecision decide(const Limit& limit, const std::optional<Estimate>& estimate,
                     const DecisionOptions& options, const std::optional<UncertaintyParts>& parts) {
    if (!estimate) return not_measured(limit);
    LimitDecision decided;
    decided.limit = limit;
    decided.estimate = estimate;
    const double factor = guard_factor(options, estimate->degrees_of_freedom);
    decided.guard_band =
        options.rule == DecisionRule::simple_acceptance ? 0.0 : factor * estimate->standard_uncertainty;
    const Limit acceptance = tightened(limit, acceptance_offset(options.rule) * decided.guard_band);
    decided.acceptance_lower = acceptance.lower;
    decided.acceptance_upper = acceptance.upper;
    const double conforming =
        probability_of_conformity(limit, estimate->value, estimate->standard_uncertainty);
    decided.probability_of_conformity = conforming;
    decided.decision = decide_value(limit, estimate->value, decided.guard_band, options.rule);
    if (decided.decision == Decision::conforms) decided.risk = 1.0 - conforming;
    if (decided.decision == Decision::does_not_conform) decided.risk = conforming;
    if (decided.decision == Decision::undecided)
        decided.remedy = find_remedy(limit, *estimate, options, parts);
    decided.reading = reading_of(decided);
    return decided;
}

Verdict judge(const Quantities& quantities, const std::vector<Limit>& limits, const DecisionOptions& options,
              const std::map<Quantity, UncertaintyParts>& parts) {
    Verdict verdict;
    verdict.options = options;
    for (const Limit& limit : limits) {
        const auto found = quantities.find(limit.quantity);
        const auto part = parts.find(limit.quantity);
        verdict.limits.push_back(
            decide(limit, found == quantities.end() ? std::nullopt : std::optional(found->second), options,
                   part == parts.end() ? std::nullopt : std::optional(part->second)));
        note_few_degrees_of_freedom(verdict.limits.back(), verdict.findings);
        note_narrow_limits(verdict.limits.back(), verdict.findings);
    }
    if (limits.empty())
        verdict.findings.push_back({"no_limits", Severity::caution,
                                    "The test sheet holds no limits, so there is nothing to judge."});
    verdict.decision = overall(verdict.limits);
    return verdict;
}

}  // namespace ringwright
