// The quiet stretch before a release as a sample of the noise. Recordings of known truth from
// tests/support; seeds are written at each case.

#include <catch2/catch.hpp>
#include <cmath>

#include "identify/curve_fit.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;
using namespace ringwright::identify;

namespace {

simulated::Truth few_cycles() {
    simulated::Truth truth;
    truth.damping_ratio = 0.1;
    truth.cycles = 3.0;
    truth.held_cycles = 4.0;
    truth.noise_correlation = 0.8;
    return truth;
}

CurveFit fit_of(const simulated::Sample& sample) {
    return fit_decay(sample.recording, sample.event, {});
}

}  // namespace

TEST_CASE("a still plateau before the release adds its degrees of freedom to the noise model") {
    int used = 0;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        simulated::Deviates deviates(seed);
        simulated::Sample sample = simulated::draw(few_cycles(), deviates);
        const CurveFit with = fit_of(sample);
        REQUIRE(with.valid);
        const double rows = static_cast<double>(with.samples.size()) - 5.0;
        used += with.noise.degrees_of_freedom > rows + 20.0;
        CHECK(with.noise.fit.unit_covariance.rows() == with.map.rows());
    }
    // Two tests with one false alarm in a thousand each, at up to three lengths: twenty of twenty but for
    // one chance in ten.
    CHECK(used >= 19);
}

TEST_CASE("a hand that moves before the release, or holds less still, is no sample of the noise") {
    for (const bool trembles : {true, false}) {
        INFO((trembles ? "trembles" : "pulls"));
        simulated::Deviates deviates(77);
        simulated::Sample sample = simulated::draw(few_cycles(), deviates);
        for (std::size_t i = 0; i < sample.event.begin; ++i) {
            const double to_release = static_cast<double>(sample.event.begin - i) / 100.0;  // cycles
            sample.recording.samples[i] +=
                trembles ? 0.05 * std::sin(6.0 * to_release) : 0.3 * std::sin(0.8 * to_release) * to_release;
        }
        const CurveFit fit = fit_of(sample);
        REQUIRE(fit.valid);
        // The last cycle may pass: what the motion leaves there about a straight line is no larger than the
        // noise.
        CHECK(fit.quiet.size() <= 100);
        const double deviation = std::sqrt(fit.noise.noise.variance()) * fit.samples.scale;
        CHECK(deviation < 0.015);  // 0.01 is true; block means lie below it
        CHECK(fit.oscillator().damping_ratio() == Approx(0.1).margin(0.02));  // five times the bound at 40 dB
    }
}

// Median over recordings: the noise of an AR(1) process of φ = 0.95 is underestimated from three cycles
// alone. Truth: variance 10^(−40/20·2) of one sample.
TEST_CASE("the quiet stretch shows slow noise that three cycles hide") {
    double with = 0.0, without = 0.0;
    for (std::uint64_t seed = 100; seed < 160; ++seed) {
        simulated::Truth truth = few_cycles();
        truth.noise_correlation = 0.95;
        truth.damping_ratio = 0.3;
        simulated::Deviates deviates(seed);
        simulated::Sample sample = simulated::draw(truth, deviates);
        const CurveFit long_lead = fit_of(sample);
        const auto cut = static_cast<std::ptrdiff_t>(sample.event.begin);
        sample.recording.samples.erase(sample.recording.samples.begin(),
                                       sample.recording.samples.begin() + cut);
        sample.event.end -= sample.event.begin;
        sample.event.rest_end -= sample.event.begin;
        sample.event.begin = 0;
        const CurveFit no_lead = fit_of(sample);
        const auto error = [](const CurveFit& fit) {
            const double variance = fit.noise.noise.variance() * fit.samples.scale * fit.samples.scale;
            return std::abs(std::log(variance / 1e-4));
        };
        with += error(long_lead);
        without += error(no_lead);
    }
    CHECK(with < 0.9 * without);
}
