// The motion of a drop as one, the slow release that it can be taken for, and which of the two a recording in
// noise shows.

#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <vector>

#include "event/drop_motion.hpp"
#include "event/ramped_release.hpp"
#include "ringwright/event.hpp"
#include "support/simulator.hpp"

using namespace ringwright;
using namespace ringwright::event_search;
using simulator::Generator;
using simulator::Mode;
using simulator::Noise;
using simulator::Simulated;

namespace {

constexpr double pi = std::numbers::pi, standard_gravity = 9.80665;
constexpr double omega = 0.02, gravity = 1.0 / 2500.0;  // rad a step; units a step²
constexpr double sag = gravity / (omega * omega);       // 1 unit

DropNumbers fall_from(double height, double damping_ratio, double down = 1.0) {
    return {5.0, 5.0 + down * (height + sag), 100.0, {omega, damping_ratio}};
}

bool has(const Event& event, std::string_view code) {
    for (const Finding& finding : event.findings)
        if (finding.code == code) return true;
    return false;
}

}  // namespace

TEST_CASE("without damping a mass falls, turns on its spring and rises to where it fell from") {
    // By hand: the fall takes √(2h/g) and ends at √(2gh); about its rest position the mass then swings as
    // −s cos ωt + (v/ω) sin ωt, s the static deflection, and is back at the touch after 2(π − atan(ωv/g))/ω.
    for (const double down : {1.0, -1.0})
        for (const double height : {0.3, 1.0, 4.0}) {
            INFO("height " << height << ", down " << down);
            const DropMotion motion(fall_from(height, 1e-9, down), gravity);
            const double fall = std::sqrt(2.0 * height / gravity), speed = gravity * fall;
            const double contact = 2.0 * (pi - std::atan(omega * speed / gravity)) / omega;
            CHECK(motion.height() == Approx(height));
            CHECK(motion.down() == down);
            const auto flights = motion.flights();
            REQUIRE(flights.size() > 2);
            CHECK(flights[0].begin == 100.0);
            CHECK(flights[0].end == Approx(100.0 + fall));
            // The moment of lift-off is found to a thousandth of a step.
            CHECK(flights[1].begin == Approx(100.0 + fall + contact).margin(2e-3));
            CHECK(flights[1].end - flights[1].begin == Approx(2.0 * fall).margin(5e-3));
            CHECK(motion.value_at(50.0) == 5.0);
            CHECK(motion.value_at(100.0 + fall) == Approx(5.0 + down * height));
            const double top = 0.5 * (flights[1].begin + flights[1].end);
            CHECK(motion.value_at(top) == Approx(5.0).margin(1e-3 * speed));
            const double deepest = sag + std::hypot(sag, speed / omega);
            CHECK(motion.value_at(100.0 + fall + 0.5 * contact) == Approx(5.0 + down * (height + deepest)));
        }
}

TEST_CASE("a mass that is held in contact is let go and does not fall") {
    // From half the static deflection above rest: x = x₀ cos ωt, never above the touch.
    DropNumbers numbers = fall_from(1.0, 1e-9);
    numbers.rest = numbers.hold + 0.5 * sag;
    const DropMotion motion(numbers, gravity);
    CHECK(motion.height() == Approx(-0.5 * sag));
    CHECK(motion.flights().empty());
    CHECK(motion.contact_since() == 100.0);
    for (const double t : {10.0, 137.0, 300.0})
        CHECK(motion.value_at(100.0 + t) == Approx(numbers.rest - 0.5 * sag * std::cos(omega * t)));
}

TEST_CASE("critically damped, a mass does not bounce") {
    const DropMotion motion(fall_from(3.0, 1.0), gravity);
    CHECK(motion.flights().size() == 1);
    CHECK(motion.contact_since() == Approx(100.0 + std::sqrt(6.0 / gravity)));
}

TEST_CASE("the motion of a drop is that of step-by-step integration") {
    // simulator::drop integrates by Runge and Kutta at 2,000 steps a cycle or more, and finds each touch. What
    // remains is the lift-off, within a step of which the push bends: of second order, (2π/2,000)² = 1e-5 of
    // the swing.
    for (const double damping : {0.02, 0.15, 0.4})
        for (const double height : {0.01, 0.04, 0.12}) {
            INFO("damping ratio " << damping << ", height " << height);
            constexpr double rate = 1000.0, release_s = 0.5, hz = 6.0;
            Generator generator(1);
            const Simulated truth = simulator::drop({hz, damping}, rate, 3.0, release_s, height,
                                                    MeasuredQuantity::displacement, Noise{300.0}, generator);
            const double w = 2.0 * pi * hz, g = standard_gravity / (rate * rate);
            const DropMotion motion(
                {-height, standard_gravity / (w * w), release_s * rate, {w / rate, damping}}, g);
            double worst = 0.0;
            for (std::size_t k = 0; k < truth.recording.size(); ++k)
                worst = std::max(
                    worst, std::abs(truth.recording.samples[k] - motion.value_at(static_cast<double>(k))));
            CHECK(worst < 1e-5 * (height + 2.0 * standard_gravity / (w * w)));
        }
}

TEST_CASE("the numbers of a drop are found again in noise") {
    // 200 points, noise of 3 % of the height. Tolerances: five times the standard deviations that the
    // derivatives at the truth give (0.3 % of the frequency, 0.003 of the damping ratio, 0.4 steps).
    const DropNumbers truth{0.0, 3.0 * sag, 260.0, {omega, 0.12}};
    const DropMotion motion(truth, gravity);
    Generator generator(7);
    std::vector<double> points;
    for (int k = 0; k < 1500; ++k)
        points.push_back(motion.value_at(static_cast<double>(k)) + 0.06 * generator.normal());
    const DropNumbers about{0.1, 2.8 * sag, 0.0, {0.93 * omega, 0.2}};
    const auto fit = fit_drop(points, {about, 50.0, 400.0}, gravity);
    REQUIRE(fit);
    const DropNumbers& found = fit->motion.numbers();
    CHECK(found.shape.undamped_angular_frequency == Approx(omega).epsilon(0.015));
    CHECK(found.shape.damping_ratio == Approx(0.12).margin(0.015));
    CHECK(found.release == Approx(260.0).margin(2.0));
    CHECK(fit->motion.flights().size() == motion.flights().size());
    CHECK(fit->residual_rms() == Approx(0.06).epsilon(0.1));  // 1,500 values: 1.8 %
}

TEST_CASE("a release over a time is the mean of sudden ones over that time") {
    const DecayShape shape{0.05, 0.1};
    const double damped = shape.damped_angular_frequency(), s = shape.decay_rate();
    const auto sudden = [&](double t) {  // 1 before, then the free decay from rest
        return t < 0.0 ? 1.0 : std::exp(-s * t) * (std::cos(damped * t) + s / damped * std::sin(damped * t));
    };
    const double ramp = 40.0;
    const RampedRelease release({2.0, -1.0, 30.0, ramp, shape});
    for (const double t : {10.0, 45.0, 69.0, 90.0, 200.0}) {
        constexpr int parts = 4000;
        double mean = 0.0;
        for (int i = 0; i < parts; ++i) mean += sudden(t - 30.0 - ramp * (i + 0.5) / parts) / parts;
        CHECK(release.value_at(t) == Approx(-1.0 + 3.0 * mean).margin(1e-5));
    }
}

TEST_CASE("a fall that noise hides is told by the bounces and the swing after it") {
    // 26 dB of the height of the fall: noise of 2 mm on 40 mm. Of 20 each one is a drop and begins within a
    // quarter of a cycle of the last touch; flights shorter than the noise shows may be missed. Seeds 600 to
    // 619.
    for (std::uint64_t seed = 600; seed < 620; ++seed) {
        INFO("seed " << seed);
        Generator generator(seed);
        const double rate = generator.uniform() < 0.5 ? 250.0 : 900.0;
        Simulated truth = simulator::drop({6.0, 0.15}, rate, 3.0, 0.5, 0.04, MeasuredQuantity::displacement,
                                          Noise{300.0}, generator);
        simulator::add_noise(truth.recording.samples, 0.04, rate, Noise{26.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        const Event& event = search.events[0];
        CHECK(event.kind == TestKind::drop);
        CHECK(event.hold_seen);
        const double off = static_cast<double>(event.begin) - static_cast<double>(truth.begins[0]);
        CHECK(std::abs(off) < 0.25 * truth.samples_per_cycle);
    }
}

TEST_CASE("a release that takes up to half a cycle is no fall") {
    // Pulls of 1.2 to 8 static deflections, 18 to 36 dB: the hand lets go about as fast as a mass falls. Of
    // 60 each a pluck or, by chance, one not: 1 of 796 was taken for a drop where this was tuned. Seeds 700
    // to 759.
    int drops = 0, undecided = 0;
    for (std::uint64_t seed = 700; seed < 760; ++seed) {
        Generator generator(seed);
        const double hz = 3.0 + 17.0 * generator.uniform(), damping = 0.02 + 0.25 * generator.uniform();
        const double w = 2.0 * pi * hz, rate = hz * (40.0 + 200.0 * generator.uniform());
        const double ramp = 0.5 * generator.uniform() / hz, pull = 1.2 + 6.8 * generator.uniform();
        const double height = pull * standard_gravity / (w * w);
        const RampedRelease motion(
            {height, 0.0, 0.5 * rate, std::max(0.5, ramp * rate), {w / rate, damping}});
        Recording recording;
        recording.quantity = MeasuredQuantity::displacement;
        recording.scaled = true;
        recording.clock.sample_rate_hz = rate;
        for (double t = 0.0; t < 3.0 * rate; t += 1.0) recording.samples.push_back(motion.value_at(t));
        simulator::add_noise(recording.samples, height, rate, Noise{18.0 + 18.0 * generator.uniform()},
                             generator);
        for (const Event& event : find_events(recording).events) {
            drops += event.kind == TestKind::drop ? 1 : 0;
            undecided += has(event, "drop_or_pluck") ? 1 : 0;
        }
    }
    CHECK(drops <= 1);
    CHECK(undecided <= 4);  // 15 of 796
}
