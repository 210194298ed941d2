// Damping against amplitude: from stretches of the decay, and after the law that was fitted to all of it.

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/identify.hpp"
#include "support/simulated_law.hpp"

using namespace ringwright;

namespace {

EventIdentification identified(const simulated::Law& law, std::uint64_t seed) {
    simulated::Deviates deviates(seed);
    simulated::Bench bench;
    bench.signal_to_noise_db = 60.0;
    const simulated::Sample sample = simulated::draw(law, bench, deviates);
    IdentifyOptions options;
    options.pictures = true;
    options.replicates = 0;
    return identify_event(sample.recording, sample.event, options);
}

/// ζ of the viscous damper that takes the same energy in a cycle of this amplitude: c/(2√(km)) + 2F/(π k X)
/// (Jacobsen 1930; Den Hartog, Mechanical Vibrations; from memory).
double equivalent(const simulated::Law& law, double amplitude) {
    return law.compression / (2.0 * std::sqrt(law.stiffness * law.mass)) +
           2.0 * law.friction / (std::numbers::pi * law.stiffness * amplitude);
}

}  // namespace

TEST_CASE("friction that stops the mass within seven cycles still shows its damping against amplitude") {
    simulated::Law law;
    law.friction = 6.0;
    law.release = 0.020;
    const EventIdentification event = identified(law, 7101);
    REQUIRE(event.curve_fit.model == "viscous+friction");
    CHECK(event.course.points.size() >= 3);
    CHECK(event.course.depends_on_amplitude);
    // A stretch is a cycle or more, in which the swing falls by a third: 15 % for taking its middle.
    for (const AmplitudePoint& point : event.course.points)
        CHECK(point.damping_ratio.value == Approx(equivalent(law, point.amplitude)).epsilon(0.15));
    const DecayPicture& picture = event.picture;
    REQUIRE(picture.model_amplitude.size() > 10);
    REQUIRE(picture.model_low.size() == picture.model_amplitude.size());
    for (std::size_t i = 0; i < picture.model_amplitude.size(); ++i) {
        // 1 %: friction and damping come within that of the truth at 60 dB.
        CHECK(picture.model_damping_ratio[i] ==
              Approx(equivalent(law, picture.model_amplitude[i])).epsilon(0.01));
        CHECK(picture.model_low[i] < picture.model_damping_ratio[i]);
        CHECK(picture.model_high[i] > picture.model_damping_ratio[i]);
    }
    // The mass sticks at F/k = 0.75 mm; no stretch is taken of a mass that stands still.
    CHECK(std::ranges::min(picture.course_amplitude) > law.friction / law.stiffness);
}

TEST_CASE("a spring that hardens damps less, over its frequency, where the swing is large") {
    simulated::Law law;
    law.cubic = 0.3 * law.stiffness / (law.release * law.release);
    const EventIdentification event = identified(law, 7102);
    REQUIRE(event.curve_fit.model == "viscous+hardening");
    const DecayPicture& picture = event.picture;
    REQUIRE(picture.model_amplitude.size() > 10);
    REQUIRE(event.course.points.size() >= 3);
    CHECK(picture.model_damping_ratio.front() < picture.model_damping_ratio.back());
    // c/(2mω) with ω² = (k + ¾ k₃X²)/m, to first order in k₃X²/k ≤ 0.3: 4 % for the terms left out.
    for (const AmplitudePoint& point : event.course.points) {
        const double stiffness = law.stiffness + 0.75 * law.cubic * point.amplitude * point.amplitude;
        CHECK(point.damping_ratio.value ==
              Approx(law.compression / (2.0 * std::sqrt(stiffness * law.mass))).epsilon(0.04));
    }
}

TEST_CASE("viscous damping stands beside its course as a level") {
    const EventIdentification event = identified(simulated::Law{}, 7103);
    REQUIRE(event.curve_fit.model == "viscous");
    REQUIRE(event.course.points.size() >= 3);
    CHECK_FALSE(event.course.depends_on_amplitude);
    const double ratio = event.curve_fit.quantities.at(Quantity::damping_ratio).value;
    CHECK(event.picture.model_damping_ratio == std::vector<double>{ratio, ratio});
    CHECK(event.picture.model_amplitude.front() == std::ranges::max(event.picture.course_amplitude));
}
