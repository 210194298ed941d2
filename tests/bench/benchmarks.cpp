// Google Benchmark of each step: build/benchmarks --benchmark_filter=read. The recordings are simulated with
// a written seed.

#include <benchmark/benchmark.h>
#include <fmt/format.h>

#include <cmath>
#include <iterator>
#include <numbers>

#include "identify/curve_fit.hpp"
#include "identify/method_bootstrap.hpp"
#include "ringwright/event.hpp"
#include "ringwright/identify.hpp"
#include "ringwright/recording.hpp"
#include "support/draws.hpp"

namespace {

using namespace ringwright;

/// A release of 5 Hz, damping ratio 0.03, at 1 s of ten, in noise of 0.2 % of its amplitude.
Recording decay_of(std::size_t samples) {
    constexpr double zeta = 0.03, omega = 2.0 * std::numbers::pi * 5.0, seconds = 10.0;
    Recording recording;
    recording.clock.sample_rate_hz = static_cast<double>(samples) / seconds;
    test::Draws draws(2031);
    for (std::size_t i = 0; i < samples; ++i) {
        const double t = static_cast<double>(i) / recording.clock.sample_rate_hz - 1.0;
        const double held =
            t < -0.5 ? 0.0
                     : 1.0 - std::pow(std::cos(std::numbers::pi * std::min(1.0, 2.0 * (t + 0.5)) / 2.0), 2);
        const double x = t < 0.0 ? held : std::exp(-zeta * omega * t) * std::cos(omega * t);
        recording.samples.push_back(0.005 * (x + 0.002 * draws.normal()));
    }
    return recording;
}

std::string csv_of(std::size_t samples) {
    const Recording recording = decay_of(samples);
    std::string text = "time (s),laser (m)\n";
    for (std::size_t i = 0; i < samples; ++i)
        fmt::format_to(std::back_inserter(text), "{:.6f},{:.8f}\n", recording.clock.time_of(i),
                       recording.samples[i]);
    return text;
}

std::size_t size_of(const benchmark::State& state) {
    return static_cast<std::size_t>(state.range(0));
}

void read_csv(benchmark::State& state) {
    const std::string text = csv_of(size_of(state));
    for (auto _ : state) benchmark::DoNotOptimize(read_recording_from_memory(text, "bench.csv"));
    state.SetBytesProcessed(state.iterations() * static_cast<std::int64_t>(text.size()));
    state.SetComplexityN(state.range(0));
}
BENCHMARK(read_csv)
    ->RangeMultiplier(10)
    ->Range(5'000, 5'000'000)
    ->Unit(benchmark::kMillisecond)
    ->MeasureProcessCPUTime()
    ->UseRealTime()
    ->Complexity();

void find_releases(benchmark::State& state) {
    const Recording recording = decay_of(size_of(state));
    for (auto _ : state) benchmark::DoNotOptimize(find_events(recording, {}));
    state.SetComplexityN(state.range(0));
}
BENCHMARK(find_releases)
    ->RangeMultiplier(10)
    ->Range(5'000, 5'000'000)
    ->Unit(benchmark::kMillisecond)
    ->Complexity();

/// The release of a recording, found once.
struct Found {
    Recording recording;
    Event event;
    explicit Found(std::size_t samples)
        : recording(decay_of(samples)), event(find_events(recording, {}).events.at(0)) {}
};

void curve_fit(benchmark::State& state) {
    const Found found(size_of(state));
    for (auto _ : state) benchmark::DoNotOptimize(identify::fit_decay(found.recording, found.event, {}));
}
BENCHMARK(curve_fit)->Arg(5'000)->Arg(500'000)->Unit(benchmark::kMillisecond);

/// `replicates` of both simple methods; 0 is the two readings alone.
void simple_methods_and_bootstrap(benchmark::State& state) {
    const Found found(5'000);
    const identify::CurveFit fit = identify::fit_decay(found.recording, found.event, {});
    for (auto _ : state)
        benchmark::DoNotOptimize(identify::bootstrap_methods(fit, static_cast<int>(state.range(0)), 1));
}
BENCHMARK(simple_methods_and_bootstrap)->Arg(2)->Arg(80)->Arg(300)->Unit(benchmark::kMillisecond);

void whole_event(benchmark::State& state) {
    const Found found(size_of(state));
    for (auto _ : state) benchmark::DoNotOptimize(identify_event(found.recording, found.event, {}));
}
BENCHMARK(whole_event)->Arg(5'000)->Arg(500'000)->Unit(benchmark::kMillisecond);

/// What the program does between the file and its text; `side_by_side` times the program itself.
void bytes_to_answer(benchmark::State& state) {
    const std::string text = csv_of(size_of(state));
    for (auto _ : state) {
        const Recording recording = read_recording_from_memory(text, "bench.csv");
        for (const Event& event : find_events(recording, {}).events)
            benchmark::DoNotOptimize(identify_event(recording, event, {}));
    }
}
BENCHMARK(bytes_to_answer)->Arg(5'000)->Arg(500'000)->Unit(benchmark::kMillisecond)->UseRealTime();

}  // namespace

BENCHMARK_MAIN();
