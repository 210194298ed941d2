// Recordings of every kind that comes from a bench (tests/support/bench_kinds.cpp), from the text of the file
// to the answer: the short form of build/kinds_study.

#include <algorithm>
#include <catch2/catch.hpp>
#include <string>
#include <string_view>

#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"
#include "support/bench_judgement.hpp"

using simulated::BenchKind;
using simulated::BenchRecording;
using simulated::Outcome;

namespace {

const BenchKind& kind_named(std::string_view name) {
    const auto& kinds = simulated::bench_kinds();
    const auto kind =
        std::find_if(kinds.begin(), kinds.end(), [&](const BenchKind& other) { return other.name == name; });
    REQUIRE(kind != kinds.end());
    return *kind;
}

Outcome outcome_of(std::string_view kind, std::uint64_t seed) {
    INFO(kind << ", seed " << seed);
    Outcome outcome = simulated::judge(kind_named(kind).draw(seed), 0);
    REQUIRE(outcome.answered);
    REQUIRE(outcome.frequency.size() == 1);
    return outcome;
}

constexpr int recordings = 8;
constexpr std::uint64_t first_seed = 7'000'000'000;  // used for nothing else

}  // namespace

TEST_CASE("recordings of every kind are answered, and their intervals hold the truth", "[long]") {
    int estimates = 0, held = 0, decays = 0, answered = 0, misnamed = 0, without = 0, false_events = 0;
    std::uint64_t seed = first_seed;
    for (const BenchKind& kind : simulated::bench_kinds()) {
        for (int i = 0; i < recordings; ++i, ++seed) {
            const BenchRecording made = kind.draw(seed);
            const Outcome outcome = simulated::judge(made, 0);
            INFO(kind.name << ", seed " << seed << ", " << made.truth.conditions);
            if (!made.truth.mode) {
                ++without;
                false_events += outcome.events > 0;
                continue;
            }
            ++decays;
            answered += outcome.answered && outcome.events == made.truth.events;
            misnamed += outcome.answered && !outcome.named;
            for (const auto& misses : {outcome.frequency, outcome.damping})
                for (const simulated::Miss& miss : misses) ++estimates, held += miss.held;
        }
    }
    // 19 kinds of 8. What may go wrong is the measured share (docs/methods/events.md: 1 % with a wrong number
    // of events or not answered, 1 % named otherwise, 94 % held, 6 % of the recordings without an event given
    // one) and three standard deviations.
    CHECK(decays == 19 * recordings);
    CHECK(decays - answered <= 5);
    CHECK(misnamed <= 5);
    CHECK(held >= 0.90 * estimates);
    CHECK(without == 4 * recordings);
    CHECK(false_events <= 5);
}

TEST_CASE("a fall of which a short window took the first third for the whole is a drop") {
    // At 57 dB the decay was taken for that of a release and began at the second bounce, 0.12 s too early.
    const auto read = ringwright::read_recording_from_memory(
        kind_named("drop, displacement").draw(923'000'371).csv, "drawn");
    const auto search = ringwright::find_events(read);
    REQUIRE(search.events.size() == 1);
    CHECK(search.events[0].kind == ringwright::TestKind::drop);
    // The last touch, by a fit of the whole motion to the recording without noise: 0.7653 s.
    const auto& clock = read.clock;
    CHECK(clock.time_of(search.events[0].begin) == Approx(0.7653).margin(0.003));
}

TEST_CASE("neither the end of a slow release nor a blow makes the noise of the ringing") {
    // The window began a sample or two too early, at 60 and 56 dB: a decay beyond critical damping was fitted
    // to those samples, and noise with a resonance took up some twenty cycles that anyone sees.
    for (const Outcome& outcome :
         {outcome_of("slow release", 1'010'000'175), outcome_of("double hit", 1'008'000'095)}) {
        CHECK(std::abs(outcome.frequency[0].relative) < 2e-4);  // 4 u at 56 dB and 20 cycles
        CHECK(std::abs(outcome.damping[0].relative) < 6e-3);
        CHECK_FALSE(outcome.frequency[0].beyond_four);
        CHECK_FALSE(outcome.damping[0].beyond_four);
    }
}

TEST_CASE("noise that rings as the article does is no noise") {
    // A cycle after the first blow came a second: a decay of 3.1 Hz was fitted to that cycle at 57 dB, and
    // noise with a resonance took up the twenty and more at 4.77 Hz.
    const Outcome outcome = outcome_of("double hit", 1'208'000'145);
    CHECK(std::abs(outcome.frequency[0].relative) < 1e-5);  // 4 u
    CHECK(std::abs(outcome.damping[0].relative) < 1e-3);
}

TEST_CASE("a decay that the recorder followed at a third of its rate is all of it used") {
    // Each step was taken for a gap, and what was fitted were the 13 samples before the rate changed.
    const Outcome outcome = outcome_of("irregular clock", 1'011'000'097);
    CHECK(std::abs(outcome.frequency[0].relative) < 0.01);  // 31 dB: 8 u
    CHECK(std::abs(outcome.damping[0].relative) < 0.1);     // 4 u
}

TEST_CASE("crest and trough of a swing that lie 1 g apart are neither a hold nor a fall") {
    // Within 15 % of the crest for 27 ms, from one to the other in 33. The article passed for one that had
    // fallen and turned over, and nothing was answered.
    // At 55 dB of the third crest was seen 5 m/s2 above the rest position: what there was of it before the
    // second hit cut it off was as long as a hold of the trough before.
    for (const Outcome& outcome :
         {outcome_of("double hit", 1'108'000'135), outcome_of("double hit", 1'108'000'155),
          outcome_of("double hit", 1'208'000'050)}) {
        CHECK(outcome.events == 1);
        CHECK(std::abs(outcome.frequency[0].relative) < 5e-4);  // some 10 u at 52 dB
        CHECK_FALSE(outcome.frequency[0].beyond_four);
    }
}

TEST_CASE("the first crest after a release that lies 1 g above the rest is no free fall") {
    // At 56 and 58 dB: from rest to -31 m/s2 as the damper is let go, and 50 ms later a crest of 10. It
    // passed for a fall from the rest, and what follows for the answer: 48 Hz, and a static deflection of 6
    // mm.
    for (const Outcome& outcome :
         {outcome_of("two-way", 1'236'000'092), outcome_of("two-way", 1'326'000'014)}) {
        CHECK(std::abs(outcome.frequency[0].relative) < 5e-3);
        CHECK_FALSE(outcome.frequency[0].beyond_four);
    }
    const auto read =
        ringwright::read_recording_from_memory(kind_named("two-way").draw(1'326'000'014).csv, "drawn");
    const auto search = ringwright::find_events(read);
    REQUIRE(search.events.size() == 1);
    CHECK(search.events[0].flights.empty());
}

TEST_CASE("the start of a decay is not moved on to its last swing") {
    // At 39 dB a viscous decay explains two swings of a two-way damper but for 7 %; measured by the noise
    // behind the decay that was too much, and the start went on to a swing that hardly stands out of the
    // noise.
    const Outcome outcome = outcome_of("two-way", 1'236'000'016);
    CHECK(outcome.events == 1);
    CHECK(outcome.model == "two-way");
    CHECK(std::abs(outcome.frequency[0].relative) < 0.03);  // 4 u
    CHECK_FALSE(outcome.frequency[0].beyond_four);
}

TEST_CASE("a damper three times as strong one way is named, though a small change does not show it") {
    // Of a window of little more than a cycle the score for a small asymmetry was beaten by others, or the
    // noise stood for it: called viscous at 58 and 53 dB, the frequency 12 and 7 % off.
    for (const Outcome& outcome :
         {outcome_of("two-way", 1'116'000'032), outcome_of("two-way", 1'116'000'103)}) {
        CHECK(outcome.model == "two-way");
        CHECK(std::abs(outcome.frequency[0].relative) < 0.01);
    }
}

TEST_CASE("a two-way damper is told from all of its decay, where a viscous fit had to be cut short") {
    // A viscous fit left more than noise, and was cut to a cycle: over its 40 rows a second mode and a drift
    // stood for the damper at 60 and 56 dB. At 59 dB its turn was taken for a knock.
    for (const Outcome& outcome : {outcome_of("two-way", 1'116'000'015), outcome_of("two-way", 1'116'000'148),
                                   outcome_of("two-way", 1'116'000'177)}) {
        CHECK(outcome.model == "two-way");
        CHECK(std::abs(outcome.frequency[0].relative) < 2e-3);
        CHECK_FALSE(outcome.frequency[0].beyond_four);
    }
}

TEST_CASE("a law is told where something else had taken its place") {
    struct Seen {
        const char* kind;
        std::uint64_t seed;
        const char* model;
    };
    // At 57 dB a mode 3.3 times as high stood for the third multiple of a frequency that falls with the
    // swing. At 54 dB what friction leaves passed for a second hit, and a tone stood for the rest; at 50 dB
    // the search saw the last half swing alone, whose turn passed for an article that was held. At 31 dB the
    // law of a short window kept a term that the wider one had no use for.
    for (const Seen& seen : {Seen{"hardening, softening", 1'218'000'091, "viscous+hardening"},
                             Seen{"friction", 1'215'000'162, "viscous+friction"},
                             Seen{"friction", 1'235'000'106, "viscous+friction"},
                             Seen{"quadratic", 1'217'000'186, "viscous+quadratic"}}) {
        const Outcome outcome = outcome_of(seen.kind, seen.seed);
        CHECK(outcome.model == seen.model);
        CHECK(std::abs(outcome.frequency[0].relative) < 0.01);
        CHECK_FALSE(outcome.frequency[0].beyond_four);
    }
    // At 60 dB noise with a resonance at the mode took up the ringing that a viscous mode left.
    const Outcome outcome = outcome_of("hardening, softening", 1'218'000'073);
    CHECK(std::abs(outcome.frequency[0].relative) < 2e-4);
    CHECK_FALSE(outcome.frequency[0].beyond_four);
}
