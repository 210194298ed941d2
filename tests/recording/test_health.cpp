#include <catch2/catch.hpp>
#include <cmath>
#include <cstdint>
#include <vector>

#include "recording/bench_table.hpp"
#include "recording/health.hpp"

using namespace ringwright;
using bench::has_finding;

namespace {

Recording of(std::vector<double> samples) {
    Recording recording;
    recording.samples = std::move(samples);
    recording.clock.sample_rate_hz = 1000.0;
    examine_health(recording);
    return recording;
}

// A held plateau, then a decay of 5 Hz from `amplitude`.
std::vector<double> release(double amplitude, double rail, double step) {
    std::vector<double> samples;
    for (int i = 0; i < 4000; ++i) {
        const double t = std::max(0, i - 1000) / 1000.0;
        const double x = amplitude * std::exp(-1.5 * t) * std::cos(2.0 * 3.141592653589793 * 5.0 * t);
        samples.push_back(step * std::round(std::clamp(x, -rail, rail) / step));
    }
    return samples;
}

}  // namespace

TEST_CASE("samples at a rail are found and a held plateau is not one") {
    CHECK(of(release(1.0, 10.0, 1e-6)).clipped.empty());
    CHECK(of(release(1.0, 10.0, 1e-3)).clipped.empty());
    CHECK(of(release(1.0, 10.0, 2e-2)).clipped.empty());
    const Recording clipped = of(release(1.0, 0.5, 1e-4));
    REQUIRE(clipped.clipped.size() >= 3);
    CHECK(has_finding(clipped.findings, "clipped_samples"));
    for (const SampleRange& run : clipped.clipped)
        for (std::size_t i = run.begin; i < run.end; ++i)
            CHECK(std::abs(clipped.samples[i]) == Approx(0.5).margin(1e-4));
    // The first half-wave to the lower rail: |x| ≥ 0.5 from the formula, about 60 samples around t = 0.1 s.
    CHECK(clipped.clipped.front().end - clipped.clipped.front().begin > 40);
}

TEST_CASE("what stands at a rail is clipped however noise breaks it up") {
    std::vector<double> samples = release(1.0, 10.0, 1e-6);
    std::uint32_t state = 7;  // Numerical Recipes' linear congruential generator, for noise of 0.02 rms or so
    for (double& x : samples) {
        state = 1664525u * state + 1013904223u;
        x = std::clamp(x + 0.07 * (static_cast<double>(state >> 8) / 16777216.0 - 0.5), -0.5, 0.5);
    }
    const Recording recording = of(samples);
    std::size_t at_rail = 0, single = 0;
    for (const double x : samples) at_rail += std::abs(x) == 0.5;
    std::size_t told = 0;
    for (const SampleRange& run : recording.clipped) {
        told += run.end - run.begin;
        single += run.end - run.begin < 3;
    }
    CHECK(told == at_rail);
    CHECK(single > 2);  // crests that hardly reach it
    // Without clipping the highest sample stands alone, and is none.
    std::vector<double> free = samples;
    for (std::size_t i = 0; i < free.size(); ++i) free[i] *= std::exp(-1e-4 * static_cast<double>(i));
    CHECK(of(free).clipped.empty());
}

TEST_CASE("few levels are told") {
    CHECK(has_finding(of(release(1.0, 10.0, 0.1)).findings, "few_levels"));
    CHECK_FALSE(has_finding(of(release(1.0, 10.0, 1e-3)).findings, "few_levels"));
    CHECK(of(release(1.0, 10.0, 0.125)).resolution == 0.125);
    CHECK(has_finding(of(std::vector<double>(100, 1.0)).findings, "constant_signal"));
}
