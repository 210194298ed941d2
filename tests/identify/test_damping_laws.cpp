// Damping that is not viscous: the integrator against exact and independent solutions, the choice of the law,
// its coefficients.
#include <Eigen/Core>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <string>
#include <tuple>

#include "identify/damping_law.hpp"
#include "ringwright/damping_relations.hpp"
#include "ringwright/identify.hpp"
#include "support/simulated_law.hpp"

using namespace ringwright;
using identify::DampingLaw;
using identify::LawMotion;
using identify::LawParameter;
using identify::Measured;
using identify::move;
using simulated::Bench;
using simulated::Deviates;
using simulated::Law;

namespace {

constexpr double pi = std::numbers::pi;

// Under friction alone each half swing is a cosine about ±f/W² (Den Hartog 1931; textbook).
double friction_alone(double start, double friction, double t) {
    double amplitude = start - friction, centre = friction, sign = 1.0;
    if (start <= friction) return start;
    while (t > pi) {
        const double turn = centre - sign * amplitude;
        t -= pi;
        if (std::abs(turn) <= friction) return turn;
        sign = -sign;
        centre = sign * friction;
        amplitude = std::abs(turn - centre);
    }
    return centre + sign * amplitude * std::cos(t);
}

std::vector<double> instants(double last, int count) {
    std::vector<double> times;
    for (int i = 0; i < count; ++i) times.push_back(last * i / (count - 1));
    return times;
}

DampingLaw released(double displacement) {
    DampingLaw law;
    law[LawParameter::displacement] = displacement;
    return law;
}

EventIdentification identify_law(const Law& law, const Bench& bench, std::uint64_t seed,
                                 const IdentifyOptions& options = {}) {
    Deviates deviates(seed);
    const simulated::Sample sample = simulated::draw(law, bench, deviates);
    return identify_event(sample.recording, sample.event, options);
}

// Four standard uncertainties: one false alarm in 16,000 for each figure checked.
void check_near(const Quantities& quantities, Quantity quantity, double truth) {
    REQUIRE(quantities.contains(quantity));
    const Estimate& estimate = quantities.at(quantity);
    INFO(key_of(quantity) << " " << estimate.value << " ± " << estimate.standard_uncertainty);
    CHECK(std::abs(estimate.value - truth) < 4.0 * estimate.standard_uncertainty);
    CHECK(std::abs(estimate.value - truth) < 0.1 * std::abs(truth));
}

IdentifyOptions curve_fit_only() {
    IdentifyOptions options;
    options.replicates = 0;
    return options;
}

// A viscous release, as the search finds it.
MethodResult fit_through_search(const simulated::Truth& truth, std::uint64_t seed) {
    Deviates deviates(seed);
    const simulated::Sample sample = simulated::draw(truth, deviates);
    const EventSearch search = find_events(sample.recording);
    REQUIRE(search.events.size() == 1);
    MethodResult fit = identify_event(sample.recording, search.events.front(), curve_fit_only()).curve_fit;
    REQUIRE(fit.status == MethodStatus::ok);
    return fit;
}

}  // namespace

TEST_CASE("friction alone: the exact solution, swing by swing, until it sticks") {
    DampingLaw law = released(1.0);
    law[LawParameter::friction] = 0.07;
    const std::vector<double> times = instants(40.0, 801);
    const LawMotion motion = move(law, Measured::displacement, times, {});
    REQUIRE(motion.valid);
    // Integrated to 1e-9 a step, some hundred steps.
    for (std::size_t i = 0; i < times.size(); ++i)
        REQUIRE(motion.value(static_cast<Eigen::Index>(i)) ==
                Approx(friction_alone(1.0, 0.07, times[i])).margin(1e-7));
    CHECK(motion.sticks);
    CHECK(motion.reversals.size() == half_cycles_to_rest(1.0, 0.07, 1.0));
    CHECK(motion.stick_time == Approx(pi * static_cast<double>(motion.reversals.size())).margin(1e-6));
}

TEST_CASE("a law too stiff to be a swing is not followed to the end") {
    // The explicit method is stable for steps below about 3.3 over the damping (Hairer, Norsett & Wanner,
    // from memory): 60 units of time at 1e5 would be 4 million. ζ = 50, at the edge of what is fitted, is
    // followed.
    DampingLaw law = released(1.0);
    law[LawParameter::velocity] = 0.0;
    for (const auto& [damping, valid] : {std::pair{50.0, true}, std::pair{1e5, false}}) {
        law[LawParameter::damping] = damping;
        CHECK(move(law, Measured::displacement, instants(60.0, 50), {}).valid == valid);
    }
}

TEST_CASE("friction takes 4F/k from the amplitude in a cycle") {
    // Den Hartog; Thomson; from memory.
    DampingLaw law = released(1.0);
    law[LawParameter::friction] = 0.02;
    const LawMotion motion = move(law, Measured::displacement, {2.0 * pi, 4.0 * pi, 6.0 * pi}, {});
    for (int cycle = 1; cycle <= 3; ++cycle)
        CHECK(motion.value(cycle - 1) ==
              Approx(1.0 - cycle * friction_loss_per_cycle(0.02, 1.0)).margin(1e-7));
}

TEST_CASE("the integrator agrees with small fixed steps for every term, whatever is measured") {
    Law law{1.0, 1.0, 0.06, 0.14, 0.01, 0.05, 0.2, 1.0};
    DampingLaw same = released(1.0);
    same[LawParameter::damping] = 0.05;     // c₊ + c₋ over 4
    same[LawParameter::asymmetry] = -0.02;  // c₊ − c₋ over 4
    same[LawParameter::friction] = 0.01;
    same[LawParameter::quadratic] = 0.05;
    same[LawParameter::cubic] = 0.2;
    const simulated::Motion steps = simulated::integrate(law, 20.0, 600, 50);
    const std::vector<double> times = instants(599.0 / 20.0, 600);
    const std::vector<double>* channels[] = {&steps.displacement, &steps.velocity, &steps.acceleration};
    for (int order = 0; order < 3; ++order) {
        const LawMotion motion = move(same, static_cast<Measured>(order), times, {});
        REQUIRE(motion.valid);
        for (std::size_t i = 0; i < times.size(); ++i) {
            // Runge–Kutta of step 1e-3: 1e-9. At a reversal the acceleration jumps, and either side is right.
            const bool at_reversal = std::ranges::any_of(
                motion.reversals, [&](double t) { return std::abs(t - times[i]) < 1e-6; });
            if (order == 2 && at_reversal) continue;
            REQUIRE(motion.value(static_cast<Eigen::Index>(i)) == Approx((*channels[order])[i]).margin(1e-6));
        }
    }
}

TEST_CASE("derivatives along the motion are those of the motion") {
    DampingLaw law = released(0.9);
    law[LawParameter::velocity] = -0.1;
    law[LawParameter::damping] = 0.05;
    law[LawParameter::asymmetry] = -0.02;
    law[LawParameter::friction] = 0.015;
    law[LawParameter::quadratic] = 0.05;
    law[LawParameter::cubic] = 0.2;
    std::vector<LawParameter> all;
    for (std::size_t i = 0; i < identify::law_parameter_count; ++i)
        all.push_back(static_cast<LawParameter>(i));
    const std::vector<double> times = instants(25.0, 97);
    for (int order = 0; order < 2; ++order) {  // acceleration: the same columns, and jumps
        const auto measured = static_cast<Measured>(order);
        const LawMotion motion = move(law, measured, times, all, 1e-11);
        constexpr double step = 1e-5;
        for (const LawParameter p : all) {
            DampingLaw up = law, down = law;
            up[p] += step;
            down[p] -= step;
            const Eigen::VectorXd difference =
                (move(up, measured, times, {}, 1e-11).value - move(down, measured, times, {}, 1e-11).value) /
                (2.0 * step);
            const Eigen::VectorXd column = motion.derivative.col(static_cast<Eigen::Index>(p));
            INFO("parameter " << static_cast<int>(p) << ", order " << order);
            // Second differences of the motion over the step, and its rounding over the step: 1e-5 and 1e-6.
            CHECK((column - difference).cwiseAbs().maxCoeff() < 2e-4 * (1.0 + column.cwiseAbs().maxCoeff()));
        }
    }
}

TEST_CASE("friction beside viscous damping: named, and its force") {
    Law law;
    law.friction = 6.0;
    for (const double release : {0.015, 0.040})
        for (const auto quantity : {MeasuredQuantity::displacement, MeasuredQuantity::acceleration}) {
            law.release = release;
            Bench bench;
            bench.quantity = quantity;
            const EventIdentification found = identify_law(law, bench, 17, curve_fit_only());
            INFO("released at " << release);
            REQUIRE(found.curve_fit.status == MethodStatus::ok);
            CHECK(found.curve_fit.model == "viscous+friction");
            check_near(found.curve_fit.per_mass, Quantity::friction_force, law.friction / law.mass);
            check_near(found.curve_fit.quantities, Quantity::natural_frequency,
                       law.angular_frequency() / (2.0 * pi));
        }
}

TEST_CASE("compression and rebound apart") {
    Law law;
    law.compression = 60.0;
    law.rebound = 180.0;
    for (const auto quantity :
         {MeasuredQuantity::displacement, MeasuredQuantity::velocity, MeasuredQuantity::acceleration}) {
        Bench bench;
        bench.quantity = quantity;
        const EventIdentification found = identify_law(law, bench, 23, curve_fit_only());
        REQUIRE(found.curve_fit.status == MethodStatus::ok);
        CHECK(found.curve_fit.model == "two-way");
        check_near(found.curve_fit.per_mass, Quantity::compression_damping, law.compression / law.mass);
        check_near(found.curve_fit.per_mass, Quantity::rebound_damping, law.rebound / law.mass);
    }
}

TEST_CASE("quadratic damping, hardening, softening") {
    Law quadratic;
    quadratic.compression = quadratic.rebound = 20.0;
    quadratic.quadratic = 60.0;
    const EventIdentification orifice = identify_law(quadratic, {}, 31, curve_fit_only());
    CHECK(orifice.curve_fit.model == "viscous+quadratic");
    check_near(orifice.curve_fit.per_mass, Quantity::quadratic_damping, quadratic.quadratic / quadratic.mass);
    for (const double cubic : {3e6, -2e6}) {
        Law law;
        law.compression = law.rebound = 20.0;
        law.cubic = cubic;
        const EventIdentification found = identify_law(law, {}, 37, curve_fit_only());
        CHECK(found.curve_fit.model == (cubic > 0.0 ? "viscous+hardening" : "viscous+softening"));
        check_near(found.curve_fit.per_mass, Quantity::cubic_stiffness, cubic / law.mass);
        check_near(found.curve_fit.quantities, Quantity::natural_frequency,
                   law.angular_frequency() / (2.0 * pi));
    }
}

TEST_CASE("the damping ratio is the equivalent viscous one at the amplitude asked for") {
    // ζ = c/(2√(km)) + 2F/(πkX) + 4 c₂X/(3πm) (Jacobsen 1930; Den Hartog: from memory).
    Law law;
    law.friction = 6.0;
    IdentifyOptions options = curve_fit_only();
    for (const double amplitude : {0.005, 0.020}) {
        options.at_amplitude = amplitude;
        const EventIdentification found = identify_law(law, {}, 41, options);
        CHECK(found.curve_fit.at_amplitude == amplitude);
        check_near(found.curve_fit.quantities, Quantity::damping_ratio,
                   law.compression / (2.0 * std::sqrt(law.stiffness * law.mass)) +
                       2.0 * law.friction / (pi * law.stiffness * amplitude));
    }
    // The same of an acceleration, asked for as a displacement.
    Bench bench;
    bench.quantity = MeasuredQuantity::acceleration;
    options.at_amplitude = 0.010;
    options.amplitude_of = MeasuredQuantity::displacement;
    const EventIdentification found = identify_law(law, bench, 43, options);
    check_near(found.curve_fit.quantities, Quantity::damping_ratio,
               law.compression / (2.0 * std::sqrt(law.stiffness * law.mass)) +
                   2.0 * law.friction / (pi * law.stiffness * 0.010));
}

TEST_CASE("scale, sign and clock do what they must to a law's coefficients") {
    Law law;
    law.compression = 60.0;
    law.rebound = 180.0;
    Deviates deviates(47);
    const simulated::Sample sample = simulated::draw(law, {}, deviates);
    const MethodResult base = identify_event(sample.recording, sample.event, curve_fit_only()).curve_fit;
    simulated::Sample mirrored = sample;
    for (double& y : mirrored.recording.samples) y = -3.0 * y;
    const MethodResult turned =
        identify_event(mirrored.recording, mirrored.event, curve_fit_only()).curve_fit;
    // Mirrored, compression and rebound change places. The search stops at a relative step of 1e-8.
    CHECK(turned.per_mass.at(Quantity::compression_damping).value ==
          Approx(base.per_mass.at(Quantity::rebound_damping).value).epsilon(1e-4));
    CHECK(turned.per_mass.at(Quantity::rebound_damping).value ==
          Approx(base.per_mass.at(Quantity::compression_damping).value).epsilon(1e-4));
    simulated::Sample slowed = sample;
    slowed.recording.clock.sample_rate_hz /= 10.0;
    slowed.event.frequency_guess_hz /= 10.0;
    const MethodResult slow = identify_event(slowed.recording, slowed.event, curve_fit_only()).curve_fit;
    CHECK(slow.per_mass.at(Quantity::rebound_damping).value ==
          Approx(0.1 * base.per_mass.at(Quantity::rebound_damping).value).epsilon(1e-4));
}

TEST_CASE("a viscous decay is called viscous") {
    // At most 5 % are asked for; 60 recordings with at most 9 of them richer would pass a rate of 5 % but for
    // one in a thousand. The full count is in docs/methods/damping-laws.md.
    Deviates deviates(53);
    int richer = 0, answered = 0;
    for (const double ratio : {0.002, 0.05, 0.3, 0.6})
        for (const double decibels : {20.0, 40.0, 60.0})
            for (int repeat = 0; repeat < 5; ++repeat) {
                simulated::Truth truth;
                truth.damping_ratio = ratio;
                truth.signal_to_noise_db = decibels;
                truth.noise_correlation = repeat % 2 == 0 ? 0.0 : 0.95;
                truth.cycles = 12.0;
                const simulated::Sample sample = simulated::draw(truth, deviates);
                const MethodResult fit =
                    identify_event(sample.recording, sample.event, curve_fit_only()).curve_fit;
                if (fit.status != MethodStatus::ok) continue;
                ++answered;
                richer += fit.model != "viscous";
            }
    CHECK(answered > 50);
    CHECK(richer <= 9);
}

TEST_CASE("what slow noise feigns is no law") {
    // Viscous decays in noise of φ = 0.95 that were called friction (ζ = 0.95 and 0.45 in place of 0.3) and
    // two-way with a hardening spring.
    for (const std::uint64_t seed : {700006954u, 700007710u, 700007773u}) {
        CAPTURE(seed);
        simulated::Truth truth;
        truth.damping_ratio = 0.3;
        truth.cycles = 5.0;
        truth.noise_correlation = 0.95;
        truth.held_cycles = 1.0;
        const MethodResult fit = fit_through_search(truth, seed);
        CHECK(fit.model == "viscous");
        const Interval ratio = fit.quantities.at(Quantity::damping_ratio).interval;
        CHECK((ratio.low <= 0.3 && 0.3 <= ratio.high));
    }
}

TEST_CASE("what a coarse recorder rounds off is no law") {
    // Eight bits and noise of a ninth of a step: what decays below half a step stands still, as if it stuck.
    // A law was chosen in one of six such recordings; at most 5 % are asked for, so 2 of 40, and 6 but for
    // one in a hundred.
    int richer = 0, held = 0;
    for (std::uint64_t seed = 91000; seed < 91040; ++seed) {
        simulated::Truth truth;
        truth.damping_ratio = 0.1;
        truth.signal_to_noise_db = 60.0;
        truth.noise_correlation = 0.5;
        truth.cycles = 10.0;
        truth.bits = 8;
        truth.held_cycles = 1.0;
        const MethodResult fit = fit_through_search(truth, seed);
        richer += fit.model != "viscous";
        const Interval ratio = fit.quantities.at(Quantity::damping_ratio).interval;
        held += ratio.low <= truth.damping_ratio && truth.damping_ratio <= ratio.high;
    }
    CHECK(richer <= 5);
    CHECK(held >= 34);  // of 95 %, fewer but for one in two hundred
}

TEST_CASE("a wrong reading of the methods is explained by the law") {
    Law law;
    law.friction = 6.0;
    const EventIdentification found = identify_law(law, {}, 61);
    if (found.agreement.tested && !found.agreement.consistent)
        CHECK(found.agreement.reading.find("friction") != std::string::npos);
    CHECK(std::ranges::any_of(found.findings, [](const Finding& f) { return f.code == "dry_friction"; }));
    CHECK(
        std::ranges::any_of(found.findings, [](const Finding& f) { return f.code == "equivalent_damping"; }));
}

TEST_CASE("a decay found late is read from its start") {
    Law law;
    law.compression = 60.0;
    law.rebound = 180.0;
    Deviates deviates(67);
    simulated::Sample sample = simulated::draw(law, {}, deviates);
    const double period = 2.0 * pi / law.angular_frequency();
    IdentifyOptions options = curve_fit_only();
    options.pictures = true;
    const double release_s = sample.recording.clock.time_of(sample.event.begin);
    sample.event.begin += static_cast<std::size_t>(0.8 * period * sample.recording.clock.sample_rate_hz);
    const EventIdentification found = identify_event(sample.recording, sample.event, options);
    CHECK(found.curve_fit.model == "two-way");
    check_near(found.curve_fit.per_mass, Quantity::rebound_damping, law.rebound / law.mass);
    // The search's last step is a fiftieth of a period.
    CHECK(found.picture.time_s.front() > release_s - 0.02 * period);
    CHECK(found.picture.time_s.front() < release_s + 0.1 * period);
}

TEST_CASE("a decay that shows one amplitude is given no law") {
    // 10 cycles at a damping ratio of 0.002 fall by 12 %: a hardening spring and another frequency fit alike
    // in coloured noise, and the frequency of small swings would be anything.
    Law law;
    law.stiffness = 5.0 * std::pow(2.0 * pi * 5.0, 2.0);
    law.compression = law.rebound = 2.0 * 0.002 * std::sqrt(law.stiffness * law.mass);
    Bench bench;
    bench.rate_hz = 500.0;
    bench.held_s = 0.2;
    bench.length_s = 2.0;
    bench.signal_to_noise_db = 20.0;
    bench.noise_correlation = 0.95;
    for (std::uint64_t seed = 956; seed < 966; ++seed) {  // 961: a hardening spring else
        INFO("seed " << seed);
        const EventIdentification result = identify_law(law, bench, seed, curve_fit_only());
        CHECK(result.curve_fit.model == "viscous");
    }
}

namespace {

Law two_way() {
    Law law;
    law.compression = 60.0;
    law.rebound = 180.0;
    return law;
}

bool has(const Findings& findings, const std::string& code) {
    return std::ranges::any_of(findings, [&](const Finding& f) { return f.code == code; });
}

}  // namespace

TEST_CASE("what stood for a law beside a viscous decay takes nothing from the law") {
    // Without the second mode and the slow exponential that the viscous fit asked for, the compression
    // coefficient is known to 1.0 % (46 dB at 2 kHz) and, from the acceleration at 40 dB, to 2.6 %:
    // Cramér–Rao bounds from derivatives of an integration by SciPy's DOP853. Three tenths of it for the
    // noise model, which is estimated, and for the first samples, which noise hides.
    const Law law = two_way();
    for (const auto& [quantity, decibels, bound] : {std::tuple{MeasuredQuantity::displacement, 46.0, 0.0095},
                                                    std::tuple{MeasuredQuantity::acceleration, 40.0, 0.0258}})
        for (const std::uint64_t seed : {2, 4}) {
            Bench bench;
            bench.rate_hz = 2000.0;
            bench.signal_to_noise_db = decibels;
            bench.quantity = quantity;
            const EventIdentification found = identify_law(law, bench, seed, curve_fit_only());
            INFO("at " << decibels << " dB, seed " << seed);
            REQUIRE(found.curve_fit.model == "two-way");
            check_near(found.curve_fit.per_mass, Quantity::compression_damping, law.compression / law.mass);
            const Estimate& c = found.curve_fit.per_mass.at(Quantity::compression_damping);
            CHECK(c.standard_uncertainty < 1.3 * bound * law.compression / law.mass);
            CHECK_FALSE(has(found.findings, "second_mode"));
            CHECK_FALSE(has(found.findings, "slow_exponential"));
        }
}

TEST_CASE("the plateau before a release is no part of a law") {
    // A swing that turns near the plateau's last samples fits them within noise of 34 dB: up to a tenth of a
    // period was taken, with a compression coefficient up to a third too small.
    const Law law = two_way();
    Bench bench;
    bench.signal_to_noise_db = 34.0;
    bench.noise_correlation = 0.8;
    IdentifyOptions options = curve_fit_only();
    options.pictures = true;
    for (const std::uint64_t seed : {1, 2, 3, 5}) {
        Deviates deviates(seed);
        simulated::Sample sample = simulated::draw(law, bench, deviates);
        const double release_s = sample.recording.clock.time_of(sample.event.begin);
        const double period = 2.0 * pi / law.angular_frequency();
        sample.event.begin += 4;  // where a search sees it
        const EventIdentification found = identify_event(sample.recording, sample.event, options);
        INFO("seed " << seed);
        REQUIRE(found.curve_fit.model == "two-way");
        CHECK(found.picture.time_s.front() > release_s);
        CHECK(found.picture.time_s.front() < release_s + 0.1 * period);
    }
}

TEST_CASE("a strongly softening spring whose viscous fit is far off") {
    // From 30 mm, where the spring gives 22 % less than a linear one, 4 ms behind the release.
    Law law;
    law.compression = law.rebound = 20.0;
    law.cubic = -2e6;
    Bench bench;
    bench.rate_hz = 2000.0;
    bench.signal_to_noise_db = 48.0;
    bench.length_s = 3.5;
    for (const std::uint64_t seed : {1, 12}) {
        Deviates deviates(seed);
        simulated::Sample sample = simulated::draw(law, bench, deviates);
        sample.event.begin += 9;
        const EventIdentification found = identify_event(sample.recording, sample.event, curve_fit_only());
        INFO("seed " << seed);
        REQUIRE(found.curve_fit.model == "viscous+softening");
        check_near(found.curve_fit.per_mass, Quantity::cubic_stiffness, law.cubic / law.mass);
        check_near(found.curve_fit.quantities, Quantity::natural_frequency,
                   law.angular_frequency() / (2.0 * pi));
    }
}

TEST_CASE("an event starts where its law does") {
    const Law law = two_way();
    Deviates deviates(67);
    simulated::Sample sample = simulated::draw(law, {}, deviates);
    const double release_s = sample.recording.clock.time_of(sample.event.begin);
    const double period = 2.0 * pi / law.angular_frequency();
    sample.event.begin += static_cast<std::size_t>(0.8 * period * sample.recording.clock.sample_rate_hz);
    const EventIdentification found = identify_event(sample.recording, sample.event, curve_fit_only());
    CHECK(found.start_s > release_s);
    CHECK(found.start_s < release_s + 0.1 * period);
}

// Little noise and few swings: a mode 1.6 times as high, with a damping of its own, explains what compression
// and rebound apart leave of a viscous fit. Seeds 470 to 479; four standard uncertainties of each figure.
TEST_CASE("a mode between the first and its double stands for a law where the decay is broad") {
    Law law;
    law.compression = 60.0, law.rebound = 180.0;
    Bench bench;
    bench.rate_hz = 223.0, bench.signal_to_noise_db = 57.0;
    for (std::uint64_t seed = 470; seed < 480; ++seed) {
        INFO("seed " << seed);
        const EventIdentification result = identify_law(law, bench, seed, curve_fit_only());
        CHECK(result.curve_fit.model == "two-way");
        check_near(result.curve_fit.per_mass, Quantity::rebound_damping, 36.0);
    }
}
