#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>

#include "ringwright/repeats.hpp"
#include "support/draws.hpp"

using namespace ringwright;
using Catch::Detail::Approx;
using ringwright::test::Draws;

namespace {

ReleaseSeries series_of(const std::vector<double>& values, double standard_uncertainty = 0.01) {
    ReleaseSeries series{"natural frequency", "Hz", {}, {}, {}};
    for (const double value : values) {
        series.releases.push_back({value, standard_uncertainty, {}, 50.0});
        series.labels.push_back("Release " + std::to_string(series.releases.size()));
    }
    return series;
}

ReleaseSeries true_repeats(Draws& draws, int count, double between) {
    std::vector<double> values;
    for (int i = 0; i < count; ++i) values.push_back(10.0 + 0.01 * draws.normal() + between * draws.normal());
    ReleaseSeries series = series_of(values);
    for (int i = 0; i < count; ++i) series.amplitudes.push_back(1.0 + draws.uniform());
    return series;
}

bool has(const Findings& findings, const std::string& code) {
    return std::ranges::any_of(findings, [&](const Finding& finding) { return finding.code == code; });
}

}  // namespace

TEST_CASE("false alarms are at the rate that is stated") {
    // 5,000 series a setting; the rate is 1 % with a sampling error of 0.14 points: 0.3–1.7 % at one false
    // alarm in a million. Normal scatter, equal uncertainties; where there is scatter between releases the
    // weights stay equal.
    for (const int count : {4, 6, 12})
        for (const double between : {0.0, 0.05}) {
            Draws draws(900 + static_cast<std::uint64_t>(count));
            int drifting = 0, dependent = 0, outlying = 0;
            for (int trial = 0; trial < 5000; ++trial) {
                const ReleaseSeries series = true_repeats(draws, count, between);
                drifting += test_drift(series).p_value < repeats_false_alarm_rate;
                dependent += test_amplitude_dependence(series).p_value < repeats_false_alarm_rate;
                outlying += !outlying_releases(series).empty();
            }
            INFO("releases " << count << ", between " << between);
            for (const int alarms : {drifting, dependent, outlying}) {
                CHECK(alarms > 15);
                CHECK(alarms < 85);
            }
        }
}

TEST_CASE("a warming article is seen") {
    const ReleaseSeries series = series_of({10.00, 9.97, 9.95, 9.91, 9.90, 9.87});
    const TrendTest drift = test_drift(series);
    REQUIRE(drift.tested);
    // Least squares by hand on ln: slope −0.002590 a release, five steps.
    CHECK(drift.relative_change == Approx(-0.0130).margin(0.0005));
    CHECK(drift.p_value < 0.001);
    CHECK(has(examine_repeats(series, 0.95), "drift_in_series"));
}

TEST_CASE("dependence on amplitude is seen, and told apart from drift by mixed order") {
    ReleaseSeries series = series_of({10.00, 9.90, 9.98, 9.92, 9.99, 9.91});
    series.amplitudes = {1.0, 3.0, 1.4, 2.5, 1.2, 2.8};
    const Findings findings = examine_repeats(series, 0.95);
    CHECK(has(findings, "amplitude_dependent"));
    CHECK_FALSE(has(findings, "drift_in_series"));
}

TEST_CASE("amplitudes that hardly differ are not tested") {
    ReleaseSeries series = series_of({10.00, 9.90, 9.98, 9.92});
    series.amplitudes = {1.0, 1.01, 1.02, 1.0};
    CHECK_FALSE(test_amplitude_dependence(series).tested);
}

TEST_CASE("an outlying release is named and kept") {
    const ReleaseSeries series = series_of({10.00, 10.01, 9.99, 10.40, 10.00, 10.01, 9.99, 10.00});
    CHECK(outlying_releases(series) == std::vector<std::size_t>{3});
    const Findings findings = examine_repeats(series, 0.95);
    const auto found = std::ranges::find(findings, "outlying_release", &Finding::code);
    REQUIRE(found != findings.end());
    CHECK(found->message.find("Release 4") != std::string::npos);
    CHECK(found->severity == Severity::caution);
}

TEST_CASE("three releases are too few for a test") {
    const ReleaseSeries series = series_of({10.0, 11.0, 12.0});
    CHECK_FALSE(test_drift(series).tested);
    CHECK(outlying_releases(series).empty());
}

TEST_CASE("identical releases raise nothing") {
    const ReleaseSeries series = series_of({10.0, 10.0, 10.0, 10.0, 10.0});
    CHECK(examine_repeats(series, 0.95).empty());
}
