// Relations among the formulas; values from outside stand in tests/checks/.
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/damping_relations.hpp"

using namespace ringwright;

namespace {
constexpr double pi = std::numbers::pi;
constexpr double rounding = 1e-12;
}  // namespace

TEST_CASE("half-power points and back, any frequency and damping") {
    for (const auto response :
         {FrequencyResponse::receptance, FrequencyResponse::mobility, FrequencyResponse::accelerance})
        for (double ratio : {1e-6, 1e-3, 0.05, 0.25, 0.38})
            for (double frequency : {1e-3, 7.0, 4e5}) {
                const auto points = half_power_points(response, {frequency, ratio});
                REQUIRE(points);
                const auto back = from_half_power_points(response, *points);
                CHECK(back.natural_frequency_hz == Approx(frequency).epsilon(rounding));
                CHECK(back.damping_ratio ==
                      Approx(ratio).epsilon(1e-9));  // f₂ − f₁ cancels ten digits at 1e-6
            }
}

TEST_CASE("half-power points lie where the response is 1/√2 of its peak") {
    const double ratio = 0.17;
    const auto receptance = [&](double r) { return 1.0 / std::hypot(1.0 - r * r, 2.0 * ratio * r); };
    const auto level = [&](FrequencyResponse response, double r) {
        const int power = response == FrequencyResponse::receptance ? 0
                          : response == FrequencyResponse::mobility ? 1
                                                                    : 2;
        return receptance(r) * std::pow(r, power);
    };
    for (const auto response :
         {FrequencyResponse::receptance, FrequencyResponse::mobility, FrequencyResponse::accelerance}) {
        const double peak = level(response, *peak_frequency(response, {1.0, ratio}));
        const auto points = half_power_points(response, {1.0, ratio});
        CHECK(level(response, points->low_hz) == Approx(peak / std::sqrt(2.0)).epsilon(rounding));
        CHECK(level(response, points->high_hz) == Approx(peak / std::sqrt(2.0)).epsilon(rounding));
    }
}

TEST_CASE("no half-power points without damping or frequency") {
    CHECK_FALSE(half_power_points(FrequencyResponse::receptance, {1.0, 0.0}));
    CHECK_FALSE(half_power_points(FrequencyResponse::mobility, {0.0, 0.1}));
    CHECK_FALSE(half_power_points(FrequencyResponse::accelerance, {1.0, -0.1}));
}

TEST_CASE("equivalent viscous damping takes the same energy in a cycle") {
    // Energy of a viscous force over one cycle of amplitude X: π c ω X²; friction: 4 F X; quadratic: (8/3) c₂
    // ω² X³.
    const double amplitude = 0.003, omega = 31.0, force = 2.5, quadratic = 40.0;
    const auto energy = [&](double c) { return pi * c * omega * amplitude * amplitude; };
    CHECK(energy(equivalent_viscous_of_friction(force, amplitude, omega)) ==
          Approx(4.0 * force * amplitude).epsilon(rounding));
    CHECK(energy(equivalent_viscous_of_quadratic(quadratic, amplitude, omega)) ==
          Approx(8.0 / 3.0 * quadratic * omega * omega * std::pow(amplitude, 3)).epsilon(rounding));
}

TEST_CASE("a growing oscillation has a negative damping ratio") {
    CHECK(damping_ratio_from_decrement(-logarithmic_decrement(0.02)) == Approx(-0.02).epsilon(rounding));
}

TEST_CASE("friction force and its loss of amplitude undo each other") {
    const double stiffness = 4e3, force = 3.0;
    const double loss = friction_loss_per_cycle(force, stiffness);
    CHECK(friction_force_from_loss(0.05, 0.05 - 3.0 * loss, 3.0, stiffness) ==
          Approx(force).epsilon(rounding));
}

TEST_CASE("a third of the spring moves") {
    CHECK(moving_mass(2.0, 0.3) == Approx(2.1).epsilon(rounding));
}
