// Which samples of a recording a fit takes for neighbours. Expected values by hand.

#include <catch2/catch.hpp>
#include <utility>
#include <vector>

#include "identify/decay_window.hpp"

using namespace ringwright;
using namespace ringwright::identify;

namespace {

using Run = std::pair<std::size_t, std::size_t>;

/// Samples as many steps of a tenth of a second after each other as are given.
std::vector<Run> runs_after(const std::vector<double>& steps) {
    Recording recording;
    recording.clock.sample_rate_hz = 10.0;
    double time = 3.0;
    recording.clock.times_s.push_back(time);
    for (const double step : steps) recording.clock.times_s.push_back(time += 0.1 * step);
    for (std::size_t i = 0; i < recording.clock.times_s.size(); ++i)
        recording.samples.push_back(static_cast<double>(i));
    std::vector<Run> runs;
    for (const SampleRange& run : cut_window(recording, 0, recording.size()).runs)
        runs.emplace_back(run.begin, run.end);
    return runs;
}

std::vector<double> repeated(std::initializer_list<std::pair<int, double>> parts) {
    std::vector<double> steps;
    for (const auto& [count, step] : parts) steps.insert(steps.end(), static_cast<std::size_t>(count), step);
    return steps;
}

}  // namespace

TEST_CASE("a step of more than two and a half is a gap, and a run goes on over shorter ones") {
    const auto runs = runs_after(repeated({{9, 1.0}, {1, 2.4}, {9, 1.0}, {1, 2.6}, {9, 1.0}}));
    REQUIRE(runs.size() == 2);
    CHECK(runs[0] == Run{0, 20});
    CHECK(runs[1] == Run{20, 30});
}

TEST_CASE("where the recorder goes on at a third of its rate, each rate has its run") {
    const auto runs = runs_after(repeated({{9, 1.0}, {20, 3.0}, {9, 1.0}}));
    REQUIRE(runs.size() == 3);
    CHECK(runs[0] == Run{0, 10});
    CHECK(runs[1] == Run{10, 30});
    CHECK(runs[2] == Run{30, 39});
}

TEST_CASE("a gap in the slower part is a gap") {
    const auto runs = runs_after(repeated({{9, 1.0}, {10, 3.0}, {1, 9.0}, {10, 3.0}}));
    REQUIRE(runs.size() == 3);
    CHECK(runs[1] == Run{10, 20});
    CHECK(runs[2] == Run{20, 31});
}

TEST_CASE("single samples between gaps are left out") {
    // Runs of fewer than four tell nothing.
    const auto runs = runs_after(repeated({{9, 1.0}, {1, 3.0}, {1, 7.0}, {9, 1.0}}));
    REQUIRE(runs.size() == 2);
    CHECK(runs[0] == Run{0, 10});
    CHECK(runs[1] == Run{11, 21});
}
