// The search on recordings of known truth. Tolerances on `begin`: one sample for rounding of the true moment,
// else what the written noise hides, stated beside each.

#include <catch2/catch.hpp>

#include "ringwright/error.hpp"
#include "ringwright/event.hpp"
#include "support/simulator.hpp"

using namespace ringwright;
using simulator::Generator;
using simulator::Mode;
using simulator::Noise;

namespace {

double begin_error_cycles(const simulator::Simulated& truth, const Event& event, std::size_t which) {
    return (static_cast<double>(event.begin) - static_cast<double>(truth.begins[which])) /
           truth.samples_per_cycle;
}

}  // namespace

TEST_CASE("a decay that is running from the first sample begins there") {
    for (const double damping : {0.002, 0.05, 0.3, 1.0}) {
        Generator generator(11);
        const auto truth = simulator::running_decay({5.0, damping}, 500.0, 8.0, 0.4, {60.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        // 0.3 % of the amplitude, the misfit that the search tolerates, is passed in 1 % of a cycle.
        CHECK(search.events[0].begin <= 1);
        CHECK(search.events[0].rest_end == truth.recording.size());
    }
}

TEST_CASE("each of five releases is found, and the pull between them is not") {
    Generator generator(12);
    const simulator::Pull pull{1.0, 2.0, 0.8, 4.0, 0.002, 5};
    const auto truth =
        simulator::plucks({5.0, 0.05}, 500.0, pull, MeasuredQuantity::displacement, {50.0}, generator);
    const EventSearch search = find_events(truth.recording);
    REQUIRE(search.events.size() == 5);
    for (std::size_t k = 0; k < 5; ++k) {
        // At 50 dB plateau and decay part by three standard deviations within 2 % of a cycle.
        CHECK(std::abs(begin_error_cycles(truth, search.events[k], k)) < 0.02);
        CHECK(search.events[k].frequency_guess_hz ==
              Approx(5.0 * std::sqrt(1.0 - 0.05 * 0.05)).epsilon(0.01));
    }
}

TEST_CASE("what is no decay gives no event and the reason") {
    Recording recording;
    recording.clock.sample_rate_hz = 100.0;
    SECTION("constant") {
        recording.samples.assign(1000, 0.25);
    }
    SECTION("too short") {
        recording.samples.assign(5, 0.25);
    }
    SECTION("empty") {}
    SECTION("steady oscillation") {
        for (int i = 0; i < 4000; ++i) recording.samples.push_back(std::sin(0.31 * i));
    }
    const EventSearch search = find_events(recording);
    CHECK(search.events.empty());
    CHECK_FALSE(search.reason.empty());
}

TEST_CASE("a window by hand is used as given") {
    Generator generator(13);
    const auto truth = simulator::running_decay({5.0, 0.05}, 500.0, 8.0, 0.4, {60.0}, generator);
    EventOptions options;
    options.from_s = 1.0;
    options.to_s = 3.0;
    const EventSearch search = find_events(truth.recording, options);
    REQUIRE(search.events.size() == 1);
    CHECK(search.events[0].by_hand);
    CHECK(search.events[0].begin == 500);
    CHECK(search.events[0].rest_end == 1500);
    options.from_s = 30.0;
    options.to_s = 40.0;
    CHECK_THROWS_AS(find_events(truth.recording, options), UsageError);
}

TEST_CASE("motion that is no answer to a release is refused") {
    Generator generator(81);
    Recording recording;
    recording.clock.sample_rate_hz = 500.0;
    SECTION("ambient vibration of a light mode") {
        const std::vector<double> push = simulator::coloured_noise(generator, 8000, 50.0, 0.0);
        double x = 0.0, v = 0.0;
        const double w = 2.0 * std::numbers::pi * 5.0, h = 1.0 / 2000.0;
        for (const double force : push) {
            for (int j = 0; j < 4; ++j) v += h * (force - 0.06 * w * v - w * w * x), x += h * v;
            recording.samples.push_back(x);
        }
    }
    SECTION("a drive that beats") {
        for (int i = 0; i < 5000; ++i)
            recording.samples.push_back(std::sin(0.07 * i) * (1.0 + 0.2 * std::sin(0.004 * i)));
    }
    SECTION("white noise") {
        recording.samples = simulator::coloured_noise(generator, 8000, 1.0, 0.0);
    }
    SECTION("a pulse of acceleration") {
        recording.quantity = MeasuredQuantity::acceleration;
        recording.samples = simulator::coloured_noise(generator, 4000, 0.01, 0.0);
        for (std::size_t i = 1000; i < 1100; ++i)
            recording.samples[i] += std::sin(std::numbers::pi * static_cast<double>(i - 1000) / 100.0);
    }
    const EventSearch search = find_events(recording);
    CHECK(search.events.empty());
    CHECK_FALSE(search.reason.empty());
}

TEST_CASE("a heavily damped release begins where the plateau ends") {
    for (const double damping : {0.5, 1.0, 1.5, 3.0}) {
        Generator generator(21);
        const double slow = damping > 1.0 ? 2.0 * damping : 1.0;
        const simulator::Pull held{0.0, 0.0, 1.2, 2.0 * slow, 0.002, 1};
        const auto truth = simulator::plucks({5.0, damping}, 1000.0, held, MeasuredQuantity::displacement,
                                             {40.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        CHECK(search.events[0].kind == TestKind::pluck);
        CHECK(search.events[0].kind_known);
        // At 40 dB the plateau and the decay part by one standard deviation after 2 % of a cycle.
        CHECK(std::abs(begin_error_cycles(truth, search.events[0], 0)) < 0.03);
    }
}

TEST_CASE("a tap begins after its contact") {
    for (const auto quantity : {MeasuredQuantity::acceleration, MeasuredQuantity::displacement}) {
        Generator generator(22);
        const auto truth =
            simulator::taps({20.0, 0.03}, 4000.0, 3.0, {0.4}, 0.005, quantity, {50.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        // The displacement leaves the free decay as the cube of the time before the end of contact: 50 dB
        // hide the last 4 % of a cycle.
        CHECK(std::abs(begin_error_cycles(truth, search.events[0], 0)) < 0.04);
    }
}

TEST_CASE("too few samples a cycle and a clipped start are findings") {
    Generator generator(23);
    const auto sparse = simulator::running_decay({5.0, 0.01}, 16.0, 20.0, 1.0, {60.0}, generator);
    const EventSearch search = find_events(sparse.recording);
    REQUIRE(search.events.size() == 1);
    REQUIRE(search.events[0].findings.size() == 1);
    CHECK(search.events[0].findings[0].code == "too_low_sampling_rate");
    CHECK(search.events[0].findings[0].severity == Severity::defect);

    auto clipped = simulator::running_decay({5.0, 0.05}, 500.0, 5.0, 0.0, {60.0}, generator);
    std::vector<double>& samples = clipped.recording.samples;
    std::size_t last = 0;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        if (samples[i] <= 1.0) continue;
        samples[i] = 1.0;
        clipped.recording.clipped.push_back({i, i + 1});
        last = i + 1;
    }
    const EventSearch found = find_events(clipped.recording);
    REQUIRE(found.events.size() == 1);
    CHECK(found.events[0].begin >= last);
    REQUIRE_FALSE(found.events[0].findings.empty());
    CHECK(found.events[0].findings[0].code == "clipped_start");
}

TEST_CASE("a light decay whose first dozens of swings are clipped is found behind them") {
    // zeta 0.01, the rail at 0.4 of the start amplitude: ln(2.5)/0.02 pi = 15 cycles are clipped.
    for (std::uint64_t seed = 60; seed < 70; ++seed) {
        Generator generator(seed);
        simulator::Pull pull;
        pull.decay_s = 8.0;
        auto clipped =
            simulator::plucks({10.0, 0.01}, 500.0, pull, MeasuredQuantity::displacement, {30.0}, generator);
        std::vector<double>& samples = clipped.recording.samples;
        std::size_t last = 0;
        for (std::size_t i = 0; i < samples.size(); ++i) {
            if (std::abs(samples[i]) < 0.4) continue;
            samples[i] = samples[i] > 0.0 ? 0.4 : -0.4;
            if (clipped.recording.clipped.empty() || clipped.recording.clipped.back().end < i)
                clipped.recording.clipped.push_back({i, i + 1});
            last = clipped.recording.clipped.back().end = i + 1;
        }
        const EventSearch found = find_events(clipped.recording);
        INFO("seed " << seed);
        REQUIRE(found.events.size() == 1);
        CHECK(found.events[0].begin >= last);
        CHECK(found.events[0].begin < last + 50);  // a cycle
    }
}

TEST_CASE("a drop's decay begins in the last unbroken contact") {
    for (const auto quantity : {MeasuredQuantity::acceleration, MeasuredQuantity::displacement}) {
        Generator generator(3);
        const auto truth = simulator::drop({6.0, 0.15}, 1000.0, 6.0, 0.4, 0.04, quantity, {46.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        // Displacement leaves the decay slowly before touch-down: 46 dB hide the last 10 % of a cycle.
        const double error = begin_error_cycles(truth, search.events[0], 0);
        CHECK(error > -0.1);
        CHECK(error < 0.02);
        // The line of a decay with this damping is 30 % wide; noise and phase move its top by up to a tenth
        // of that.
        CHECK(search.events[0].frequency_guess_hz ==
              Approx(6.0 * std::sqrt(1.0 - 0.15 * 0.15)).epsilon(0.03));
    }
}
