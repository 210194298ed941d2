// Intervals beyond critical damping, where the valley of good fits is bent and may have no end.
// Recordings of known truth from tests/support; seeds are written at each case.

#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;

namespace {

EventIdentification identify_drawn(const simulated::Truth& truth, std::uint64_t seed) {
    simulated::Deviates deviates(seed);
    const simulated::Sample sample = simulated::draw(truth, deviates);
    IdentifyOptions options;
    options.replicates = 0;
    return identify_event(sample.recording, sample.event, options);
}

simulated::Truth heavily_damped(double damping_ratio) {
    simulated::Truth truth;
    truth.damping_ratio = damping_ratio;
    truth.cycles = 3.0;
    return truth;
}

}  // namespace

// Eighty recordings each; fewer than 69 of 80 hits at a true 95 % are seen once in 2,000. Rays from the best
// fit, as the region was traced before, held the truth in 83 % at a damping ratio of 3.
TEST_CASE("95 % intervals hold damping ratios beyond critical, open ends included") {
    for (const double damping : {1.5, 3.0}) {
        int answered = 0, held = 0;
        for (std::uint64_t seed = 4000; seed < 4080; ++seed) {
            const EventIdentification result = identify_drawn(heavily_damped(damping), seed);
            const auto ratio = result.curve_fit.quantities.find(Quantity::damping_ratio);
            if (ratio == result.curve_fit.quantities.end()) continue;
            ++answered;
            held += ratio->second.interval.low <= damping && damping <= ratio->second.interval.high;
        }
        INFO("damping ratio " << damping << ", answered " << answered << ", held " << held);
        CHECK(answered >= 65);
        CHECK(held >= answered - 11);
    }
}

TEST_CASE("an interval is never infinite, and an open end is said to be one") {
    int open = 0;
    for (std::uint64_t seed = 4000; seed < 4030; ++seed) {
        const EventIdentification result = identify_drawn(heavily_damped(3.0), seed);
        for (const auto& [quantity, estimate] : result.curve_fit.quantities) {
            INFO(key_of(quantity));
            CHECK(std::isfinite(estimate.interval.low));
            CHECK(std::isfinite(estimate.interval.high));
        }
        const auto ratio = result.curve_fit.quantities.find(Quantity::damping_ratio);
        if (ratio == result.curve_fit.quantities.end() || ratio->second.interval.high < 99.0) continue;
        ++open;
        const bool said = std::any_of(result.findings.begin(), result.findings.end(),
                                      [](const Finding& f) { return f.code == "beyond_critical"; });
        CHECK(said);
    }
    CHECK(open > 3);
}

TEST_CASE("an acceleration that begins with a sample before its jump") {
    // Let go from rest at critical damping: the second derivative of (1 + ωt) e^(−ωt) is −ω² (1 − ωt)
    // e^(−ωt). 500 samples a second, 5.9 Hz, noise of 2 % of the jump. The event given begins one sample too
    // early. Twenty: 95 % is 19, fewer than 16 once in 400. With the sample before the jump all gave more
    // than twice the frequency, and none held it.
    constexpr double rate_hz = 500.0, natural_hz = 5.9, noise = 0.02;
    constexpr std::size_t jump = 150;
    const double omega = 2.0 * std::numbers::pi * natural_hz;
    int held = 0;
    for (std::uint64_t seed = 4200; seed < 4220; ++seed) {
        simulated::Deviates deviates(seed);
        Recording recording;
        recording.quantity = MeasuredQuantity::acceleration;
        recording.clock.sample_rate_hz = rate_hz;
        for (std::size_t i = 0; i < 500; ++i) {
            const double t = (static_cast<double>(i) - static_cast<double>(jump) + 0.4) / rate_hz;
            const double decay = i < jump ? 0.0 : -(1.0 - omega * t) * std::exp(-omega * t);
            recording.samples.push_back(decay + noise * deviates.normal());
        }
        Event event;
        event.kind = TestKind::pluck;
        event.begin = jump - 1;
        event.end = 300;
        event.frequency_guess_hz = 5.0;
        IdentifyOptions options;
        options.replicates = 0;
        const EventIdentification result = identify_event(recording, event, options);
        INFO("seed " << seed);
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        const Estimate& frequency = result.curve_fit.quantities.at(Quantity::natural_frequency);
        CHECK(frequency.value < 2.0 * natural_hz);
        held += frequency.interval.low <= natural_hz && natural_hz <= frequency.interval.high;
    }
    CHECK(held >= 16);
}

// Decays that slow noise all but hides, the event given: some fits end between no damping and any. Seeds 1 to 60.
TEST_CASE("an interval from no damping to any is no answer, and none ends before it begins") {
    for (std::uint64_t seed = 1; seed <= 60; ++seed) {
        INFO("seed " << seed);
        simulated::Truth truth;
        truth.signal_to_noise_db = seed % 2 == 0 ? -10.0 : 3.0;
        truth.noise_correlation = 0.98, truth.cycles = 4.0;
        const EventIdentification result = identify_drawn(truth, seed);
        for (const auto& [quantity, estimate] : result.curve_fit.quantities) {
            INFO(key_of(quantity));
            CHECK(estimate.interval.low <= estimate.interval.high);
        }
        const auto ratio = result.curve_fit.quantities.find(Quantity::damping_ratio);
        if (ratio != result.curve_fit.quantities.end())
            CHECK((ratio->second.interval.low > 0.0 || ratio->second.interval.high < 100.0));
    }
}
