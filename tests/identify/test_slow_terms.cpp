// Slow movements under a decay. Truth from tests/support with a term added in closed form; seeds at each
// case.

#include <catch2/catch.hpp>
#include <cmath>

#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;

namespace {

bool said(const EventIdentification& result, const std::string& code) {
    return std::any_of(result.findings.begin(), result.findings.end(),
                       [&](const Finding& f) { return f.code == code; });
}

/// 5 Hz, damping ratio 0.08, twelve cycles, 40 dB, and under it `slow` of the time in s.
EventIdentification identify_over(std::uint64_t seed, double (*slow)(double)) {
    simulated::Truth truth;
    truth.damping_ratio = 0.08;
    truth.cycles = 12.0;
    simulated::Deviates deviates(seed);
    simulated::Sample sample = simulated::draw(truth, deviates);
    for (std::size_t i = 0; i < sample.recording.size(); ++i)
        sample.recording.samples[i] += slow(static_cast<double>(i) / sample.recording.clock.sample_rate_hz);
    IdentifyOptions options;
    options.replicates = 100;
    return identify_event(sample.recording, sample.event, options);
}

void check_truth(const EventIdentification& result, int& held) {
    REQUIRE(result.curve_fit.status == MethodStatus::ok);
    const Estimate& ratio = result.curve_fit.quantities.at(Quantity::damping_ratio);
    held += ratio.interval.low <= 0.08 && 0.08 <= ratio.interval.high;
}

}  // namespace

TEST_CASE("the exponential of an AC-coupled sensor is fitted with the decay and named", "[long]") {
    int held = 0, agreed = 0;
    for (std::uint64_t seed = 50; seed < 70; ++seed) {
        const auto result = identify_over(seed, [](double t) { return -0.4 * std::exp(-5.0 * t); });
        check_truth(result, held);
        CHECK(said(result, "slow_exponential"));
        agreed += result.agreement.consistent;
    }
    CHECK(held >= 16);    // of 20 at 95 %: fewer are seen once in 400
    CHECK(agreed >= 18);  // of 20 at 99 %: fewer are seen once in 1,000
}

TEST_CASE("the ring is the mode where the tail of an AC-coupled sensor is larger") {
    // 10 recordings of a 5 Hz ring on a tail of three times its amplitude. Without a start for both, one term
    // settles on the tail, beyond critical damping. Within 5 % of 0.08: more than four of its uncertainties.
    for (std::uint64_t seed = 50; seed < 60; ++seed) {
        const auto result = identify_over(seed, [](double t) { return -3.0 * std::exp(-2.5 * t); });
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        INFO("seed " << seed);
        CHECK(result.curve_fit.quantities.at(Quantity::damping_ratio).value == Approx(0.08).epsilon(0.05));
        CHECK(said(result, "slow_exponential"));
    }
}

TEST_CASE("a straight drift is fitted with the decay and named") {
    int held = 0;
    for (std::uint64_t seed = 50; seed < 70; ++seed) {
        const auto result = identify_over(seed, [](double t) { return 0.1 * t; });
        check_truth(result, held);
        CHECK((said(result, "drift") || said(result, "slow_exponential")));
    }
    CHECK(held >= 16);
}

// The curved ramp of a sensor that warms up, for a while after the decay too: a noise model of the residuals
// takes it for slow noise, and a damper that is stronger one way for the shift of the mean. With the noise
// estimated beside the term it is found. 20 recordings each; fewer than 16 of 20 at 95 % are seen once in
// 400.
TEST_CASE("a sensor that warms up is a slow term, and no law of damping") {
    for (const double phi : {0.0, 0.7}) {
        int held = 0, laws = 0;
        for (std::uint64_t seed = 250; seed < 270; ++seed) {
            simulated::Truth truth;
            truth.damping_ratio = 0.08, truth.cycles = 40.0, truth.noise_correlation = phi;
            simulated::Deviates deviates(seed);
            simulated::Sample sample = simulated::draw(truth, deviates);
            for (std::size_t i = 0; i < sample.recording.size(); ++i)
                sample.recording.samples[i] -=
                    0.25 * std::expm1(-static_cast<double>(i) / sample.recording.clock.sample_rate_hz / 5.0);
            IdentifyOptions options;
            options.replicates = 0;
            const EventIdentification result = identify_event(sample.recording, sample.event, options);
            check_truth(result, held);
            laws += result.curve_fit.model != "viscous";
            CHECK((said(result, "drift") || said(result, "slow_exponential")));
        }
        INFO("φ " << phi << ", held " << held << ", laws " << laws);
        CHECK(held >= 16);
        CHECK(laws <= 1);
    }
}

TEST_CASE("nothing slow is found where there is nothing", "[long]") {
    int found = 0;
    for (std::uint64_t seed = 100; seed < 200; ++seed) {
        const auto result = identify_over(seed, [](double) { return 0.0; });
        found += said(result, "drift") || said(result, "slow_exponential");
    }
    CHECK(found <= 2);  // at one in a thousand: more is seen once in 6,000
}
