// When a fitted decay is a motion of a mass on a spring that pushes and cannot pull. Expected values by hand.

#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "event/contact.hpp"

using namespace ringwright;
using namespace ringwright::event_search;

namespace {

constexpr double omega = 0.1, gravity = 0.02;  // rad a step; units a step²
constexpr double sag = gravity / (omega * omega);

/// x = amplitude · cos ωt about rest, downwards positive, as displacement, velocity or acceleration shows it.
DecayFit swing(MeasuredQuantity quantity, double amplitude, double down) {
    DecayFit fit;
    fit.shape = {omega, 0.0};
    fit.offset = 3.0;
    if (quantity == MeasuredQuantity::displacement) fit.cosine_part = down * amplitude;
    // ẋ = −ωX sin ωt, and S = sin ωt/ω
    if (quantity == MeasuredQuantity::velocity) fit.sine_part = -down * amplitude * omega * omega;
    if (quantity == MeasuredQuantity::acceleration) fit.cosine_part = -down * amplitude * omega * omega;
    return fit;
}

constexpr MeasuredQuantity quantities[] = {MeasuredQuantity::displacement, MeasuredQuantity::velocity,
                                           MeasuredQuantity::acceleration};

}  // namespace

TEST_CASE(
    "an undamped swing a quarter larger than the static deflection lifts off where its cosine is -0.8") {
    // Without damping, pull and the level of first touch are the same condition: 1.25 cos ωt < −1.
    const double back = (2.0 * std::numbers::pi - std::acos(-0.8)) / omega;
    for (const MeasuredQuantity quantity : quantities)
        for (const double down : {1.0, -1.0}) {
            INFO(to_text(quantity) << ", down " << down);
            const Swing seen(swing(quantity, 1.25 * sag, down), {quantity, down, gravity});
            const auto free = seen.last_free(0.0, 2.0 * std::numbers::pi / omega);
            REQUIRE(free);
            CHECK(*free == Approx(back).margin(0.01));  // as fine as it is looked for
            CHECK(seen.pushed(0.0));
            CHECK_FALSE(seen.pushed(std::numbers::pi / omega));
        }
}

TEST_CASE("a swing smaller than the static deflection never lifts off") {
    for (const MeasuredQuantity quantity : quantities) {
        const Swing seen(swing(quantity, 0.99 * sag, 1.0), {quantity, 1.0, gravity});
        CHECK_FALSE(seen.last_free(0.0, 200.0));
    }
}

TEST_CASE("a damper lets go below the level of first touch") {
    // x = e^(−st)[A·C + B·S] with x(0) = 0 and ẋ(0) = v: ẍ(0) = −2sv. Upwards at v = −0.6·g/s that is 1.2 g
    // down, more than gravity gives, though the mass lies at rest level, a whole static deflection below
    // first touch. Upwards at −0.4·g/s it is 0.8 g.
    const DecayShape shape{omega, 0.3};
    for (const double share : {0.6, 0.4}) {
        DecayFit fit;
        fit.shape = shape;
        fit.sine_part = -share * gravity / shape.decay_rate();
        const Swing seen(fit, {MeasuredQuantity::displacement, 1.0, gravity});
        CHECK(seen.pushed(0.0) == (share < 0.5));
    }
}
