// A second mode under the one reported. Truth: sums of two decays in closed form; seeds at each case.

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double rate_hz = 2000.0;

/// 8 Hz, damping ratio 0.02, amplitude 1, and beside it f₂, ζ₂, amplitude `share`; 5 s, noise of 0.003.
EventIdentification two_modes(std::uint64_t seed, double f2, double zeta2, double share) {
    simulated::Deviates deviates(seed);
    Recording recording;
    recording.clock.sample_rate_hz = rate_hz;
    for (int i = 0; i < 10000; ++i) {
        const double t = i / rate_hz;
        const auto mode = [&](double f, double zeta) {
            return std::exp(-zeta * two_pi * f * t) * std::cos(two_pi * f * std::sqrt(1.0 - zeta * zeta) * t);
        };
        recording.samples.push_back(mode(8.0, 0.02) + share * mode(f2, zeta2) + 0.003 * deviates.normal());
    }
    Event event;
    event.end = event.rest_end = recording.size();
    event.frequency_guess_hz = 8.0;
    IdentifyOptions options;
    options.replicates = 0;
    return identify_event(recording, event, options);
}

}  // namespace

// A mode with a damping ratio of 0.015 is ten bins wide here: it does not stand out of its near surroundings,
// which its own skirts fill.
TEST_CASE("a second mode that is some bins wide is found, and the first is not biased", "[long]") {
    for (const double share : {0.05, 0.2, 0.6}) {
        int held = 0;
        for (std::uint64_t seed = 1; seed <= 6; ++seed) {
            const EventIdentification result = two_modes(seed, 31.0, 0.015, share);
            REQUIRE(result.curve_fit.status == MethodStatus::ok);
            INFO("share " << share << ", seed " << seed);
            REQUIRE(result.curve_fit.modes.size() == 2);
            // 0.2 % and 6 % are asked of close modes; these are far apart.
            const Mode& second = result.curve_fit.modes[1];
            CHECK(second.quantities.at(Quantity::natural_frequency).value == Approx(31.0).epsilon(0.002));
            const Estimate& first = result.curve_fit.quantities.at(Quantity::damping_ratio);
            held += first.interval.low <= 0.02 && 0.02 <= first.interval.high;
        }
        CHECK(held >= 4);  // of 6 at 95 %: fewer are seen once in 450
    }
}

TEST_CASE("hum of a third of the amplitude is a tone, not the mode reported") {
    for (std::uint64_t seed = 1; seed <= 2; ++seed) {
        const EventIdentification result = two_modes(seed, 50.0, 0.0, 0.33);
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        const Estimate& f = result.curve_fit.quantities.at(Quantity::natural_frequency);
        CHECK(std::abs(f.value - 8.0) < 4.0 * f.standard_uncertainty);
        CHECK(std::any_of(result.findings.begin(), result.findings.end(),
                          [](const Finding& found) { return found.code == "steady_tone"; }));
    }
}

// 18.0 and 20.2 Hz struck alike: each frequency within 0.2 % and each damping ratio within 6 % are what is
// asked of the program at 40 dB (no other source).
TEST_CASE("two close modes of equal amplitude are found in the recording, and both are listed") {
    constexpr double start_s = 0.5, zetas[] = {0.01, 0.012}, hertz[] = {18.0, 20.2};
    for (std::uint64_t seed = 1; seed <= 3; ++seed) {
        INFO("seed " << seed);
        simulated::Deviates deviates(seed);
        Recording recording;
        recording.clock.sample_rate_hz = rate_hz;
        for (int i = 0; i < 10000; ++i) {
            const double t = i / rate_hz - start_s;
            double value = 0.02 * deviates.normal();
            for (int k = 0; k < 2; ++k) {
                const double w = two_pi * hertz[k];
                if (t >= 0.0)
                    value +=
                        std::exp(-zetas[k] * w * t) * std::sin(w * std::sqrt(1.0 - zetas[k] * zetas[k]) * t);
            }
            recording.samples.push_back(value);
        }
        const EventSearch search = find_events(recording);
        REQUIRE(search.events.size() == 1);
        IdentifyOptions options;
        options.replicates = 0;
        const EventIdentification result = identify_event(recording, search.events[0], options);
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        REQUIRE(result.curve_fit.modes.size() == 2);
        for (int k = 0; k < 2; ++k) {
            const auto away = [&](const Mode& mode) {
                return std::abs(mode.quantities.at(Quantity::natural_frequency).value - hertz[k]);
            };
            const Mode& mode = *std::ranges::min_element(result.curve_fit.modes, {}, away);
            CHECK(away(mode) < 0.002 * hertz[k]);
            CHECK(mode.quantities.at(Quantity::damping_ratio).value == Approx(zetas[k]).epsilon(0.06));
        }
    }
}
