#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>
#include <numbers>

#include "analysis/result.hpp"
#include "ringwright/distributions.hpp"

using namespace ringwright;
using Catch::Detail::Approx;

namespace {

Estimate estimate(double value, double relative_uncertainty, double degrees_of_freedom = 30.0) {
    const double u = value * relative_uncertainty, half = student_t_factor(0.95, degrees_of_freedom) * u;
    return {value, u, {value - half, value + half}, degrees_of_freedom};
}

MethodResult answer(double frequency, double damping, const char* model = "") {
    MethodResult result;
    result.status = MethodStatus::ok;
    result.model = model;
    result.quantities = {{Quantity::natural_frequency, estimate(frequency, 1e-4)},
                         {Quantity::damping_ratio, estimate(damping, 1e-2)},
                         {Quantity::quality_factor, estimate(0.5 / damping, 1e-2)}};
    return result;
}

EventIdentification event_with_fit(double frequency, double damping) {
    EventIdentification event;
    event.event.start_amplitude = 1.0;
    event.curve_fit = answer(frequency, damping, "viscous");
    return event;
}

RecordingIdentification recording_of(std::vector<EventIdentification> events) {
    RecordingIdentification recording;
    recording.recording.origin.file = "bench.csv";
    recording.events = std::move(events);
    return recording;
}

MeasuredValue kilograms(double value) {
    MeasuredValue measured;
    measured.value = value;
    measured.text = std::to_string(value) + " kg";
    return measured;
}

bool has(const Findings& findings, const std::string& code) {
    return std::ranges::any_of(findings, [&](const Finding& finding) { return finding.code == code; });
}

double share_sum(const PooledResult& result, Quantity quantity) {
    double sum = 0.0;
    for (const BudgetLine& line : result.budget)
        if (line.quantity == quantity) sum += line.share;
    return sum;
}

}  // namespace

TEST_CASE("one release keeps the interval of its method and says that repeatability was not tested") {
    auto event = event_with_fit(5.0, 0.02);
    event.curve_fit.quantities[Quantity::damping_ratio].interval = {0.0195, 0.0220};
    const PooledResult result = analysis::combine({recording_of({event})}, {});
    CHECK(result.method == "curve_fit");
    CHECK(result.model == "viscous");
    CHECK(result.event_count == 1);
    CHECK(result.quantities.at(Quantity::damping_ratio).interval.high == 0.0220);
    CHECK(has(result.findings, "repeatability_not_tested"));
    CHECK(share_sum(result, Quantity::natural_frequency) == Approx(1.0));
}

TEST_CASE("several releases are pooled") {
    const PooledResult result =
        analysis::combine({recording_of({event_with_fit(5.00, 0.020), event_with_fit(5.01, 0.021),
                                         event_with_fit(4.99, 0.019)})},
                          {});
    CHECK(result.event_count == 3);
    CHECK(result.quantities.at(Quantity::natural_frequency).value == Approx(5.0).epsilon(1e-5));
    CHECK(result.quantities.at(Quantity::natural_frequency).degrees_of_freedom == 2.0);
    CHECK(result.quantities.at(Quantity::quality_factor).value ==
          Approx(0.5 / result.quantities.at(Quantity::damping_ratio).value).epsilon(1e-12));
    CHECK_FALSE(has(result.findings, "repeatability_not_tested"));
    CHECK(std::ranges::any_of(result.budget,
                              [](const BudgetLine& line) { return line.source == "repeatability"; }));
}

TEST_CASE("the method of the result") {
    EventIdentification only_decrement;
    only_decrement.logarithmic_decrement = answer(5.0, 0.02);
    CHECK(analysis::combine({recording_of({only_decrement})}, {}).method == "logarithmic_decrement");
    EventIdentification only_width;
    only_width.half_power_bandwidth = answer(5.0, 0.02);
    CHECK(analysis::combine({recording_of({only_width})}, {}).method == "half_power_bandwidth");
    CHECK(analysis::combine({recording_of({EventIdentification{}})}, {}).method.empty());
    CHECK(analysis::combine({recording_of({})}, {}).method.empty());

    // The curve fit answers one of three, the decrement all: the decrement gives the result.
    EventIdentification both = only_decrement;
    both.curve_fit = answer(5.0, 0.02, "viscous");
    const PooledResult mostly = analysis::combine({recording_of({both, only_decrement, only_decrement})}, {});
    CHECK(mostly.method == "logarithmic_decrement");
    CHECK(mostly.event_count == 3);
    const PooledResult partly = analysis::combine({recording_of({both, both, only_decrement})}, {});
    CHECK(partly.method == "curve_fit");
    CHECK(has(partly.findings, "releases_without_answer"));
}

TEST_CASE("clock and gain enter the budget") {
    AnalysisOptions options;
    options.time_base_ppm = 100.0;
    options.sensor_gain_relative = 0.05;
    auto event = event_with_fit(5.0, 0.02);
    event.curve_fit.quantities[Quantity::static_deflection] = estimate(0.01, 1e-3);
    const PooledResult result = analysis::combine({recording_of({event})}, options);
    // Equal parts, 1e-4 from noise and 1e-4 from the clock.
    CHECK(result.quantities.at(Quantity::natural_frequency).standard_uncertainty ==
          Approx(5.0 * std::sqrt(2.0) * 1e-4).epsilon(1e-6));
    CHECK(result.quantities.at(Quantity::damping_ratio).standard_uncertainty == Approx(2e-4).epsilon(1e-9));
    CHECK(result.quantities.at(Quantity::static_deflection).standard_uncertainty ==
          Approx(0.01 * std::hypot(0.05, 1e-3)).epsilon(1e-6));
    CHECK(share_sum(result, Quantity::natural_frequency) == Approx(1.0));
}

TEST_CASE("loadings give stiffness and mass") {
    const double stiffness = 900.0, mass = 1.5;
    const auto loaded = [&](double added) {
        const double total = mass + added;
        auto recording =
            recording_of({event_with_fit(std::sqrt(stiffness / total) / (2.0 * std::numbers::pi), 0.02)});
        recording.added_mass = kilograms(added);
        return recording;
    };
    const PooledResult result = analysis::combine({loaded(1.0), loaded(0.0)}, {});
    CHECK(result.quantities.at(Quantity::stiffness).value == Approx(stiffness).epsilon(1e-9));
    CHECK(result.quantities.at(Quantity::mass).value == Approx(mass).epsilon(1e-9));
    CHECK(result.quantities.at(Quantity::natural_frequency).value ==
          Approx(std::sqrt(stiffness / mass) / (2.0 * std::numbers::pi)).epsilon(1e-9));
    CHECK(has(result.findings, "loadings"));
}

TEST_CASE("torsion has its own units") {
    AnalysisOptions options;
    MeasuredValue inertia = kilograms(0.01);
    options.article.inertia = inertia;
    const PooledResult result = analysis::combine({recording_of({event_with_fit(5.0, 0.02)})}, options);
    CHECK(result.torsional);
    CHECK(result.quantities.contains(Quantity::stiffness));
}

TEST_CASE("a recording without noise, one that is not a number, and a recording without events") {
    auto quiet = event_with_fit(5.0, 0.02);
    for (auto& [quantity, each] : quiet.curve_fit.quantities) each.standard_uncertainty = 0.0;
    auto broken = event_with_fit(5.0, 0.02);
    broken.curve_fit.quantities[Quantity::damping_ratio].value = std::numeric_limits<double>::quiet_NaN();
    const PooledResult result =
        analysis::combine({recording_of({quiet, quiet, broken}), recording_of({})}, {});
    CHECK(result.quantities.at(Quantity::natural_frequency).value == Approx(5.0));
    CHECK(std::isfinite(result.quantities.at(Quantity::damping_ratio).value));
    CHECK(has(result.findings, "recording_without_event"));
}

TEST_CASE("gravity is part of the budget where the height of a drop rests on it") {
    // An accelerometer tells the height by gT²/2: u(g)/g of the height (JCGM 100, 5.1.2, by hand). A
    // displacement shows it without gravity.
    for (const auto sensor : {MeasuredQuantity::acceleration, MeasuredQuantity::displacement}) {
        RecordingIdentification recording = recording_of({event_with_fit(6.0, 0.15)});
        recording.recording.quantity = sensor;
        recording.events[0].curve_fit.quantities[Quantity::drop_height] = estimate(0.04, 1e-3);
        AnalysisOptions options;
        options.article.gravity.emplace();
        options.article.gravity->value = 9.81;
        options.article.gravity->standard_uncertainty = 0.02;
        const PooledResult result = analysis::combine({recording}, options);
        const auto line = std::ranges::find_if(result.budget, [](const BudgetLine& candidate) {
            return candidate.quantity == Quantity::drop_height && candidate.source == "gravity";
        });
        if (sensor == MeasuredQuantity::displacement) {
            CHECK(line == result.budget.end());
            continue;
        }
        REQUIRE(line != result.budget.end());
        CHECK(line->contribution == Approx(0.04 * 0.02 / 9.81));
        CHECK(result.quantities.at(Quantity::drop_height).standard_uncertainty ==
              Approx(0.04 * std::hypot(1e-3, 0.02 / 9.81)));
    }
}
