// Many samples under few columns: no spike is lost.
#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>

#include "drawing/canvas.hpp"
#include "ringwright/figures.hpp"

using namespace ringwright;

TEST_CASE("one sample among five million is seen in the envelope") {
    Recording recording;
    recording.clock.sample_rate_hz = 1e5;
    recording.samples.assign(5'000'000, 0.001);
    recording.samples[3'141'592] = -0.5;
    const SampleEnvelope envelope = envelope_of(recording, 800, 0.001);
    REQUIRE(envelope.low.size() == 800);
    CHECK(*std::ranges::min_element(envelope.low) == Approx(-500.0));  // in mm
    CHECK(*std::ranges::max_element(envelope.high) == Approx(1.0));
    CHECK(envelope.low[3'141'592 / (5'000'000 / 800)] == Approx(-500.0));
    CHECK(envelope.end_s == Approx(49.99999));
}

TEST_CASE("a gap in time is a column without samples") {
    Recording recording;
    for (int i = 0; i < 100; ++i) recording.clock.times_s.push_back(i < 50 ? 0.01 * i : 5.0 + 0.01 * i);
    recording.samples.assign(100, 1.0);
    const SampleEnvelope envelope = envelope_of(recording, 10);
    CHECK(std::isnan(envelope.low[5]));
    CHECK(envelope.low[0] == 1.0);
    CHECK(envelope.high[9] == 1.0);
}

TEST_CASE("an empty recording has an empty envelope") {
    CHECK(envelope_of(Recording{}, 100).low.empty());
}

TEST_CASE("a long line keeps the extremes under each column and few points") {
    std::vector<double> x(1'000'000), y(1'000'000);
    for (std::size_t i = 0; i < x.size(); ++i) {
        x[i] = static_cast<double>(i);
        y[i] = std::sin(0.37 * x[i]);
    }
    y[777'777] = 9.0;
    const drawing::Polyline line = drawing::under_columns(x, y, 0.0, 1e6, 400);
    CHECK(line.x.size() <= 4 * 401);
    CHECK(*std::ranges::max_element(line.y) == 9.0);
    CHECK(std::ranges::is_sorted(line.x));
    CHECK(line.x.front() == 0.0);
    CHECK(line.x.back() == 999'999.0);
}

TEST_CASE("a short line stays as it is") {
    const drawing::Polyline line = drawing::under_columns({0.0, 1.0, 2.0}, {5.0, 6.0, 7.0}, 0.0, 2.0, 400);
    CHECK(line.y == std::vector<double>{5.0, 6.0, 7.0});
}
