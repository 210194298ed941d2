// What the search saw beside the decay is in the fit from the first. Truth from the simulator of tests/support;
// seeds are written at each case.

#include <catch2/catch.hpp>
#include <cmath>

#include "support/simulator.hpp"
#include "ringwright/identify.hpp"

using namespace ringwright;
using simulator::Generator;
using simulator::Noise;

namespace {

EventIdentification identified(const Recording& recording) {
    const EventSearch search = find_events(recording);
    REQUIRE(search.events.size() == 1);
    IdentifyOptions options;
    options.replicates = 0;
    return identify_event(recording, search.events[0], options);
}

/// Four standard uncertainties: a false alarm in 16,000.
void check(const Quantities& quantities, Quantity quantity, double truth, double share) {
    INFO(key_of(quantity));
    REQUIRE(quantities.contains(quantity));
    const Estimate& estimate = quantities.at(quantity);
    CHECK(std::abs(estimate.value - truth) < 4.0 * estimate.standard_uncertainty);
    CHECK(std::abs(estimate.value - truth) < share * truth);
}

}  // namespace

TEST_CASE("hum of half the amplitude is not taken for the mode") {
    for (const double hum_share : {0.2, 0.5}) {
        INFO("hum " << hum_share);
        Generator generator(701);
        const Noise noise{40.0, 0.0, 50.0, -20.0 * std::log10(hum_share)};
        const auto truth =
            simulator::plucks({8.0, 0.05}, 1000.0, {}, MeasuredQuantity::displacement, noise, generator);
        const EventIdentification result = identified(truth.recording);
        REQUIRE(result.curve_fit.status == MethodStatus::ok);
        check(result.curve_fit.quantities, Quantity::natural_frequency, 8.0, 0.002);
        check(result.curve_fit.quantities, Quantity::damping_ratio, 0.05, 0.03);
    }
}
