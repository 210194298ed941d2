// Worked examples of textbooks and answer pages. Where a printed figure comes from rounded intermediates, the
// exact figure is tested to its digits and the printed one to the rounding. "from memory": the page was not
// seen.
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/damping_relations.hpp"
#include "ringwright/property.hpp"

using namespace ringwright;

namespace {

constexpr double pi = std::numbers::pi;
constexpr double table_gravity = 9.81;  // the books' value, m/s²

/// What the whole step from loadings to mass and stiffness says, nothing known of the mass.
Quantities from_loadings(double frequency_hz, double loaded_frequency_hz, double added_mass) {
    const auto frequency = [](double value) {
        return Estimate{value, 1e-4 * value, {0.9998 * value, 1.0002 * value}};
    };
    Loading plain, loaded;
    plain.natural_frequency = frequency(frequency_hz);
    loaded.natural_frequency = frequency(loaded_frequency_hz);
    plain.damping_ratio = loaded.damping_ratio = {0.01, 1e-4, {0.0098, 0.0102}};
    loaded.added_mass.value = added_mass;
    return derive_properties({plain, loaded}, {}, false, 0.95).quantities;
}

}  // namespace

TEST_CASE("E1 motorcycle: 200 kg, damped period 2 s, a quarter left after half a cycle") {
    // Rao, Mechanical Vibrations, design example of a shock absorber; seen on an answer page.
    const double decrement = decrement_between(1.0, 0.25, 0.5);
    const double ratio = damping_ratio_from_decrement(decrement);
    const double frequency = undamped_frequency(0.5, ratio);
    const double stiffness = stiffness_of(200.0, frequency);
    CHECK(decrement == Approx(2.7726).epsilon(2e-5));  // ln 16, printed to five digits
    CHECK(ratio == Approx(0.4037127519).epsilon(1e-9));
    CHECK(2.0 * pi * frequency == Approx(3.43386320).epsilon(2e-9));
    CHECK(stiffness == Approx(2358.283291).epsilon(1e-9));
    CHECK(stiffness == Approx(2358.2652).epsilon(5e-5));  // printed, from rounded intermediates
    CHECK(critical_damping_coefficient(stiffness, 200.0) == Approx(1373.545279).epsilon(1e-9));
    CHECK(ratio * critical_damping_coefficient(stiffness, 200.0) == Approx(554.517744).epsilon(2e-9));
}

TEST_CASE("E2 cannon: critical damping of 500 kg on 10 kN/m") {
    // Rao, gun barrel example: data seen on an exercise sheet, 4472.1359 from memory and recomputed.
    CHECK(critical_damping_coefficient(10e3, 500.0) == Approx(4472.135955).epsilon(1e-9));
}

TEST_CASE("E3 over-damped: 2 kg, 67.882 N s/m, 400 N/m") {
    // Seen on an answer page: ζ = 1.2, rounded from 1.199996.
    CHECK(damping_ratio_of(67.882, 400.0, 2.0) == Approx(1.199996).epsilon(5e-7));
}

TEST_CASE("E4 added mass: 94 cycles a minute, 76.7 with 0.453 kg more") {
    // Thomson, Theory of Vibration, exercise; seen with answers 0.902 kg and 87.4 N/m.
    const auto article = from_added_mass(94.0 / 60.0, 76.7 / 60.0, 0.453);
    REQUIRE(article);
    CHECK(article->mass == Approx(0.902421).epsilon(1e-6));
    CHECK(article->stiffness == Approx(87.44244).epsilon(1e-7));
    const Quantities line = from_loadings(94.0 / 60.0, 76.7 / 60.0, 0.453);
    CHECK(line.at(Quantity::mass).value == Approx(0.902421).epsilon(1e-6));
    CHECK(line.at(Quantity::stiffness).value == Approx(87.44244).epsilon(1e-7));
}

TEST_CASE("E5 added mass: 1.5 Hz, 0.9 Hz with 80 g more") {
    // Seen in a physics forum: 0.045 kg, 3.99 N/m.
    const auto article = from_added_mass(1.5, 0.9, 0.080);
    REQUIRE(article);
    CHECK(article->mass == Approx(0.045).epsilon(1e-12));
    CHECK(article->stiffness == Approx(3.997190).epsilon(2e-7));
    const Quantities line = from_loadings(1.5, 0.9, 0.080);
    CHECK(line.at(Quantity::mass).value == Approx(0.045).epsilon(1e-9));
    CHECK(line.at(Quantity::stiffness).value == Approx(3.997190).epsilon(2e-7));
    CHECK_FALSE(from_added_mass(0.9, 1.5, 0.080));
    CHECK_FALSE(from_added_mass(1.5, 0.9, 0.0));
}

TEST_CASE("E6 0.85 kg at 1.43 Hz, 0.32 kg more or less") {
    // Seen on an answer page: 1.218 Hz and 1.810 Hz (truncated).
    const double stiffness = stiffness_of(0.85, 1.43);
    CHECK(natural_frequency_of(stiffness, 0.85 + 0.32) == Approx(1.218856).epsilon(5e-7));
    CHECK(natural_frequency_of(stiffness, 0.85 - 0.32) == Approx(1.810955).epsilon(5e-7));
}

TEST_CASE("E7 8 kg, 5400 N/m, 40 N s/m") {
    // Seen on an answer page: critical 416 N s/m, ζ 0.096; decrement and ratio computed.
    const double ratio = damping_ratio_of(40.0, 5400.0, 8.0);
    CHECK(critical_damping_coefficient(5400.0, 8.0) == Approx(415.6921938).epsilon(1e-9));
    CHECK(ratio == Approx(0.0962250449).epsilon(1e-9));
    CHECK(logarithmic_decrement(ratio) == Approx(0.607418).epsilon(1e-6));
    CHECK(std::exp(logarithmic_decrement(ratio)) == Approx(1.835686).epsilon(1e-6));
}

TEST_CASE("E8 7.5 kg, 24 oscillations in 14 s, a quarter left after five cycles") {
    // Data seen on an answer page (which rounds the frequency to 1.7 Hz); answers computed.
    const double decrement = decrement_between(1.0, 0.25, 5.0);
    const double ratio = damping_ratio_from_decrement(decrement);
    const double stiffness = stiffness_of(7.5, undamped_frequency(24.0 / 14.0, ratio));
    CHECK(decrement == Approx(0.277259).epsilon(2e-6));
    CHECK(ratio == Approx(0.044084).epsilon(1.2e-5));  // printed to five digits
    CHECK(stiffness == Approx(871.8309).epsilon(1e-7));
    CHECK(ratio * critical_damping_coefficient(stiffness, 7.5) == Approx(7.12951).epsilon(1e-6));
}

TEST_CASE("E9 6 kg, 5400 N/m, successive extremes as 3 to 2") {
    // Data seen on an answer page; answers computed.
    const double decrement = decrement_between(3.0, 2.0, 1.0);
    const double ratio = damping_ratio_from_decrement(decrement);
    CHECK(decrement == Approx(0.405465).epsilon(1e-6));
    CHECK(std::exp(2.0 * decrement) == Approx(2.25).epsilon(1e-12));
    CHECK(ratio == Approx(0.0643978).epsilon(1e-6));
    CHECK(ratio * critical_damping_coefficient(5400.0, 6.0) == Approx(23.18322).epsilon(2e-7));
    CHECK(decrement / (2.0 * pi) / ratio - 1.0 ==
          Approx(0.00208).epsilon(1e-3));  // error of the light formula
}

TEST_CASE("E10 torsion, 13 % left after 100 cycles") {
    // Data seen in a physics forum; answers computed.
    const double decrement = decrement_between(1.0, 0.13, 100.0);
    CHECK(decrement == Approx(0.0204022).epsilon(2e-6));
    CHECK(damping_ratio_from_decrement(decrement) == Approx(0.00324710).epsilon(1.6e-6));
    CHECK(decrement_between(1.0, 0.13, 99.0) == Approx(0.0206083).epsilon(2e-6));
}

TEST_CASE("E11 dry friction: 20 kg, 10 kN/m, 50 N, pulled 50 mm") {
    // Rao, problem on Coulomb damping: five half cycles seen on an answer page; rest computed, gravity 9.81.
    CHECK(friction_loss_per_cycle(50.0, 10e3) == Approx(0.020).epsilon(1e-14));
    CHECK(half_cycles_to_rest(0.050, 50.0, 10e3) == 5);
    const double frequency = natural_frequency_of(10e3, 20.0);
    CHECK(5.0 * 0.5 / frequency == Approx(0.702481).epsilon(1e-6));
    CHECK(static_deflection(frequency, table_gravity) == Approx(0.019620).epsilon(1e-12));
}

TEST_CASE("E12 dry friction coefficient from 100 mm to 10 mm in five cycles of 0.4 s") {
    // Rao, example on Coulomb damping (0.1132, from memory; recomputed with g = 9.81). Per kilogram of mass.
    const double force = friction_force_from_loss(0.100, 0.010, 5.0, stiffness_of(1.0, 1.0 / 0.4));
    CHECK(force / table_gravity == Approx(0.1131835).epsilon(5e-7));
}

TEST_CASE("E13 natural frequency from static deflection") {
    // 1 kg that sags 15 mm: 4.0701 Hz with g = 9.81 (seen on an exercise page). With standard gravity f
    // = 15.760880/√mm and 3.127257/√inch (computed).
    CHECK(natural_frequency_from_deflection(0.015, table_gravity) == Approx(4.0701).epsilon(2e-5));
    CHECK(natural_frequency_from_deflection(1e-3) == Approx(15.760880).epsilon(5e-8));
    CHECK(natural_frequency_from_deflection(0.0254) == Approx(3.127257).epsilon(2e-7));
    CHECK(static_deflection(natural_frequency_from_deflection(0.0123)) == Approx(0.0123).epsilon(1e-14));
}

TEST_CASE("E14 49.2 g on 857.8 N/m, 0.11 kg/s") {
    // Seen on an answer page: 21 Hz, 12.993 kg/s, 0.85 %.
    CHECK(natural_frequency_of(857.8, 0.0492) == Approx(21.0150584).epsilon(5e-9));
    CHECK(critical_damping_coefficient(857.8, 0.0492) == Approx(12.99288421).epsilon(1e-9));
    CHECK(damping_ratio_of(0.11, 857.8, 0.0492) == Approx(0.00846617258).epsilon(1e-9));
}

TEST_CASE("E15 0.32 kg with 0.025 kg/s: envelope from 5.6 cm to 2.5 cm") {
    // Data seen on an answer page; computed 20.645782 s. The decay rate c/(2m) is ζω_n whatever the
    // stiffness.
    const double stiffness = 100.0;
    const double rate =
        decay_rate(natural_frequency_of(stiffness, 0.32), damping_ratio_of(0.025, stiffness, 0.32));
    CHECK(std::log(5.6 / 2.5) / rate == Approx(20.645782).epsilon(3e-8));
}

TEST_CASE("E16 quality factor from the ratio of neighbouring extremes") {
    // Seen in a suspension laboratory's notes: 0.99, 0.98, 0.9 → Q 156, 77, 15 (printed truncated or
    // rounded), by the light-damping form π/δ = 156.2929189, 77.75177367, 14.908776. Exactly Q² = (π/δ)² +
    // 1/4.
    const auto quality = [](double ratio) {
        return quality_factor(damping_ratio_from_decrement(decrement_between(1.0, ratio, 0.5)));
    };
    CHECK(quality(0.99) == Approx(std::hypot(156.2929189, 0.5)).epsilon(1e-9));
    CHECK(quality(0.98) == Approx(std::hypot(77.75177367, 0.5)).epsilon(1e-9));
    CHECK(quality(0.90) == Approx(std::hypot(14.908776, 0.5)).epsilon(5e-8));
}

TEST_CASE("E17 mass of the spring itself") {
    // β tan β = m_s/m against Rayleigh's third, frequency ratios with 12 digits (rule seen in a physics
    // forum's worked answer; ratios computed). The stiffness goes with the square of the frequency.
    const auto frequency_ratio = [](double share) { return std::sqrt(rule_of_a_third_ratio(share)); };
    CHECK(frequency_ratio(0.01) == Approx(0.999998895215).epsilon(1e-12));
    CHECK(frequency_ratio(0.1) == Approx(0.999895012085).epsilon(1e-12));
    CHECK(frequency_ratio(0.5) == Approx(0.997888221398).epsilon(1e-12));
    CHECK(frequency_ratio(1.0) == Approx(0.993427658426).epsilon(1e-12));
    CHECK(frequency_ratio(2.0) == Approx(0.983046956489).epsilon(1e-12));
    CHECK(frequency_ratio(5.0) == Approx(0.959491405632).epsilon(1e-12));
}

TEST_CASE("E18 torsion wire, steel, 2 mm by 1 m, disc of 2 kg and 0.1 m radius") {
    // Own numbers: stiffness π d⁴ G/(32 L) = 0.125663706 N·m/rad, inertia m R²/2 = 0.01 kg·m².
    const double stiffness = pi * std::pow(2e-3, 4) * 80e9 / 32.0;
    CHECK(stiffness == Approx(0.125663706).epsilon(3e-9));
    CHECK(natural_frequency_of(stiffness, 0.01) == Approx(0.564189584).epsilon(1e-9));
    CHECK(stiffness_of(0.01, 0.564189584) == Approx(stiffness).epsilon(2e-9));
}

TEST_CASE("E19 cycles before friction holds") {
    // Continuous form n = (k x₀/F − 1)/4 seen on an answer page: whole half cycles are the next integer above
    // 2n.
    for (double start : {0.011, 0.031, 0.052, 0.0999}) {
        const double cycles = (10e3 * start / 50.0 - 1.0) / 4.0;
        CHECK(static_cast<double>(half_cycles_to_rest(start, 50.0, 10e3)) == std::ceil(2.0 * cycles));
    }
    CHECK(half_cycles_to_rest(0.004, 50.0, 10e3) == 0);
}
