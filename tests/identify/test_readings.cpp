// What is said of a recording that has just one thing wrong with it: the finding or the law that names the
// cause, and a reading of the three methods that does not name another. Recordings from the simulators of
// tests/support, seeds written at each case; that the named cause is the right one is known from how the
// recording was made.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <string>
#include <vector>

#include "ringwright/identify.hpp"
#include "support/simulated_law.hpp"

using namespace ringwright;

namespace {

constexpr int recordings = 10;

struct Said {
    int named = 0, misread = 0;
};

bool names(const EventIdentification& result, const std::string& cause) {
    return result.curve_fit.model.find(cause) != std::string::npos ||
           std::any_of(result.findings.begin(), result.findings.end(),
                       [&](const Finding& finding) { return finding.code == cause; });
}

// A reading that blames one of the others, in the words of the readings.
bool blames(const EventIdentification& result, const std::vector<const char*>& others) {
    return !result.agreement.consistent && std::any_of(others.begin(), others.end(), [&](const char* other) {
        return result.agreement.reading.find(other) != std::string::npos;
    });
}

void count(Said& said, const simulated::Sample& sample, const char* cause,
           const std::vector<const char*>& others) {
    const EventIdentification result = identify_event(sample.recording, sample.event, {});
    said.named += names(result, cause);
    said.misread += blames(result, others);
}

Said said_of(const simulated::Law& law, const char* cause, const std::vector<const char*>& others) {
    Said said;
    for (int i = 0; i < recordings; ++i) {
        simulated::Deviates deviates(static_cast<std::uint64_t>(6100 + i));
        count(said, simulated::draw(law, {}, deviates), cause, others);
    }
    return said;
}

}  // namespace

TEST_CASE("the law of the damper or the spring is what is named where it alone is not linear") {
    struct Case {
        simulated::Law law;
        const char* cause;
        std::vector<const char*> others;
    };
    simulated::Law rubs, orifice, stiffens;
    rubs.friction = 6.0;
    orifice.compression = orifice.rebound = 4.0;
    orifice.quadratic = 60.0;
    stiffens.cubic = 1.5e6;  // 17 % of the stiffness at the release
    for (const auto& [law, cause, others] :
         {Case{rubs, "friction", {"quadratic", "another mode", "clipped"}},
          Case{orifice, "quadratic", {"friction", "another mode", "clipped"}},
          Case{stiffens, "hardening", {"friction", "another mode", "clipped"}}}) {
        INFO(cause);
        const Said said = said_of(law, cause, others);
        CHECK(said.named == recordings);
        CHECK(said.misread == 0);
    }
}

TEST_CASE("another mode is what is named where another mode rings alone") {
    Said said;
    for (int i = 0; i < recordings; ++i) {
        simulated::Truth truth;
        simulated::Deviates deviates(static_cast<std::uint64_t>(6200 + i));
        simulated::Sample sample = simulated::draw(truth, deviates);
        for (std::size_t k = sample.event.begin; k < sample.recording.size(); ++k) {
            const double t =
                sample.recording.clock.time_of(k) - sample.recording.clock.time_of(sample.event.begin);
            const double omega = 2.0 * std::numbers::pi * 17.0;  // against 5 Hz, a quarter of its size
            sample.recording.samples[k] += 0.25 * std::exp(-0.01 * omega * t) * std::cos(omega * t);
        }
        count(said, sample, "second_mode", {"friction", "quadratic", "clipped"});
    }
    CHECK(said.named == recordings);
    CHECK(said.misread == 0);
}

TEST_CASE("clipping is what is named where the first swings are clipped") {
    Said said;
    for (int i = 0; i < recordings; ++i) {
        simulated::Truth truth;
        truth.clip_share = 0.7;
        truth.held_cycles = 1.0;
        simulated::Deviates deviates(static_cast<std::uint64_t>(6400 + i));
        simulated::Sample sample = simulated::draw(truth, deviates);
        const EventSearch search = find_events(sample.recording);
        REQUIRE(search.events.size() == 1);
        sample.event = search.events.front();
        const EventIdentification result = identify_event(sample.recording, sample.event, {});
        said.named += std::any_of(sample.event.findings.begin(), sample.event.findings.end(),
                                  [](const Finding& finding) { return finding.code == "clipped_start"; });
        said.misread += blames(result, {"friction", "quadratic", "another mode"});
    }
    CHECK(said.named >= recordings - 1);  // a start behind all that is clipped needs no such word
    CHECK(said.misread == 0);
}

TEST_CASE("nothing is blamed where nothing is wrong") {
    // Stated at one in a hundred a release: two or more of ten are seen once in 230.
    int blamed = 0;
    for (int i = 0; i < recordings; ++i) {
        simulated::Deviates deviates(static_cast<std::uint64_t>(6300 + i));
        const simulated::Sample sample = simulated::draw(simulated::Truth{}, deviates);
        const EventIdentification result = identify_event(sample.recording, sample.event, {});
        blamed += !result.agreement.consistent || names(result, "second_mode") ||
                  result.curve_fit.model != "viscous";
    }
    CHECK(blamed <= 1);
}
