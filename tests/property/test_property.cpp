#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/distributions.hpp"
#include "ringwright/error.hpp"
#include "ringwright/property.hpp"
#include "support/draws.hpp"

using namespace ringwright;
using Catch::Detail::Approx;
using ringwright::test::Draws;

namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();
constexpr double pi = std::numbers::pi;

MeasuredValue kilograms(double value, double standard_uncertainty = 0.0) {
    MeasuredValue measured;
    measured.value = value;
    measured.standard_uncertainty = standard_uncertainty;
    measured.kind = standard_uncertainty > 0.0 ? UncertaintyKind::standard : UncertaintyKind::not_stated;
    measured.text = std::to_string(value) + " kg";
    return measured;
}

Estimate estimate(double value, double relative_uncertainty, double degrees_of_freedom = infinite) {
    const double u = value * relative_uncertainty;
    const double half = student_t_factor(0.95, degrees_of_freedom) * u;
    return {value, u, {value - half, value + half}, degrees_of_freedom};
}

Loading loading(double frequency_hz, double damping_ratio, double added = 0.0,
                double relative_uncertainty = 1e-4) {
    Loading result;
    result.added_mass = kilograms(added);
    result.natural_frequency = estimate(frequency_hz, relative_uncertainty);
    result.damping_ratio = estimate(damping_ratio, 1e-2);
    return result;
}

Article with_mass(double value, double standard_uncertainty = 0.0) {
    Article article;
    article.mass = kilograms(value, standard_uncertainty);
    return article;
}

double value_of(const PropertyResult& result, Quantity quantity) {
    return result.quantities.at(quantity).value;
}

bool has(const Findings& findings, const std::string& code) {
    return std::ranges::any_of(findings, [&](const Finding& finding) { return finding.code == code; });
}

}  // namespace

TEST_CASE("textbook examples of stiffness and damping") {
    SECTION("8 kg, 5400 N/m, c 40 N s/m: damping ratio 0.0962250 (textbook exercise)") {
        const double frequency = std::sqrt(5400.0 / 8.0) / (2.0 * pi);
        const PropertyResult result =
            derive_properties({loading(frequency, 0.0962250448649376)}, with_mass(8.0), false, 0.95);
        CHECK(value_of(result, Quantity::stiffness) == Approx(5400.0).epsilon(1e-12));
        CHECK(value_of(result, Quantity::damping_coefficient) == Approx(40.0).epsilon(1e-12));
    }
    SECTION(
        "7.5 kg, 24 cycles in 14 s, a quarter left after five: k 871.8309 N/m, c 7.12951 N s/m (textbook "
        "exercise, "
        "computed without rounding the frequency)") {
        const double decrement = std::log(4.0) / 5.0;
        const double ratio = decrement / std::hypot(2.0 * pi, decrement);
        const double frequency = 24.0 / 14.0 / std::sqrt(1.0 - ratio * ratio);
        const PropertyResult result =
            derive_properties({loading(frequency, ratio)}, with_mass(7.5), false, 0.95);
        CHECK(value_of(result, Quantity::stiffness) == Approx(871.8309).epsilon(1e-7));
        CHECK(value_of(result, Quantity::damping_coefficient) == Approx(7.12951).epsilon(1e-6));
    }
    SECTION("6 kg, 5400 N/m, successive amplitudes 3:2: c 23.18322 N s/m (textbook exercise)") {
        const double decrement = std::log(1.5);
        const double ratio = decrement / std::hypot(2.0 * pi, decrement);
        const double frequency = std::sqrt(5400.0 / 6.0) / (2.0 * pi);
        const PropertyResult result =
            derive_properties({loading(frequency, ratio)}, with_mass(6.0), false, 0.95);
        CHECK(value_of(result, Quantity::damping_coefficient) == Approx(23.18322).epsilon(1e-6));
    }
    SECTION(
        "torsion wire 2 mm, 1 m, 80 GPa, disc 2 kg of 0.1 m: 0.125663706 N m/rad at 0.564189584 Hz "
        "(formula)") {
        Article article;
        article.inertia = kilograms(0.5 * 2.0 * 0.1 * 0.1);
        const PropertyResult result = derive_properties({loading(0.564189584, 0.01)}, article, true, 0.95);
        CHECK(value_of(result, Quantity::stiffness) == Approx(0.125663706).epsilon(4e-9));
    }
}

TEST_CASE("stiffness and mass from added masses") {
    SECTION("94 cpm; with 0.453 kg more 76.7 cpm: 0.902421 kg, 87.44244 N/m (textbook exercise)") {
        const PropertyResult result = derive_properties(
            {loading(94.0 / 60.0, 0.01), loading(76.7 / 60.0, 0.01, 0.453)}, {}, false, 0.95);
        CHECK(value_of(result, Quantity::mass) == Approx(0.902421).epsilon(1e-6));
        CHECK(value_of(result, Quantity::stiffness) == Approx(87.44244).epsilon(1e-6));
        CHECK(has(result.findings, "moving_mass"));
    }
    SECTION("1.5 Hz; with 80 g more 0.9 Hz: 0.045 kg, 3.997190 N/m (textbook exercise)") {
        const PropertyResult result =
            derive_properties({loading(1.5, 0.01), loading(0.9, 0.01, 0.080)}, {}, false, 0.95);
        CHECK(value_of(result, Quantity::mass) == Approx(0.045).epsilon(1e-9));
        CHECK(value_of(result, Quantity::stiffness) == Approx(3.997190).epsilon(1e-6));
    }
    SECTION(
        "0.85 kg at 1.43 Hz: with 0.32 kg more 1.218856 Hz, with 0.32 kg less 1.810955 Hz (textbook "
        "exercise)") {
        const PropertyResult result = derive_properties(
            {loading(1.218856, 0.01, 0.64), loading(1.43, 0.01, 0.32), loading(1.810955, 0.01)}, {}, false,
            0.95);
        CHECK(value_of(result, Quantity::mass) == Approx(0.53).epsilon(3e-6));
        CHECK(value_of(result, Quantity::stiffness) ==
              Approx(0.85 * std::pow(2.0 * pi * 1.43, 2)).epsilon(3e-6));
        CHECK_FALSE(has(result.findings, "loading_line_scatter"));
    }
}

TEST_CASE("a third of the spring moves") {
    Article article = with_mass(1.0);
    article.spring_mass = kilograms(0.3);
    const PropertyResult result = derive_properties({loading(2.0, 0.01)}, article, false, 0.95);
    CHECK(value_of(result, Quantity::stiffness) == Approx(1.1 * std::pow(4.0 * pi, 2)).epsilon(1e-12));
    // Exact frequency over that of the rule of a third, computed from β tan β = ratio to 9 digits; the
    // stiffness goes with its square.
    for (const auto& [ratio, frequency] :
         {std::pair{0.1, 0.999895012}, {0.5, 0.997888221}, {1.0, 0.993427658}, {2.0, 0.983046956}})
        CHECK(rule_of_a_third_ratio(ratio) == Approx(frequency * frequency).epsilon(1e-8));
    CHECK(has(result.findings, "heavy_spring"));
}

TEST_CASE("budget by hand: k = m ω², u²(k)/k² = u²(m)/m² + 4 u²(f)/f²") {
    Loading only = loading(5.0, 0.02, 0.0, 1e-3);
    only.natural_frequency.degrees_of_freedom = 8.0;
    only.frequency_repeatability = 0.75;
    only.repeatability_degrees_of_freedom = 8.0;
    CommonInfluences clock;
    clock.time_base_relative = 5e-4;
    const PropertyResult result = derive_properties({only}, with_mass(2.0, 0.002), false, 0.95, clock);
    const Estimate& stiffness = result.quantities.at(Quantity::stiffness);
    const double relative = std::sqrt(1e-3 * 1e-3 + 4.0 * 1e-6 + 4.0 * 2.5e-7);
    CHECK(stiffness.standard_uncertainty / stiffness.value == Approx(relative).epsilon(1e-9));
    // Welch–Satterthwaite: only the frequency has finite degrees of freedom.
    CHECK(stiffness.degrees_of_freedom == Approx(8.0 * std::pow(relative / 2e-3, 4)).epsilon(1e-8));

    double shares = 0.0;
    std::vector<std::string> sources;
    for (const BudgetLine& line : result.budget)
        if (line.quantity == Quantity::stiffness) {
            shares += line.share;
            sources.push_back(line.source);
        }
    CHECK(shares == Approx(1.0).epsilon(1e-12));
    CHECK(sources == std::vector<std::string>{"noise in the record: natural frequency",
                                              "repeatability: natural frequency", "mass", "time base"});
    CHECK(result.budget[1].share == Approx(3.0 * result.budget[0].share).epsilon(1e-12));
    CHECK(result.budget[2].sensitivity == Approx(stiffness.value / 2.0).epsilon(1e-9));
}

TEST_CASE("Monte Carlo after JCGM 101 agrees with the law of propagation") {
    // Added-mass line with uncertain masses and frequencies of few degrees of freedom. 200,000 draws: the
    // standard deviation is known to 0.16 %, ends of the interval to about 1 % of its half-width; second
    // order adds 0.3 %.
    const double stiffness = 900.0, mass = 1.5;
    const auto frequency = [&](double added) { return std::sqrt(stiffness / (mass + added)) / (2.0 * pi); };
    std::vector<Loading> loadings{loading(frequency(0.0), 0.02, 0.0, 1e-3),
                                  loading(frequency(0.5), 0.018, 0.5, 1e-3),
                                  loading(frequency(1.0), 0.016, 1.0, 1e-3)};
    loadings[1].added_mass.standard_uncertainty = 0.002;
    loadings[2].added_mass.standard_uncertainty = 0.003;
    const PropertyResult result = derive_properties(loadings, {}, false, 0.95);

    Draws draws(101);
    std::vector<double> drawn;
    for (int trial = 0; trial < 200000; ++trial) {
        std::vector<Loading> each = loadings;
        for (Loading& one : each) {
            one.added_mass.value += one.added_mass.standard_uncertainty * draws.normal();
            one.natural_frequency.value += one.natural_frequency.standard_uncertainty * draws.normal();
        }
        // The same weighted line, worked here with its own code.
        double w_sum = 0, x_mean = 0, y_mean = 0, xx = 0, xy = 0;
        for (std::size_t i = 0; i < 3; ++i) {
            const double f0 = loadings[i].natural_frequency.value, w = std::pow(f0, 4);
            const double y = 1.0 / std::pow(2.0 * pi * each[i].natural_frequency.value, 2);
            w_sum += w, x_mean += w * each[i].added_mass.value, y_mean += w * y;
        }
        x_mean /= w_sum, y_mean /= w_sum;
        for (std::size_t i = 0; i < 3; ++i) {
            const double w = std::pow(loadings[i].natural_frequency.value, 4);
            const double x = each[i].added_mass.value - x_mean;
            xx += w * x * x;
            xy += w * x * (1.0 / std::pow(2.0 * pi * each[i].natural_frequency.value, 2) - y_mean);
        }
        drawn.push_back(xx / xy);
    }
    std::ranges::sort(drawn);
    double mean = 0.0, squares = 0.0;
    for (const double value : drawn) mean += value / static_cast<double>(drawn.size());
    for (const double value : drawn) squares += (value - mean) * (value - mean);
    const Estimate& found = result.quantities.at(Quantity::stiffness);
    CHECK(found.standard_uncertainty ==
          Approx(std::sqrt(squares / static_cast<double>(drawn.size()))).epsilon(0.01));
    const double half = 0.5 * (found.interval.high - found.interval.low);
    CHECK(found.interval.low == Approx(drawn[5000]).margin(0.03 * half));
    CHECK(found.interval.high == Approx(drawn[195000]).margin(0.03 * half));
}

TEST_CASE("a lopsided frequency gives a lopsided stiffness") {
    Loading only = loading(5.0, 0.3, 0.0, 1e-2);
    only.natural_frequency.interval = {4.9, 5.3};
    const PropertyResult result = derive_properties({only}, with_mass(2.0), false, 0.95);
    const Estimate& stiffness = result.quantities.at(Quantity::stiffness);
    CHECK(stiffness.interval.low == Approx(2.0 * std::pow(2.0 * pi * 4.9, 2)).epsilon(1e-6));
    CHECK(stiffness.interval.high == Approx(2.0 * std::pow(2.0 * pi * 5.3, 2)).epsilon(1e-6));
}

TEST_CASE("loadings off the line widen the uncertainty") {
    const std::vector<Loading> loadings{loading(4.0, 0.01), loading(3.6, 0.01, 0.5), loading(3.0, 0.01, 1.0)};
    const PropertyResult result = derive_properties(loadings, {}, false, 0.95);
    CHECK(has(result.findings, "loading_line_scatter"));
    CHECK(result.quantities.at(Quantity::stiffness).degrees_of_freedom < 5.0);
}

TEST_CASE("what cannot be derived is not derived, and what is contradictory is refused") {
    CHECK(derive_properties({}, with_mass(1.0), false, 0.95).quantities.empty());
    CHECK(derive_properties({loading(5.0, 0.1)}, {}, false, 0.95).quantities.empty());
    Article both = with_mass(1.0);
    both.inertia = kilograms(1.0);
    CHECK_THROWS_AS(derive_properties({loading(5.0, 0.1)}, both, false, 0.95), UsageError);
    CHECK_THROWS_AS(derive_properties({loading(5.0, 0.1)}, with_mass(-1.0), false, 0.95), UsageError);
    CHECK_THROWS_AS(derive_properties({loading(5.0, 0.1, 1.0), loading(5.0, 0.1, 1.0)}, {}, false, 0.95),
                    UsageError);
    const PropertyResult rising =
        derive_properties({loading(5.0, 0.1), loading(6.0, 0.1, 1.0)}, {}, false, 0.95);
    CHECK(rising.quantities.empty());
    CHECK(has(rising.findings, "loading_line_unusable"));
}
