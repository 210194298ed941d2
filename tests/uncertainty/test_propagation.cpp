#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/distributions.hpp"
#include "ringwright/propagation.hpp"

using namespace ringwright;
using Catch::Detail::Approx;

namespace {

/// JCGM 100:2008, H.1: an end gauge compared with a standard. Lengths in nm, temperatures in K.
std::vector<ModelInput> end_gauge_inputs() {
    // d combines 5.8 (24 degrees of freedom), 3.9 (5) and 6.7 (8): H.1.3.2. The exact values 9.681942
    // and 25.44725 are recomputed; the book prints 9.7 and 25.6.
    const double u_d = std::sqrt(5.8 * 5.8 + 3.9 * 3.9 + 6.7 * 6.7);
    const double df_d =
        std::pow(u_d, 4) / (std::pow(5.8, 4) / 24 + std::pow(3.9, 4) / 5 + std::pow(6.7, 4) / 8);
    return {{"standard", 50000623.0, 25.0, 18.0, "nm", {}},
            {"difference", 215.0, u_d, df_d, "nm", {}},
            {"expansion difference", 0.0, 1e-6 / std::sqrt(3.0), 50.0, "1/K", {}},
            {"temperature difference", 0.0, 0.05 / std::sqrt(3.0), 2.0, "K", {}},
            {"expansion", 11.5e-6, 1.2e-6, std::numeric_limits<double>::infinity(), "1/K", {}},
            {"temperature", -0.1, 0.41, std::numeric_limits<double>::infinity(), "K", {}}};
}

/// Equation H.3: l = l_s + d − l_s (δα θ + α_s δθ).
double end_gauge(std::span<const double> at) {
    return at[0] + at[1] - at[0] * (at[2] * at[5] + at[4] * at[3]);
}

/// JCGM 100:2008, H.2: voltage, current and phase, means of five with the correlations of Table H.2
/// recomputed from its data.
struct ImpedanceStudy {
    std::vector<ModelInput> inputs;
    std::vector<InputCorrelation> correlations;
};

ImpedanceStudy impedance_inputs() {
    const double data[3][5] = {{5.007, 4.994, 5.005, 4.990, 4.999},
                               {19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3},
                               {1.0456, 1.0438, 1.0468, 1.0428, 1.0433}};
    double mean[3]{}, product[3][3]{};
    for (int q = 0; q < 3; ++q)
        for (const double value : data[q]) mean[q] += value / 5.0;
    for (int p = 0; p < 3; ++p)
        for (int q = 0; q < 3; ++q)
            for (int k = 0; k < 5; ++k)
                product[p][q] += (data[p][k] - mean[p]) * (data[q][k] - mean[q]) / 20.0;
    ImpedanceStudy study;
    const char* names[3] = {"voltage", "current", "phase"};
    for (int q = 0; q < 3; ++q)
        study.inputs.push_back({names[q], mean[q], std::sqrt(product[q][q]), 4.0, "", {}});
    for (std::size_t p = 0; p < 3; ++p)
        for (std::size_t q = p + 1; q < 3; ++q)
            study.correlations.push_back({p, q, product[p][q] / std::sqrt(product[p][p] * product[q][q])});
    return study;
}

}  // namespace

TEST_CASE("end gauge, JCGM 100 H.1") {
    const std::vector<ModelInput> inputs = end_gauge_inputs();
    const Propagated result = propagate(inputs, end_gauge);
    CHECK(result.value == Approx(50000838.0).margin(1e-6));
    // Exact terms, recomputed from the stated inputs; the book prints 32, 25, 9.7, 2.9, 16.6 and 16.7.
    // Tolerance: numeric sensitivities at 1e-6.
    CHECK(result.standard_uncertainty == Approx(31.66388).epsilon(1e-6));
    CHECK(result.contributions[0].contribution == Approx(25.0).epsilon(1e-6));
    CHECK(result.contributions[1].contribution == Approx(9.681942).epsilon(1e-6));
    CHECK(result.contributions[2].contribution == Approx(2.886787).epsilon(1e-6));
    CHECK(result.contributions[3].contribution == Approx(16.599027).epsilon(1e-6));
    CHECK(result.degrees_of_freedom == Approx(16.7519).epsilon(1e-4));
    // H.1.6: t99(16) = 2.92 and U99 = 93 nm with the degrees of freedom cut to a whole number.
    CHECK(student_t_factor(0.99, 16.0) == Approx(2.92).margin(0.005));
    double shares = 0.0;
    for (const Contribution& part : result.contributions) shares += part.share;
    CHECK(shares == Approx(1.0).epsilon(1e-12));
}

TEST_CASE("analytic sensitivities give what numeric ones give") {
    const std::vector<ModelInput> inputs = end_gauge_inputs();
    const ModelGradient gradient = [](std::span<const double> at) {
        return std::vector<double>{1.0 - at[2] * at[5] - at[4] * at[3],
                                   1.0,
                                   -at[0] * at[5],
                                   -at[0] * at[4],
                                   -at[0] * at[3],
                                   -at[0] * at[2]};
    };
    const Propagated numeric = propagate(inputs, end_gauge),
                     analytic = propagate(inputs, end_gauge, {}, gradient);
    for (std::size_t i = 0; i < inputs.size(); ++i)
        // Differences of 5e7 nm keep 1e-16 · 5e7 over the step; the header claims 1e-6.
        CHECK(numeric.contributions[i].contribution ==
              Approx(analytic.contributions[i].contribution).epsilon(1e-6).margin(1e-6));
}

TEST_CASE("resistance, reactance and impedance from correlated readings, JCGM 100 H.2") {
    const ImpedanceStudy study = impedance_inputs();
    // Table H.2 prints r = −0.36, 0.86, −0.65.
    CHECK(study.correlations[0].coefficient == Approx(-0.36).margin(0.005));
    CHECK(study.correlations[1].coefficient == Approx(0.86).margin(0.005));
    CHECK(study.correlations[2].coefficient == Approx(-0.65).margin(0.005));
    const auto result = [&](auto model) { return propagate(study.inputs, model, study.correlations); };
    const Propagated resistance =
        result([](std::span<const double> at) { return at[0] / at[1] * std::cos(at[2]); });
    const Propagated reactance =
        result([](std::span<const double> at) { return at[0] / at[1] * std::sin(at[2]); });
    const Propagated impedance = result([](std::span<const double> at) { return at[0] / at[1]; });
    // Table H.3; the uncertainties recomputed from the data of Table H.2 to seven digits.
    CHECK(resistance.value == Approx(127.732).margin(5e-4));
    CHECK(reactance.value == Approx(219.847).margin(5e-4));
    CHECK(impedance.value == Approx(254.260).margin(5e-4));
    CHECK(resistance.standard_uncertainty == Approx(0.0710714).epsilon(1e-6));
    CHECK(reactance.standard_uncertainty == Approx(0.2955817).epsilon(1e-6));
    CHECK(impedance.standard_uncertainty == Approx(0.2363361).epsilon(1e-6));

    const auto correlation = [&](const Propagated& a, const Propagated& b) {
        return propagated_covariance(study.inputs, study.correlations, a, b) /
               (a.standard_uncertainty * b.standard_uncertainty);
    };
    CHECK(correlation(resistance, reactance) == Approx(-0.5884298).epsilon(1e-6));
    CHECK(correlation(resistance, impedance) == Approx(-0.4852592).epsilon(1e-6));
    CHECK(correlation(reactance, impedance) == Approx(0.9925116).epsilon(1e-6));
}

TEST_CASE("intervals: symmetric, on the logarithm, lopsided") {
    const ModelFunction product = [](std::span<const double> at) { return at[0] * at[1]; };
    std::vector<ModelInput> inputs{{"a", 2.0, 0.02, 10.0, "", {}}, {"b", 3.0, 0.0, 1.0, "", {}}};
    const double half = 2.2281388519649 * 0.06;  // t(0.975; 10), tables of the t distribution
    const Propagated result = propagate(inputs, product);
    const Estimate linear = estimate_of(result, inputs, {}, 0.95);
    CHECK(linear.interval.low == Approx(6.0 - half).epsilon(1e-9));
    CHECK(linear.interval.high == Approx(6.0 + half).epsilon(1e-9));
    const Estimate positive = estimate_of(result, inputs, {}, 0.95, true);
    CHECK(positive.interval.low == Approx(6.0 * std::exp(-half / 6.0)).epsilon(1e-9));
    CHECK(positive.interval.high == Approx(6.0 * std::exp(half / 6.0)).epsilon(1e-9));

    SECTION("one input alone hands its own lopsided interval on") {
        inputs[0].interval = Interval{1.95, 2.12};
        const Estimate lopsided = estimate_of(result, inputs, {}, 0.95, true);
        CHECK(lopsided.interval.low == Approx(5.85).epsilon(1e-9));
        CHECK(lopsided.interval.high == Approx(6.36).epsilon(1e-9));
    }
    SECTION("a falling model swaps the sides") {
        inputs[0].interval = Interval{1.95, 2.12};
        const ModelFunction inverse = [](std::span<const double> at) { return 1.0 / at[0]; };
        const Estimate lopsided = estimate_of(propagate(inputs, inverse), inputs, {}, 0.95, true);
        CHECK(lopsided.interval.low == Approx(1.0 / 2.12).epsilon(1e-6));
        CHECK(lopsided.interval.high == Approx(1.0 / 1.95).epsilon(1e-6));
    }
    SECTION("an open end stays open") {
        inputs[0].interval = Interval{1.95, std::numeric_limits<double>::infinity()};
        const Estimate open = estimate_of(result, inputs, {}, 0.95, true);
        CHECK(open.interval.low == Approx(5.85).epsilon(1e-9));
        CHECK(std::isinf(open.interval.high));
    }
}

TEST_CASE("nothing uncertain leaves nothing uncertain") {
    const std::vector<ModelInput> inputs{{"a", 2.0, 0.0, 5.0, "", {}}};
    const Propagated result = propagate(inputs, [](std::span<const double> at) { return 2.0 * at[0]; });
    CHECK(result.value == 4.0);
    CHECK(result.standard_uncertainty == 0.0);
    CHECK(std::isinf(result.degrees_of_freedom));
}
