// Before/after pairs of the same article through the whole pipeline: how often is one called changed?

#include <catch2/catch.hpp>
#include <cstdlib>

#include "app/bench_recordings.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/comparison.hpp"

using namespace ringwright;
using namespace ringwright::test;

namespace {

/// Three releases of an article whose damping ratio scatters by 0.5 % from release to release.
Quantities three_releases(double damping_ratio, Draws& draws) {
    std::vector<RecordingInput> releases;
    for (int i = 0; i < 3; ++i) {
        const std::string csv = pluck_csv(damping_ratio * (1.0 + 0.005 * draws.normal()), draws.bits());
        releases.push_back({read_recording_from_memory(csv, "release"), std::nullopt});
    }
    return identify(std::move(releases)).result.quantities;
}

/// 200 pairs with RINGWRIGHT_LONG_TESTS set, else 10.
int pair_count() {
    return std::getenv("RINGWRIGHT_LONG_TESTS") ? 200 : 10;
}

}  // namespace

// Seed 20317. Claimed: 5 %. Of 200 pairs 25 or more are called changed by chance once in 40,000 studies, and
// of 10 pairs 4 or more once in 1,000 (binomial).
TEST_CASE("the same damper before and after is called changed as seldom as is claimed", "[study]") {
    Draws draws(20317);
    int alarms = 0;
    for (int pair = 0; pair < pair_count(); ++pair) {
        const Quantities before = three_releases(0.27, draws), after = three_releases(0.27, draws);
        alarms += compare(before, after).quantities.at(Quantity::damping_ratio).changed ? 1 : 0;
    }
    INFO(alarms << " of " << pair_count() << " pairs");
    CHECK(alarms < (pair_count() == 200 ? 25 : 4));
    if (pair_count() == 200) WARN("called changed: " << alarms << " of 200");
}

TEST_CASE("a damper that lost a third of its damping is called changed every time", "[study]") {
    Draws draws(20318);
    for (int pair = 0; pair < pair_count(); ++pair) {
        const Quantities before = three_releases(0.27, draws), after = three_releases(0.19, draws);
        CHECK(compare(before, after).quantities.at(Quantity::damping_ratio).changed);
    }
}
