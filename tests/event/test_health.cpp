// Findings that need a decay: mains hum, sampling, clipping inside a window given by hand, the mode meant.

#include <catch2/catch.hpp>

#include "ringwright/event.hpp"
#include "support/simulator.hpp"

using namespace ringwright;
using simulator::Generator;
using simulator::Noise;

namespace {

bool has(const Findings& findings, const std::string& code) {
    return std::any_of(findings.begin(), findings.end(),
                       [&](const Finding& finding) { return finding.code == code; });
}

}  // namespace

TEST_CASE("mains hum is found after the decay, in a window by hand too") {
    for (const double mains_hz : {50.0, 60.0}) {
        Generator generator(401);
        const auto truth = simulator::running_decay({5.0, 0.05}, 1000.0, 8.0, 0.4,
                                                    Noise{60.0, 0.0, mains_hz, 35.0}, generator);
        CHECK(has(find_events(truth.recording).findings, "mains_hum"));
        EventOptions window;
        window.from_s = 0.1;
        CHECK(has(find_events(truth.recording, window).findings, "mains_hum"));
    }
    Generator generator(402);
    const auto without = simulator::running_decay({5.0, 0.05}, 1000.0, 8.0, 0.4, Noise{50.0}, generator);
    CHECK_FALSE(has(find_events(without.recording).findings, "mains_hum"));
}

TEST_CASE("hum and quantisation do not move the start") {
    for (const double hum_decibels : {40.0, 26.0}) {  // 1 and 5 % of the amplitude
        Generator generator(403);
        auto truth = simulator::running_decay({5.0, 0.05}, 1000.0, 4.0, 0.4,
                                              Noise{60.0, 0.0, 50.0, hum_decibels}, generator);
        for (double& value : truth.recording.samples) value = std::round(value * 64.0) / 64.0;  // 8 bit
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        CHECK(search.events[0].begin == 0);
    }
}

TEST_CASE("a window by hand is checked for clipping and sampling") {
    Generator generator(404);
    auto truth = simulator::running_decay({5.0, 0.02}, 30.0, 8.0, 0.4, Noise{60.0}, generator);
    truth.recording.clipped.push_back({40, 42});
    EventOptions window;
    window.from_s = 1.0;
    const EventSearch search = find_events(truth.recording, window);
    REQUIRE(search.events.size() == 1);
    CHECK(has(search.events[0].findings, "clipped_samples"));
    CHECK(has(search.events[0].findings, "too_low_sampling_rate"));
    window.from_s = 2.0;
    CHECK_FALSE(has(find_events(truth.recording, window).events[0].findings, "clipped_samples"));
}

TEST_CASE("the mode meant steers the frequency that is guessed") {
    Generator generator(405);
    auto truth = simulator::running_decay({5.0, 0.01}, 500.0, 8.0, 0.4, Noise{60.0}, generator);
    for (std::size_t i = 0; i < truth.recording.size(); ++i) {
        const double t = static_cast<double>(i) / 500.0;
        truth.recording.samples[i] += 0.3 * simulator::free_decay({17.0, 0.005}, 1.0, 0.0, t).x;
    }
    EventOptions meant;
    const EventSearch strongest = find_events(truth.recording);
    meant.near_hz = 16.0;
    const EventSearch second = find_events(truth.recording, meant);
    REQUIRE(strongest.events.size() == 1);
    REQUIRE(second.events.size() == 1);
    // One part in a hundred: an eighth of the line's width of the record of 8 s is 0.02 Hz.
    CHECK(strongest.events[0].frequency_guess_hz == Approx(5.0).epsilon(0.01));
    CHECK(second.events[0].frequency_guess_hz == Approx(17.0).epsilon(0.01));
}
