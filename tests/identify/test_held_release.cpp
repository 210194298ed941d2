// A heavily damped article let go from rest in noise that hides when: truth from the simulator, seeds written
// at each case.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <optional>

#include "identify/held_release.hpp"
#include "identify/running_start.hpp"
#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;
using namespace ringwright::identify;

namespace {

simulated::Sample held_sample(double damping_ratio, double decibel, double held_cycles, std::uint64_t seed,
                              double correlation = 0.0, double letting_go_cycles = 0.0) {
    simulated::Truth truth;
    truth.damping_ratio = damping_ratio;
    truth.cycles = 5.0;
    truth.signal_to_noise_db = decibel;
    truth.held_cycles = held_cycles;
    truth.noise_correlation = correlation;
    truth.letting_go_cycles = letting_go_cycles;
    simulated::Deviates deviates(seed);
    return simulated::draw(truth, deviates);
}

// Where a search in noise begins: a quarter of a cycle before the release.
Event begun_early(const simulated::Sample& sample) {
    Event event = sample.event;
    event.begin -= 25;
    return event;
}

bool holds(const Quantities& quantities, Quantity quantity, double truth) {
    const auto found = quantities.find(quantity);
    return found != quantities.end() && found->second.interval.low <= truth &&
           truth <= found->second.interval.high;
}

// What the curve fit says of the event that the search finds; nothing where it does not find one.
std::optional<Quantities> searched_and_fitted(const simulated::Sample& sample) {
    const EventSearch found = find_events(sample.recording);
    if (found.events.size() != 1) return std::nullopt;
    IdentifyOptions options;
    options.replicates = 0;
    return identify_event(sample.recording, found.events.front(), options).curve_fit.quantities;
}

// How many of these recordings are answered, and how many intervals hold the truth.
struct Held {
    int answered = 0, frequency = 0, ratio = 0;
    void add(const simulated::Sample& sample, double damping_ratio) {
        const auto quantities = searched_and_fitted(sample);
        if (!quantities) return;
        ++answered;
        frequency += holds(*quantities, Quantity::natural_frequency, 5.0);
        ratio += holds(*quantities, Quantity::damping_ratio, damping_ratio);
    }
};

}  // namespace

TEST_CASE("a start on the plateau does not spoil the intervals of a heavily damped release") {
    // 60 of each: 95 % of them is 57, fewer than 51 has a chance of one in a thousand. With the start as
    // given the frequency is held in a third of them or less.
    IdentifyOptions options;
    options.replicates = 0;
    struct Condition {
        double damping, decibel, correlation;
    };
    for (const auto& [damping, decibel, correlation] :
         {Condition{0.7, 20.0, 0.0}, Condition{1.5, 20.0, 0.0}, Condition{1.5, 30.0, 0.8}}) {
        int frequency = 0, ratio = 0;
        for (std::uint64_t seed = 7100; seed < 7160; ++seed) {
            const simulated::Sample sample = held_sample(damping, decibel, 1.5, seed, correlation);
            const EventIdentification result = identify_event(sample.recording, begun_early(sample), options);
            frequency += holds(result.curve_fit.quantities, Quantity::natural_frequency, 5.0);
            ratio += holds(result.curve_fit.quantities, Quantity::damping_ratio, damping);
        }
        INFO("damping ratio " << damping << ", " << decibel << " dB, correlation " << correlation);
        CHECK(frequency >= 51);
        CHECK(ratio >= 51);
    }
}

TEST_CASE("a release that takes a tenth of a period does not spoil the intervals") {
    // 60 recordings, limit as above. Taken for a release at once, the damping ratio is held in a quarter.
    Held held;
    for (std::uint64_t seed = 7400; seed < 7460; ++seed)
        held.add(held_sample(0.3, 40.0, 1.0, seed, 0.0, 0.1), 0.3);
    CHECK(held.answered == 60);
    CHECK(held.frequency >= 51);
    CHECK(held.ratio >= 51);
}

TEST_CASE("beyond critical damping a start behind the release would throw away what tells the damping") {
    // 40 recordings. Errors within five of the Cramér-Rao bound of a known release, which a release that is
    // not known does not quite reach (scatter 1.3 of it). A start three uncertainties behind left one in ten
    // beyond.
    simulated::Truth truth;
    truth.damping_ratio = 1.5;
    truth.cycles = 5.0;
    truth.signal_to_noise_db = 40.0;
    const double bound = simulated::cramer_rao(truth).damping_ratio;
    for (std::uint64_t seed = 7500; seed < 7540; ++seed) {
        const auto quantities = searched_and_fitted(held_sample(1.5, 40.0, 1.0, seed));
        INFO("seed " << seed);
        REQUIRE(quantities.has_value());
        CHECK(std::abs(quantities->at(Quantity::damping_ratio).value - 1.5) < 5.0 * bound);
    }
}

TEST_CASE("a plateau too short to be seen for one is allowed for") {
    // Recordings that begin a fifth of a period before the release. In noise of a tenth of the displacement
    // the search misses some. 95 % held is expected; of 30, fewer than 80 % has a chance of one in a
    // thousand. Taken for a decay that was running already, one in 60 held.
    Held held;
    for (std::uint64_t seed = 7600; seed < 7640; ++seed) held.add(held_sample(1.5, 20.0, 0.2, seed), 1.5);
    CHECK(held.answered >= 30);
    CHECK(held.frequency >= 0.8 * held.answered);
    CHECK(held.ratio >= 0.8 * held.answered);
}

TEST_CASE("a pull to the plateau is no part of it") {
    // A rest, a pull along half a cosine over 0.6 s, 0.4 s of hold (two periods), and a release at zeta 1.8,
    // whose fall of 0.25 s asks for more than the hold. 40 of each: 95 % of them is 38, fewer than 33 has a
    // chance of one in two hundred. With the pull in the window the decay began 0.05 to 0.8 s late.
    constexpr double pull_s = 0.6, hold_s = 0.4, release_s = 2.0, amplitude_m = 0.01;
    for (const double decibel : {36.0, 48.0}) {
        int frequency = 0, ratio = 0;
        for (std::uint64_t seed = 8300; seed < 8340; ++seed) {
            simulated::Sample sample = held_sample(1.8, decibel, release_s * 5.0, seed);
            Recording& recording = sample.recording;
            for (std::size_t i = 0; i < recording.samples.size(); ++i) {
                const double to_hold = release_s - hold_s - recording.clock.time_of(i);
                const double share = std::clamp(to_hold / pull_s, 0.0, 1.0);
                double& sample_m = recording.samples[i];
                sample_m = amplitude_m * (sample_m - 0.5 * (1.0 - std::cos(std::numbers::pi * share)));
            }
            const EventSearch found = find_events(recording);
            INFO("seed " << seed << ", " << decibel << " dB");
            REQUIRE(found.events.size() == 1);
            IdentifyOptions options;
            options.replicates = 0;
            const EventIdentification result = identify_event(recording, found.events.front(), options);
            // Three standard uncertainties of a release that noise hides at 36 dB, 0.01 s each at most.
            CHECK(result.start_s == Approx(release_s).margin(0.04));
            frequency += holds(result.curve_fit.quantities, Quantity::natural_frequency, 5.0);
            ratio += holds(result.curve_fit.quantities, Quantity::damping_ratio, 1.8);
        }
        CHECK(frequency >= 33);
        CHECK(ratio >= 33);
    }
}

TEST_CASE("in slow noise a decay that was running when the recording began is taken from its first sample") {
    // 30 recordings of which the search is made to begin 8 samples late: one false alarm in twenty, so 28.5.
    int first = 0, spoilt = 0;
    for (std::uint64_t seed = 7700; seed < 7730; ++seed) {
        simulated::Sample sample = held_sample(1.5, 40.0, 0.0, seed, 0.9);
        Event late = sample.event;
        late.begin += 8;
        const auto running =
            fit_from_first_sample(fit_decay(sample.recording, late, {}), sample.recording, late, {});
        first += running && running->event.begin == 0;
        for (std::size_t i = 0; i < 8; ++i)  // a push that is still going on: 5 % of the amplitude
            sample.recording.samples[i] -= 0.05 * static_cast<double>(i % 2);
        spoilt += fit_from_first_sample(fit_decay(sample.recording, late, {}), sample.recording, late, {})
                      .has_value();
    }
    CHECK(first >= 24);
    CHECK(spoilt == 0);
}

TEST_CASE("a plateau and a fall are no decay that was running") {
    // Recordings of a period of plateau, found among a few hundred, in whose slow noise a first fit from the
    // release told no frequency. Their whole was then read as a slow swing, with a second mode to make up for
    // the plateau, or without one where the fit of the release ran towards more and more damping: 5 Hz lay 2
    // to 8 half widths outside the interval.
    struct Case {
        double damping_ratio, decibel, correlation;
        std::uint64_t seed;
    };
    for (const Case& c : {Case{0.7, 20.0, 0.8, 650020011}, Case{0.7, 20.0, 0.8, 650020078},
                          Case{1.0, 30.0, 0.95, 650033071}, Case{1.0, 30.0, 0.95, 650033127},
                          Case{1.5, 20.0, 0.8, 650038124}, Case{1.5, 20.0, 0.8, 650038186}}) {
        INFO("seed " << c.seed);
        const auto quantities =
            searched_and_fitted(held_sample(c.damping_ratio, c.decibel, 1.0, c.seed, c.correlation));
        REQUIRE(quantities.has_value());
        CHECK(holds(*quantities, Quantity::natural_frequency, 5.0));
        CHECK(holds(*quantities, Quantity::damping_ratio, c.damping_ratio));
    }
}

TEST_CASE("an interval that reaches far to one side has a standard uncertainty to match") {
    // White noise of 20 dB hides the fast pole: [0.66, 1.13] about 0.78. Student's factor at 95 % and some
    // 500 degrees of freedom is 1.965 (tables).
    const auto quantities = searched_and_fitted(held_sample(0.7, 20.0, 1.0, 670026155));
    REQUIRE(quantities.has_value());
    const Estimate& ratio = quantities->at(Quantity::damping_ratio);
    REQUIRE(ratio.interval.high - ratio.value > 2.0 * (ratio.value - ratio.interval.low));
    CHECK(ratio.standard_uncertainty == Approx((ratio.interval.high - ratio.value) / 1.965).epsilon(0.01));
    // Where nothing is hidden it is that of a straight line: half the interval over the factor.
    const Estimate light =
        searched_and_fitted(held_sample(0.05, 60.0, 1.0, 7600))->at(Quantity::damping_ratio);
    CHECK(light.standard_uncertainty ==
          Approx((light.interval.high - light.interval.low) / 2.0 / 1.97).epsilon(0.03));
}

TEST_CASE("the release is found within what is said of it") {
    // Four standard uncertainties: one false alarm in 16,000 for each.
    for (std::uint64_t seed = 7200; seed < 7210; ++seed) {
        const simulated::Sample sample = held_sample(0.7, 26.0, 1.5, seed);
        const auto held = fit_held_release(fit_decay(sample.recording, begun_early(sample), {}),
                                           sample.recording, begun_early(sample), {});
        INFO("seed " << seed);
        REQUIRE(held.has_value());
        // The simulator lets go at the first sample of its event.
        const double truth = sample.recording.clock.time_of(sample.event.begin);
        CHECK(std::abs(held->release_s - truth) < 4.0 * held->uncertainty_s);
        CHECK(held->uncertainty_s < 0.1 / 5.0);
    }
}

TEST_CASE("the release is found where the fit began long before it") {
    for (std::uint64_t seed = 7250; seed < 7255; ++seed) {
        const simulated::Sample sample = held_sample(0.7, 26.0, 4.0, seed);
        Event event = sample.event;
        event.begin -= 200;  // two cycles
        const auto held =
            fit_held_release(fit_decay(sample.recording, event, {}), sample.recording, event, {});
        INFO("seed " << seed);
        REQUIRE(held.has_value());
        const double truth = sample.recording.clock.time_of(sample.event.begin);
        CHECK(std::abs(held->release_s - truth) < 4.0 * held->uncertainty_s);
    }
}

TEST_CASE("what was not held, or is seen sharply, keeps a start of its own") {
    const simulated::Sample cut = held_sample(0.7, 26.0, 0.0, 7301);
    const auto none = fit_held_release(fit_decay(cut.recording, cut.event, {}), cut.recording, cut.event, {});
    CHECK((!none || none->may_be_none));  // a few samples of noise may pass for a plateau there
    const simulated::Sample light = held_sample(0.05, 26.0, 1.5, 7302);
    CHECK_FALSE(
        fit_held_release(fit_decay(light.recording, light.event, {}), light.recording, light.event, {}));
    simulated::Sample hit = held_sample(0.7, 26.0, 1.5, 7303);
    hit.event.kind = TestKind::tap;
    CHECK_FALSE(fit_held_release(fit_decay(hit.recording, hit.event, {}), hit.recording, hit.event, {}));
    const simulated::Sample clear = held_sample(0.7, 60.0, 1.5, 7304);
    const auto held =
        fit_held_release(fit_decay(clear.recording, clear.event, {}), clear.recording, clear.event, {});
    REQUIRE(held.has_value());
    CHECK(held->sharp());
}

TEST_CASE("slow noise as large as a tenth of a decay that is soon over is said") {
    const auto says_so = [](double damping_ratio, double decibel, double correlation, std::uint64_t seed) {
        const simulated::Sample sample = held_sample(damping_ratio, decibel, 1.0, seed, correlation);
        IdentifyOptions options;
        options.replicates = 0;
        const EventIdentification result = identify_event(sample.recording, sample.event, options);
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        return std::any_of(result.findings.begin(), result.findings.end(),
                           [](const Finding& finding) { return finding.code == "slow_noise"; });
    };
    for (std::uint64_t seed = 7500; seed < 7505; ++seed) {
        INFO("seed " << seed);
        CHECK(says_so(0.3, 20.0, 0.95, seed));
        CHECK_FALSE(says_so(0.3, 20.0, 0.0, seed));   // as large, but quick
        CHECK_FALSE(says_so(0.3, 40.0, 0.95, seed));  // as slow, but a tenth of it
    }
}
