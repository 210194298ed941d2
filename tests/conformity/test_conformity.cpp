#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <string>

#include "ringwright/conformity.hpp"

using namespace ringwright;
using Catch::Detail::Approx;

namespace {

const double infinity = std::numeric_limits<double>::infinity();

Estimate estimate(double value, double standard_uncertainty, double degrees_of_freedom = infinity) {
    return {value, standard_uncertainty, {}, degrees_of_freedom};
}

Limit limit(std::optional<double> lower, std::optional<double> upper) {
    return {Quantity::damping_ratio, lower, upper};
}

DecisionOptions under(DecisionRule rule) {
    DecisionOptions options;
    options.rule = rule;
    return options;
}

}  // namespace

// Printed value and inputs: JCGM 106:2012, 7.3 (from memory); Φ(1.4) computed to 7 digits.
TEST_CASE("one-sided limit: the example of JCGM 106, 7.3") {
    CHECK(probability_of_conformity(limit({}, -5.40), -5.47, 0.05) == Approx(0.9192433).margin(1e-7));
}

// JCGM 106:2012, 7.4 (from memory); computed to 7 digits.
TEST_CASE("two-sided limits: the example of JCGM 106, 7.4") {
    CHECK(probability_of_conformity(limit(12.5, 16.3), 13.6, 1.8) == Approx(0.6626298).margin(1e-7));
}

// JCGM 106:2012, table 1 (from memory), recomputed: the z at which a one-sided probability is reached; the
// printed z has two decimals, which moves the probability by at most 0.006 times the density.
TEST_CASE("one-sided probabilities of JCGM 106, table 1") {
    const std::pair<double, double> rows[] = {
        {0.80, 0.84}, {0.90, 1.28}, {0.95, 1.64}, {0.99, 2.33}, {0.999, 3.09}};
    for (const auto& [probability, z] : rows) {
        const double density = std::exp(-z * z / 2.0) / std::sqrt(2.0 * 3.14159265358979);
        CHECK(probability_of_conformity(limit({}, z), 0.0, 1.0) ==
              Approx(probability).margin(0.006 * density + 1e-9));
    }
}

// ILAC-G8:09/2019, p. 9: risk of false acceptance of a value on the acceptance limit, U = 2u.
TEST_CASE("false-accept risk on the acceptance limit for the guard bands of ILAC-G8") {
    const std::pair<double, double> rows[] = {
        {0.0, 0.5}, {1.0, 0.0227501}, {0.8224268, 0.05}, {1.5, 0.0013499}};
    for (const auto& [multiple, risk] : rows) {
        DecisionOptions options;
        options.guard_multiple = multiple;
        options.coverage_factor = 2.0;
        const double just_inside = 10.0 - multiple * 2.0 * 0.1 - 1e-12;
        const LimitDecision decided = decide(limit({}, 10.0), estimate(just_inside, 0.1), options);
        REQUIRE(decided.decision == Decision::conforms);
        CHECK(*decided.risk == Approx(risk).margin(1e-6));
    }
}

// Inputs: JCGM 106:2012, 9.5 (resistors, seen in a stored script); results computed to 6 digits by
// quadrature.
TEST_CASE("global risks of the resistors of JCGM 106, 9.5") {
    const Interval tolerance{1499.8, 1500.2};
    const auto risk = [&](double half) {
        return global_risk(1500.0, 0.12, 0.04, tolerance, {1500.0 - half, 1500.0 + half});
    };
    CHECK(risk(0.18).conforming == Approx(0.904419).margin(1e-6));
    CHECK(risk(0.18).consumer == Approx(0.009878).margin(1e-6));
    CHECK(risk(0.18).producer == Approx(0.069027).margin(1e-6));
    CHECK(risk(0.20).consumer == Approx(0.018942).margin(1e-6));
    CHECK(risk(0.20).producer == Approx(0.037208).margin(1e-6));
    CHECK(risk(0.24).consumer == Approx(0.044898).margin(1e-6));
    CHECK(risk(0.24).producer == Approx(0.007097).margin(1e-6));
}

TEST_CASE("global risks with one tolerance limit") {
    // Worked by hand: mean on the limit, so half conforms; accepting everything makes the consumer's risk one
    // half and the producer's nothing.
    const GlobalRisk risk = global_risk(0.0, 1.0, 0.5, {0.0, infinity}, {-infinity, infinity});
    CHECK(risk.conforming == Approx(0.5).margin(1e-12));
    CHECK(risk.consumer == Approx(0.5).margin(1e-9));
    CHECK(risk.producer == Approx(0.0).margin(1e-9));
}

TEST_CASE("each rule decides by where the value lies") {
    // u = 0.1 and infinitely many degrees of freedom: the guard band is 0.2 about the limit 1.0.
    const auto at = [](DecisionRule rule, double value) {
        return decide(limit({}, 1.0), estimate(value, 0.1), under(rule)).decision;
    };
    const auto acceptance = DecisionRule::guarded_acceptance;
    CHECK(at(acceptance, 0.79) == Decision::conforms);
    CHECK(at(acceptance, 0.81) == Decision::undecided);
    CHECK(at(acceptance, 1.19) == Decision::undecided);
    CHECK(at(acceptance, 1.21) == Decision::does_not_conform);
    const auto simple = DecisionRule::simple_acceptance;
    CHECK(at(simple, 1.0) == Decision::conforms);
    CHECK(at(simple, 1.001) == Decision::does_not_conform);
    const auto rejection = DecisionRule::guarded_rejection;
    CHECK(at(rejection, 1.19) == Decision::conforms);
    CHECK(at(rejection, 1.21) == Decision::does_not_conform);
}

TEST_CASE("limits mirror: the lower limit decides as the upper one does") {
    for (const auto rule :
         {DecisionRule::simple_acceptance, DecisionRule::guarded_acceptance, DecisionRule::guarded_rejection})
        for (double value = 0.5; value < 1.5; value += 0.013) {
            const auto upper = decide(limit({}, 1.0), estimate(value, 0.1), under(rule));
            const auto lower = decide(limit(-1.0, {}), estimate(-value, 0.1), under(rule));
            CHECK(upper.decision == lower.decision);
            // The same number by two ways round the normal distribution: rounding only.
            CHECK(*upper.probability_of_conformity == Approx(*lower.probability_of_conformity).margin(1e-14));
        }
}

TEST_CASE("few degrees of freedom widen the guard band") {
    // Student t for 95.45 %: 2.87 at 4 degrees of freedom (JCGM 100, table G.2), so w = 0.287.
    const auto decided =
        decide(limit({}, 1.0), estimate(0.75, 0.1, 4.0), under(DecisionRule::guarded_acceptance));
    CHECK(decided.guard_band == Approx(0.287).margin(0.0005));
    CHECK(decided.decision == Decision::undecided);
    DecisionOptions plain = under(DecisionRule::guarded_acceptance);
    plain.coverage_factor = 2.0;
    CHECK(decide(limit({}, 1.0), estimate(0.75, 0.1, 4.0), plain).decision == Decision::conforms);
}

TEST_CASE("the worst limit makes the verdict") {
    const Quantities quantities{{Quantity::damping_ratio, estimate(0.27, 0.005)},
                                {Quantity::natural_frequency, estimate(5.0, 0.01)}};
    const Limit good{Quantity::damping_ratio, 0.22, 0.34};
    const Limit near{Quantity::damping_ratio, 0.265, {}};
    const Limit bad{Quantity::natural_frequency, 6.0, {}};
    const Limit absent{Quantity::stiffness, 1.0, {}};
    const auto decision = [&](std::vector<Limit> limits) { return judge(quantities, limits, {}).decision; };
    CHECK(decision({good}) == Decision::conforms);
    CHECK(decision({good, near}) == Decision::undecided);
    CHECK(decision({good, near, bad}) == Decision::does_not_conform);
    CHECK(decision({good, absent}) == Decision::undecided);
    CHECK(decision({}) == Decision::undecided);
}

TEST_CASE("what would settle an undecided value") {
    // By hand: value 0.1 inside the limit with u = 0.08 (k = 2): needs u ≤ 0.05. All of it from 4 releases: 4
    // · (0.08/0.05)² = 10.24, so 11 releases, 7 more.
    const UncertaintyParts releases_only{.from_releases = 0.08, .from_inputs = 0.0, .releases = 4};
    const auto decided = decide(limit({}, 1.0), estimate(0.9, 0.08), {}, releases_only);
    REQUIRE(decided.remedy);
    CHECK(decided.remedy->standard_uncertainty_needed == Approx(0.05).epsilon(1e-9));
    CHECK(decided.remedy->more_releases == std::optional<std::size_t>(7));
    CHECK_FALSE(decided.remedy->inputs_needed);

    // Mass alone to blame: √(0.05² − 0.03²) = 0.04.
    const UncertaintyParts mass{
        .from_releases = 0.03, .from_inputs = std::sqrt(0.0064 - 0.0009), .releases = 4};
    const auto by_mass = decide(limit({}, 1.0), estimate(0.9, 0.08), {}, mass);
    CHECK_FALSE(by_mass.remedy->more_releases);
    CHECK(*by_mass.remedy->inputs_needed == Approx(0.04).epsilon(1e-9));
    CHECK(decide(limit({}, 1.0), estimate(1.0, 0.08), {}, mass).remedy->reading.find("on the limit") !=
          std::string::npos);
}

TEST_CASE("an exact value is decided without division by nothing") {
    CHECK(probability_of_conformity(limit(1.0, 2.0), 2.0, 0.0) == 1.0);
    CHECK(probability_of_conformity(limit(1.0, 2.0), 2.1, 0.0) == 0.0);
    CHECK(decide(limit(1.0, 2.0), estimate(2.1, 0.0), {}).decision == Decision::does_not_conform);
}

TEST_CASE("limits narrower than the guard bands are called out") {
    const Quantities quantities{{Quantity::damping_ratio, estimate(0.25, 0.05)}};
    const Verdict verdict = judge(quantities, {{Quantity::damping_ratio, 0.24, 0.26}}, {});
    CHECK(verdict.decision == Decision::undecided);
    REQUIRE_FALSE(verdict.findings.empty());
    CHECK(verdict.findings.front().code == "no_acceptance_zone");
}

TEST_CASE("rules and decisions go to text and back") {
    for (const auto rule :
         {DecisionRule::simple_acceptance, DecisionRule::guarded_acceptance, DecisionRule::guarded_rejection})
        CHECK(decision_rule_from_text(to_text(rule)) == rule);
    for (const auto decision : {Decision::conforms, Decision::does_not_conform, Decision::undecided})
        CHECK(decision_from_text(to_text(decision)) == decision);
    CHECK_FALSE(decision_rule_from_text("generous acceptance"));
}

TEST_CASE("few degrees of freedom are said where they matter") {
    // At 2 degrees of freedom P(T < 3) = 0.9523 (worked from the closed form 1/2 + t/(2√(2 + t²))); normal
    // 0.9987.
    const auto codes = [](double value) {
        const Quantities quantities{{Quantity::damping_ratio, estimate(value, 0.1, 2.0)}};
        return judge(quantities, {limit({}, 1.0)}, {}).findings;
    };
    REQUIRE(codes(0.7).size() == 1);
    CHECK(codes(0.7).front().code == "few_degrees_of_freedom");
    CHECK(codes(0.7).front().message.find("95.23 %") != std::string::npos);
    CHECK(codes(-99.0).empty());
}
