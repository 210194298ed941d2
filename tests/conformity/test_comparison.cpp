#include <catch2/catch.hpp>
#include <cmath>
#include <random>
#include <vector>

#include "ringwright/comparison.hpp"
#include "ringwright/distributions.hpp"

using namespace ringwright;
using Catch::Detail::Approx;

namespace {

Estimate estimate(double value, double standard_uncertainty, double degrees_of_freedom = 1e15) {
    return {value, standard_uncertainty, {}, degrees_of_freedom};
}

/// Mean of n normal draws with its standard uncertainty and n − 1 degrees of freedom.
Estimate mean_of_draws(std::mt19937_64& generator, double mean, double standard_deviation, int count) {
    std::normal_distribution<double> draw(mean, standard_deviation);
    std::vector<double> values(static_cast<std::size_t>(count));
    double sum = 0.0;
    for (double& value : values) sum += value = draw(generator);
    const double average = sum / count;
    double squares = 0.0;
    for (const double value : values) squares += (value - average) * (value - average);
    return estimate(average, std::sqrt(squares / (count - 1) / count), count - 1.0);
}

}  // namespace

TEST_CASE("difference and ratio, worked by hand") {
    // u = √(3² + 4²) = 5; 10/5 = 2: two-sided normal p = 0.0455003 (Φ(−2) = 0.0227501).
    const QuantityComparison compared = compare(estimate(100.0, 3.0), estimate(110.0, 4.0), 0.95);
    CHECK(compared.difference.value == Approx(10.0));
    CHECK(compared.difference.standard_uncertainty == Approx(5.0));
    CHECK(compared.p_value == Approx(0.0455003).margin(1e-6));
    CHECK(compared.changed);
    CHECK(compared.difference.interval.low == Approx(10.0 - 1.959963985 * 5.0));
    REQUIRE(compared.ratio);
    CHECK(compared.ratio->value == Approx(1.1));
    // ln 1.1 ± 1.96 √(0.03² + (4/110)²).
    CHECK(compared.ratio->interval.high ==
          Approx(1.1 * std::exp(1.959963985 * std::hypot(0.03, 4.0 / 110.0))));
}

TEST_CASE("degrees of freedom after Welch and Satterthwaite") {
    // (1 + 4)² / (1/4 + 16/9) = 12.328767, worked by hand.
    const auto compared = compare(estimate(1.0, 1.0, 4.0), estimate(2.0, 2.0, 9.0), 0.95);
    CHECK(compared.difference.degrees_of_freedom == Approx(25.0 / (0.25 + 16.0 / 9.0)));
}

TEST_CASE("swapping before and after turns the difference and inverts the ratio") {
    const auto there = compare(estimate(0.27, 0.004, 5.0), estimate(0.19, 0.006, 3.0), 0.95);
    const auto back = compare(estimate(0.19, 0.006, 3.0), estimate(0.27, 0.004, 5.0), 0.95);
    CHECK(there.difference.value == Approx(-back.difference.value));
    CHECK(there.p_value == Approx(back.p_value));
    CHECK(there.ratio->value * back.ratio->value == Approx(1.0));
    CHECK(there.changed);
}

TEST_CASE("one weighed mass before and after cancels from the comparison") {
    // Stiffness 1000 and 1010 N/m, each with 10 (1 %) from the same mass and 3 of its own.
    const double u = std::hypot(10.0, 3.0);
    const auto apart = compare(estimate(1000.0, u), estimate(1010.0, u), 0.95);
    const auto together = compare(estimate(1000.0, u), estimate(1010.0, u), 0.95, std::nullopt, {10.0, 10.1});
    CHECK_FALSE(apart.changed);
    CHECK(together.changed);
    CHECK(together.difference.standard_uncertainty ==
          Approx(std::hypot(3.0, std::sqrt(u * u - 10.1 * 10.1), 0.1)));
}

TEST_CASE("equivalence within a margin by two one-sided tests") {
    const EquivalenceMargin five_percent{0.05, true};
    const auto same = compare(estimate(100.0, 0.5), estimate(101.0, 0.5), 0.95, five_percent);
    REQUIRE(same.equivalence);
    CHECK(same.equivalence->equivalent);
    // One-sided at ln 1.05, by hand: Φ((ln 1.01 − ln 1.05)/√(0.005² + (0.5/101)²)).
    const double u = std::hypot(0.005, 0.5 / 101.0);
    CHECK(same.equivalence->p_value == Approx(normal_probability(std::log(1.01 / 1.05) / u)));
    CHECK_FALSE(
        compare(estimate(100.0, 3.0), estimate(101.0, 3.0), 0.95, five_percent).equivalence->equivalent);
    CHECK_FALSE(
        compare(estimate(100.0, 0.5), estimate(106.0, 0.5), 0.95, five_percent).equivalence->equivalent);
    const EquivalenceMargin absolute{2.0, false};
    CHECK(compare(estimate(100.0, 0.5), estimate(100.1, 0.5), 0.95, absolute).equivalence->equivalent);
}

TEST_CASE("exact values and values that are not positive") {
    const auto equal = compare(estimate(1.0, 0.0), estimate(1.0, 0.0), 0.95);
    CHECK(equal.p_value == 1.0);
    CHECK_FALSE(equal.changed);
    CHECK(compare(estimate(1.0, 0.0), estimate(1.1, 0.0), 0.95).changed);
    CHECK_FALSE(compare(estimate(-1.0, 0.1), estimate(1.0, 0.1), 0.95).ratio);
}

// A stiffness from few releases and a weighed mass: the mass gives the whole its many degrees of freedom, but
// it cancels, and the difference has those of the releases alone. Welch–Satterthwaite worked by hand: u² = 1
// + 9, ν = 2·u⁴/1⁴ = 200. Tolerance: rounding of u² − c², which loses one digit of sixteen.
TEST_CASE("a common part that cancels takes its degrees of freedom along") {
    const auto plain = compare(estimate(3079.0, 1.0, 2.0), estimate(3082.0, 1.0, 2.0), 0.95);
    const auto weighed = compare(estimate(3079.0, std::sqrt(10.0), 200.0),
                                 estimate(3082.0, std::sqrt(10.0), 200.0), 0.95, std::nullopt, {3.0, 3.0});
    CHECK(weighed.difference.degrees_of_freedom == Approx(4.0).epsilon(1e-12));
    CHECK(weighed.p_value == Approx(plain.p_value).epsilon(1e-12));
    CHECK(weighed.difference.interval.high == Approx(plain.difference.interval.high).epsilon(1e-12));
}

TEST_CASE("only what both results hold is compared, and the rest is said") {
    const Quantities before{{Quantity::damping_ratio, estimate(0.27, 0.01)},
                            {Quantity::stiffness, estimate(1.0, 0.1)}};
    const Quantities after{{Quantity::damping_ratio, estimate(0.27, 0.01)},
                           {Quantity::mass, estimate(1.0, 0.1)}};
    const Comparison comparison = compare(before, after);
    CHECK(comparison.quantities.size() == 1);
    CHECK(comparison.findings.size() == 2);
}

// The false-alarm rate claimed for `changed` is one minus the confidence level. 20,000 pairs of equal
// articles (seed 20311), 5 releases each: at 5 % the rate has a standard error of 0.00154; 0.0425 … 0.0575 is
// ± 4.9 of them, one false alarm in a million. Welch's test at equal counts and spreads is known to be
// slightly conservative (true size near 0.048 at 5 and 5), which lies inside.
TEST_CASE("equal articles are called changed as seldom as is claimed", "[study]") {
    std::mt19937_64 generator(20311);
    int alarms = 0;
    constexpr int pairs = 20000;
    for (int pair = 0; pair < pairs; ++pair) {
        const Estimate before = mean_of_draws(generator, 0.27, 0.004, 5);
        const Estimate after = mean_of_draws(generator, 0.27, 0.004, 5);
        alarms += compare(before, after, 0.95).changed ? 1 : 0;
    }
    const double rate = static_cast<double>(alarms) / pairs;
    INFO("false-alarm rate " << rate);
    CHECK(rate > 0.0425);
    CHECK(rate < 0.0575);
}

// The same for equivalence: articles that lie apart by exactly the margin are called the same in at most 5 %.
TEST_CASE("articles at the margin are called the same as seldom as is claimed", "[study]") {
    std::mt19937_64 generator(20312);
    int alarms = 0;
    constexpr int pairs = 20000;
    for (int pair = 0; pair < pairs; ++pair) {
        const Estimate before = mean_of_draws(generator, 1.0, 0.01, 5);
        const Estimate after = mean_of_draws(generator, 1.05, 0.0105, 5);
        alarms += compare(before, after, 0.95, EquivalenceMargin{0.05, true}).equivalence->equivalent ? 1 : 0;
    }
    const double rate = static_cast<double>(alarms) / pairs;
    INFO("false-equivalence rate " << rate);
    CHECK(rate > 0.0425);
    CHECK(rate < 0.0575);
}
