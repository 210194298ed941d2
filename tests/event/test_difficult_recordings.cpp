// The search where it is hard: noise 20 dB below the amplitude, white and coloured, second hits, and what
// must be refused. Truth from the simulator; seeds are written at each case.

#include <catch2/catch.hpp>

#include "ringwright/event.hpp"
#include "support/simulated_law.hpp"
#include "support/simulator.hpp"

using namespace ringwright;
using simulator::Generator;
using simulator::Mode;
using simulator::Noise;
using simulator::Simulated;

namespace {

constexpr double rate_hz = 250.0;  // 50 samples a cycle of the 5 Hz mode

/// Seven time constants of the slow term, between 4 and 40 cycles.
double record_s(const Mode& mode) {
    const double w = 2.0 * std::numbers::pi * mode.frequency_hz, z = mode.damping_ratio;
    const double slow = z < 1.0 ? z * w : w / (z + std::sqrt(z * z - 1.0));
    return std::min(std::max(7.0 / slow, 4.0 / mode.frequency_hz), 40.0 / mode.frequency_hz);
}

double begin_error_cycles(const Simulated& truth, const Event& event, std::size_t which = 0) {
    return (static_cast<double>(event.begin) - static_cast<double>(truth.begins[which])) /
           truth.samples_per_cycle;
}

bool has_finding(const Event& event, const std::string& code) {
    return std::any_of(event.findings.begin(), event.findings.end(),
                       [&](const Finding& finding) { return finding.code == code; });
}

/// 5 kg on 8000 N/m with 10 N·s/m and 6 N of dry friction, held at `pull_m` and let go after 0.366 s; the
/// mass sticks where the spring no longer overcomes the friction (begins[1]). Each half cycle is a free decay
/// about ±F/k (J. P. Den Hartog, Mechanical Vibrations, 4th ed., section 8.5, where c = 0).
Simulated friction_release(double pull_m, double rate, Generator& generator) {
    const double w = std::sqrt(8000.0 / 5.0), z = 10.0 / (2.0 * 5.0 * w), shift = 6.0 / 8000.0;
    const Mode mode{w / (2.0 * std::numbers::pi), z};
    const double half_s = std::numbers::pi / (w * std::sqrt(1.0 - z * z)), release_s = 0.366;
    std::vector<double> samples(static_cast<std::size_t>(3.9 * rate));
    double x0 = pull_m, since = release_s;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double t = static_cast<double>(i) / rate;
        const auto rest = [&] { return std::copysign(shift, x0); };
        for (; std::abs(x0) > shift && t > since + half_s; since += half_s)
            x0 = rest() + simulator::free_decay(mode, x0 - rest(), 0.0, half_s).x;
        const bool moves = t > since && std::abs(x0) > shift;
        samples[i] = moves ? rest() + simulator::free_decay(mode, x0 - rest(), 0.0, t - since).x : x0;
    }
    simulator::add_noise(samples, pull_m, rate, Noise{43.5}, generator);
    Simulated truth = simulator::with_samples(std::move(samples), rate, MeasuredQuantity::displacement);
    truth.begins = {static_cast<std::size_t>(std::ceil(release_s * rate)),
                    static_cast<std::size_t>(std::ceil(since * rate))};
    truth.samples_per_cycle = rate / mode.frequency_hz;
    return truth;
}

/// Takes the samples from `from_s` for `gap_s` out of a recording of uniform clock.
void stop_clock(Recording& recording, double from_s, double gap_s) {
    std::vector<double> samples;
    for (std::size_t i = 0; i < recording.samples.size(); ++i) {
        const double t = static_cast<double>(i) / recording.clock.sample_rate_hz;
        if (t >= from_s && t < from_s + gap_s) continue;
        samples.push_back(recording.samples[i]);
        recording.clock.times_s.push_back(t);
    }
    recording.samples = std::move(samples);
}

}  // namespace

TEST_CASE("noise of a tenth of the amplitude neither hides nor splits a running decay") {
    for (const double damping : {0.002, 0.03, 0.1, 0.3, 0.7, 1.0, 1.5}) {
        for (const double phi : {0.0, 0.9}) {
            for (const std::uint64_t seed : {301U, 302U}) {
                INFO("damping ratio " << damping << ", phi " << phi << ", seed " << seed);
                Generator generator(seed);
                const Mode mode{5.0, damping};
                const auto truth =
                    simulator::running_decay(mode, rate_hz, record_s(mode), 0.3, Noise{20.0, phi}, generator);
                const EventSearch search = find_events(truth.recording);
                REQUIRE(search.events.size() == 1);
                CHECK(search.events[0].begin == 0);
            }
        }
    }
}

TEST_CASE("noise of a tenth of the amplitude neither hides nor splits a release") {
    for (const double damping : {0.002, 0.03, 0.1, 0.3, 0.7, 1.0}) {
        for (const double phi : {0.0, 0.9}) {
            INFO("damping ratio " << damping << ", phi " << phi);
            Generator generator(311);
            const Mode mode{5.0, damping};
            const simulator::Pull pull{1.0, 1.5, 0.8, record_s(mode), 0.002, 1};
            const auto truth = simulator::plucks(mode, rate_hz, pull, MeasuredQuantity::displacement,
                                                 Noise{20.0, phi}, generator);
            const EventSearch search = find_events(truth.recording);
            REQUIRE(search.events.size() == 1);
            // Plateau and decay part by one standard deviation after 7 % of a cycle, by three after 13 %;
            // coloured noise of 20 samples' memory hides twice that.
            CHECK(begin_error_cycles(truth, search.events[0]) > (phi > 0.0 ? -0.3 : -0.15));
            CHECK(begin_error_cycles(truth, search.events[0]) < 0.07);
        }
    }
}

TEST_CASE("a release that hardly falls in the record is one, if the record begins before it") {
    // 3 cycles at a damping ratio of 0.002 fall by 4 %, noise is 10 %; what is steady rings before as well.
    for (const double phi : {0.0, 0.8})
        for (const std::uint64_t seed : {371U, 372U, 373U, 374U, 375U}) {
            INFO("phi " << phi << ", seed " << seed);
            Generator generator(seed);
            const auto truth = simulator::plucks({5.0, 0.002}, rate_hz, {0.0, 0.0, 0.2, 0.6},
                                                 MeasuredQuantity::displacement, Noise{20.0, phi}, generator);
            CHECK(find_events(truth.recording).events.size() == 1);
            auto steady =
                simulator::running_decay({5.0, 0.0}, rate_hz, 0.8, 0.3, Noise{20.0, phi}, generator);
            CHECK(find_events(steady.recording).events.empty());
        }
}

TEST_CASE("three releases in noise of a tenth of the amplitude are three") {
    for (const double damping : {0.0005, 0.02, 0.3, 0.7}) {
        INFO("damping ratio " << damping);
        Generator generator(321);
        const Mode mode{5.0, damping};
        const simulator::Pull pull{1.0, 1.5, 0.8, record_s(mode), 0.002, 3};
        const auto truth =
            simulator::plucks(mode, rate_hz, pull, MeasuredQuantity::displacement, Noise{20.0}, generator);
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 3);
        for (std::size_t k = 0; k < 3; ++k)  // as above
            CHECK(std::abs(begin_error_cycles(truth, search.events[k], k)) < 0.15);
    }
}

TEST_CASE("of two hits the decay after the second is used, and it is said") {
    for (const auto quantity : {MeasuredQuantity::acceleration, MeasuredQuantity::displacement}) {
        for (const double gap_cycles : {0.8, 1.3, 1.6, 2.3, 3.0}) {
            INFO("gap of " << gap_cycles << " cycles");
            Generator generator(331);
            const auto truth = simulator::taps({20.0, 0.02}, 2000.0, 4.0, {0.5, 0.5 + gap_cycles / 20.0},
                                               0.004, quantity, Noise{50.0}, generator);
            const EventSearch search = find_events(truth.recording);
            REQUIRE(search.events.size() == 1);
            // Displacement leaves the decay as the cube of the time before the end of contact.
            CHECK(std::abs(begin_error_cycles(truth, search.events[0], 1)) < 0.06);
            CHECK(has_finding(search.events[0], "double_hit"));
        }
    }
}

// A second hit of 0.3 to 0.45 of the first, where it adds to the swing or takes from it: the motion is
// linear, so that the sum of two answers is the answer to both. One decay from the first hit on leaves a
// tenth of the amplitude here, and gave damping ratios a quarter off. Seed 332.
TEST_CASE("a weaker second hit is seen where all else goes as foretold") {
    const Noise none{300.0};
    for (const double share : {0.3, 0.45}) {
        for (const double gap_cycles : {1.85, 2.1, 2.3, 2.6}) {
            INFO("second hit of " << share << ", gap of " << gap_cycles << " cycles");
            Generator generator(332);
            const Mode mode{10.0, 0.03};
            const auto quantity = MeasuredQuantity::displacement;
            auto truth = simulator::taps(mode, 2000.0, 4.0, {0.6}, 0.01, quantity, none, generator);
            const auto second = simulator::taps(mode, 2000.0, 4.0, {0.6 + gap_cycles / 10.0}, 0.01, quantity,
                                                none, generator);
            const double height =
                *std::max_element(truth.recording.samples.begin(), truth.recording.samples.end());
            for (std::size_t i = 0; i < truth.recording.samples.size(); ++i)
                truth.recording.samples[i] += share * second.recording.samples[i];
            simulator::add_noise(truth.recording.samples, height, 2000.0, Noise{45.0}, generator);
            const EventSearch search = find_events(truth.recording);
            REQUIRE(search.events.size() == 1);
            // From the end of contact on, with the slack of the double hits above, or up to half a cycle
            // later.
            const double late = begin_error_cycles(second, search.events[0]);
            CHECK(late > -0.06);
            CHECK(late < 0.5);
            CHECK(has_finding(search.events[0], "double_hit"));
        }
    }
}

// A release seen by a clock that stops for part of a cycle up to two: the decay goes on meanwhile, so that
// the place of every later sample is known. Seeds 351 to 358, one for each place of the gap.
TEST_CASE("a decay that goes on across a gap of the clock is one event") {
    for (const double gap_cycles : {0.3, 0.7, 1.2, 1.6, 2.0}) {
        for (std::uint64_t k = 0; k < 8; ++k) {
            const double after_cycles = 9.0 + 1.1 * static_cast<double>(k);
            INFO("gap of " << gap_cycles << " cycles, " << after_cycles << " after the release");
            Generator generator(351 + k);
            const Mode mode{8.0, 0.01};
            auto truth = simulator::plucks(mode, 1000.0, {1.0, 0.6, 0.5, 9.0, 0.0, 1},
                                           MeasuredQuantity::displacement, Noise{40.0, 0.5}, generator);
            stop_clock(truth.recording, static_cast<double>(truth.begins[0]) / 1000.0 + after_cycles / 8.0,
                       gap_cycles / 8.0);
            const EventSearch search = find_events(truth.recording);
            CHECK(search.events.size() == 1);
            CHECK(std::abs(begin_error_cycles(truth, search.events[0])) < 0.06);
            CHECK_FALSE(has_finding(search.events[0], "double_hit"));
        }
    }
}

TEST_CASE("a single tap or release is no double hit") {
    Generator generator(341);
    const auto tap = simulator::taps({20.0, 0.02}, 2000.0, 4.0, {0.5}, 0.006, MeasuredQuantity::acceleration,
                                     Noise{40.0}, generator);
    const auto release =
        simulator::plucks({5.0, 0.02}, rate_hz, {}, MeasuredQuantity::displacement, Noise{40.0}, generator);
    for (const Simulated& truth : {tap, release}) {
        const EventSearch search = find_events(truth.recording);
        REQUIRE(search.events.size() == 1);
        CHECK_FALSE(has_finding(search.events[0], "double_hit"));
    }
}

TEST_CASE("a mass that comes to stick is no second hit") {
    for (const double pull_m : {0.013, 0.015, 0.017, 0.02}) {
        for (const std::uint64_t seed : {346, 347, 348}) {
            INFO("pulled by " << pull_m << " m, seed " << seed);
            Generator generator(seed);
            const Simulated truth = friction_release(pull_m, 500.0, generator);
            const EventSearch search = find_events(truth.recording);
            REQUIRE(search.events.size() == 1);
            // 43.5 dB hide the first 2 % of a cycle after a release. A viscous decay does not fit the first
            // swings of this one, and the search may pass them over, but not the last half cycle.
            CHECK(begin_error_cycles(truth, search.events[0]) > -0.03);
            CHECK(begin_error_cycles(truth, search.events[0], 1) < -0.5);
        }
    }
}

TEST_CASE("a hand's path, a pulse and wandering noise are refused") {
    Generator generator(351);
    Recording recording;
    recording.clock.sample_rate_hz = 500.0;
    recording.samples = simulator::coloured_noise(generator, 4000, 0.01, 0.0);
    const auto add = [&](std::size_t first, std::size_t last, const auto& height) {
        for (std::size_t i = first; i < recording.samples.size(); ++i)
            recording.samples[i] +=
                height(std::min(1.0, static_cast<double>(i - first) / static_cast<double>(last - first)));
    };
    SECTION("a slow pull along half a cosine") {
        add(1000, 2000, [](double u) { return 0.5 - 0.5 * std::cos(std::numbers::pi * u); });
    }
    SECTION("a slow pull at constant speed") {
        add(1000, 2000, [](double u) { return u; });
    }
    SECTION("half a sine of displacement") {
        add(1000, 1100, [](double u) { return std::sin(std::numbers::pi * u); });
    }
    SECTION("first-order noise") {
        const double phi = GENERATE(0.9, 0.95);
        recording.samples = simulator::coloured_noise(generator, 8000, 1.0, phi);
    }
    SECTION("acceleration spikes of a few samples") {
        recording.quantity = MeasuredQuantity::acceleration;
        for (const std::size_t at : {1000U, 2000U, 2700U})
            for (std::size_t i = 0; i < 6; ++i)
                recording.samples[at + i] += std::exp(-0.7 * static_cast<double>(i));
    }
    const EventSearch search = find_events(recording);
    CHECK(search.events.empty());
    CHECK_FALSE(search.reason.empty());
}

// Forty recordings of ten cycles, held four cycles before the release, 5 Hz, white noise 20 dB below the
// amplitude. A slow decay from the first sample stood in for the edge in half of them before the rivals were
// compared. A late start costs information only; an early one bends the answer, hence the uneven band.
TEST_CASE("a heavily damped release in noise does not begin on the plateau before it") {
    for (const double damping : {0.3, 0.7}) {
        int well_found = 0;
        for (std::uint64_t seed = 700; seed < 740; ++seed) {
            Generator generator(seed);
            const Mode mode{5.0, damping};
            const simulator::Pull held{0.0, 0.0, 0.8, 2.0, 0.0, 1};
            const auto truth = simulator::plucks(mode, rate_hz, held, MeasuredQuantity::displacement,
                                                 Noise{20.0}, generator);
            const EventSearch search = find_events(truth.recording);
            if (search.events.size() != 1) continue;
            const double error = begin_error_cycles(truth, search.events[0]);
            well_found += error > -0.15 && error < 0.35;
        }
        INFO("damping ratio " << damping << ", well found " << well_found);
        CHECK(well_found >= 36);
    }
}

// Unit height, white and coloured noise 30 and 45 dB below it. Half a cosine, a path of least jerk (Flash and
// Hogan, J. Neurosci. 5 (1985) 1688), a step of 50 ms as a slipping clamp makes it, and logarithmic creep of
// a mount under load (common practice, no source). Seed 811.
TEST_CASE("a slow lowering, a soft step and creep are no decay") {
    const auto path = [](int kind, double t) {
        const double u = std::clamp((t - 2.0) / 1.6, 0.0, 1.0);
        if (kind == 0) return 0.5 + 0.5 * std::cos(std::numbers::pi * u);
        if (kind == 1) return 1.0 - u * u * u * (10.0 - 15.0 * u + 6.0 * u * u);
        if (kind == 2) return 1.0 - std::clamp((t - 2.0) / 0.05, 0.0, 1.0);
        return 1.0 - 0.29 * std::log1p(std::max(t - 2.0, 0.0) / 0.2);
    };
    for (const double phi : {0.0, 0.6})
        for (const double noise_db : {30.0, 45.0})
            for (int kind = 0; kind < 4; ++kind) {
                INFO("kind " << kind << ", phi " << phi << ", noise " << noise_db << " dB");
                Generator generator(811);
                std::vector<double> samples(2000);
                for (std::size_t i = 0; i < samples.size(); ++i)
                    samples[i] = path(kind, static_cast<double>(i) / rate_hz);
                simulator::add_noise(samples, 1.0, rate_hz, Noise{noise_db, phi}, generator);
                const auto moved =
                    simulator::with_samples(std::move(samples), rate_hz, MeasuredQuantity::displacement);
                CHECK(find_events(moved.recording).events.empty());
            }
}

// A jack that is let down 10 mm in six steps of 0.1 s each within 2.6 s (common practice, no source), the
// article at rest after them; without a look at where it came from a step passed for a release at a damping
// ratio of 0.7 in most of these. Seeds 820 to 831.
TEST_CASE("an article that is let down in steps was not released") {
    for (const double phi : {0.0, 0.6}) {
        for (std::uint64_t seed = 820; seed < 832; ++seed) {
            INFO("seed " << seed << ", phi " << phi);
            Generator generator(seed);
            const double noise_db = 25.0 + 20.0 * generator.uniform();
            constexpr double height_m = 0.01;
            std::vector<double> samples(2500, height_m);
            for (std::size_t i = 0; i < samples.size(); ++i) {
                const double t = static_cast<double>(i) / rate_hz;
                for (int step = 0; step < 6; ++step)
                    samples[i] -= height_m * std::clamp((t - 2.0 - 0.5 * step) / 0.1, 0.0, 1.0) / 6.0;
            }
            simulator::add_noise(samples, height_m, rate_hz, Noise{noise_db, phi}, generator);
            const auto lowered =
                simulator::with_samples(std::move(samples), rate_hz, MeasuredQuantity::displacement);
            const EventSearch search = find_events(lowered.recording);
            CHECK(search.events.empty());
            CHECK_THAT(search.reason, Catch::Contains("from one level to another"));
        }
    }
}

// Pulled within 0.3 s, held for 0.3 s and let go: compression and rebound apart, so that one decay leaves
// more of it than a pulse may. The swing is put together from half swings of two free decays, which is exact
// where the coefficient changes at each reversal (5 kg on 8 kN/m, 60 and 180 N·s/m: ratios 0.15 and 0.45).
TEST_CASE("a pull that is held is no pulse, whatever damper follows") {
    const double f = std::sqrt(8000.0 / 5.0) / (2.0 * std::numbers::pi), rate = 1000.0;
    for (const double phi : {0.0, 0.8}) {
        Generator generator(841);
        std::vector<double> samples(4000);
        double x0 = 1.0, since = 0.6;
        bool falls = true;
        for (std::size_t i = 0; i < samples.size(); ++i) {
            const double t = static_cast<double>(i) / rate;
            const auto half_s = [&] {
                const double z = falls ? 0.45 : 0.15;
                return 0.5 / (f * std::sqrt(1.0 - z * z));
            };
            for (; t > since + half_s(); falls = !falls) {
                const double swing = half_s();
                x0 = simulator::free_decay(Mode{f, falls ? 0.45 : 0.15}, x0, 0.0, swing).x;
                since += swing;
            }
            if (t < 0.6)
                samples[i] = 0.5 - 0.5 * std::cos(std::numbers::pi * std::min(1.0, t / 0.3));
            else
                samples[i] = simulator::free_decay(Mode{f, falls ? 0.45 : 0.15}, x0, 0.0, t - since).x;
        }
        simulator::add_noise(samples, 1.0, rate, Noise{42.0, phi}, generator);
        const auto let_go = simulator::with_samples(std::move(samples), rate, MeasuredQuantity::displacement);
        const EventSearch search = find_events(let_go.recording);
        REQUIRE(search.events.size() == 1);
        // One decay does not follow the first, more damped half swing: the start comes up to a quarter of a
        // cycle late, and the fit of a law goes back from there.
        CHECK(std::abs(static_cast<double>(search.events[0].begin) / rate - 0.6) < 0.25 / f);
    }
}

// An accelerometer and a hard tip: blows of 0.03 and 0.02 cycles, some 15 and 25 times as high as what
// answers them, the second 0.6 cycles after the first. Without a look behind the blows the flank of one
// passed for a decay beyond critical damping. Seeds 860 to 871.
TEST_CASE("a blow far higher than its answer hides no ringing, and its flank is no decay") {
    const Mode mode{4.0, 0.03};
    for (const double contact_cycles : {0.03, 0.02})
        for (std::uint64_t seed = 860; seed < 872; ++seed) {
            INFO("contact of " << contact_cycles << " cycles, seed " << seed);
            Generator generator(seed);
            Simulated truth = simulator::taps(mode, 2000.0, 6.0, {0.4, 0.55}, contact_cycles / 4.0,
                                              MeasuredQuantity::acceleration, Noise{300.0}, generator);
            simulator::add_noise(truth.recording.samples, 1.0, 2000.0, Noise{35.0, 0.6}, generator);
            const EventSearch search = find_events(truth.recording);
            REQUIRE(search.events.size() == 1);
            CHECK(search.events[0].frequency_guess_hz == Approx(4.0).epsilon(0.05));
            CHECK(search.events[0].begin + 4 >= truth.begins[1]);
        }
}

// Eight taps of 4 ms in one recording, the blows thirty times as high as the answers: the blow of the next
// tap is no noise of the decay before it. Seeds 850 to 853.
TEST_CASE("each of a series of hard taps is found") {
    const std::vector<double> times_s{2.0, 9.0, 15.0, 22.0, 30.0, 36.0, 44.0, 51.0};
    for (std::uint64_t seed = 850; seed < 854; ++seed) {
        INFO("seed " << seed);
        Generator generator(seed);
        Simulated truth = simulator::taps({6.0, 0.03}, 2000.0, 58.0, times_s, 0.004,
                                          MeasuredQuantity::acceleration, Noise{300.0}, generator);
        simulator::add_noise(truth.recording.samples, 1.0, 2000.0, Noise{26.0}, generator);
        CHECK(find_events(truth.recording).events.size() == times_s.size());
    }
}

// 60 N·s/m one way and 180 the other on 5 kg and 8 kN/m, as an accelerometer sees it: the swing after the
// first leads into what one decay explains as smoothly as the path of a hand would; the jump of the release
// tells. Seeds 1 to 20.
TEST_CASE("a release on a damper that is softer one way is found in an acceleration") {
    simulated::Law law;
    law.compression = 60.0, law.rebound = 180.0;
    simulated::Bench bench;
    bench.rate_hz = 250.0, bench.signal_to_noise_db = 44.0, bench.quantity = MeasuredQuantity::acceleration;
    for (std::uint64_t seed = 1; seed <= 20; ++seed) {
        INFO("seed " << seed);
        simulated::Deviates deviates(seed);
        CHECK(find_events(simulated::draw(law, bench, deviates).recording).events.size() == 1);
    }
}

// 20 mm in one path of least jerk over 1.1 s or in three of 0.3 s with pauses of 0.7 s, and from their end on
// creep of a twentieth of it times ln(1 + t/0.3 s) (common practice, no source). Seeds 880 to 889.
TEST_CASE("what is lowered and creeps on, or is lowered in steps, was not released") {
    for (const int steps : {1, 3})
        for (std::uint64_t seed = 880; seed < 890; ++seed) {
            INFO(steps << " steps, seed " << seed);
            Generator generator(seed);
            const double takes = steps == 1 ? 1.1 : 0.3, pause = 0.7;
            std::vector<double> samples(7 * 250);
            for (std::size_t i = 0; i < samples.size(); ++i) {
                const double t = static_cast<double>(i) / rate_hz - 0.8;
                double gone = t > takes ? 0.05 * std::log1p((t - takes) / 0.3) : 0.0;
                for (int k = 0; k < steps; ++k) {
                    const double u = std::clamp((t - k * (takes + pause)) / takes, 0.0, 1.0);
                    gone += u * u * u * (10.0 - 15.0 * u + 6.0 * u * u) / steps;
                }
                samples[i] = 0.02 * (1.0 - gone);
            }
            simulator::add_noise(samples, 0.02, rate_hz, Noise{42.0, 0.5}, generator);
            const auto lowered =
                simulator::with_samples(std::move(samples), rate_hz, MeasuredQuantity::displacement);
            CHECK(find_events(lowered.recording).events.empty());
        }
}

// Hum alone, whose size swells and fades by a fifth within some seconds (common practice, no source), and a
// mode near the line that was struck: one is no decay, the other is. Seeds 900 to 909.
TEST_CASE("hum that swells and fades is no decay, and a bar that is struck near the line is one") {
    for (std::uint64_t seed = 900; seed < 910; ++seed) {
        INFO("seed " << seed);
        Generator generator(seed);
        const double line = (seed % 2 == 0 ? 50.0 : 60.0) + 0.1 * generator.uniform() - 0.05;
        const double swell_hz = 0.02 + 0.28 * generator.uniform();
        std::vector<double> samples(5000);
        for (std::size_t i = 0; i < samples.size(); ++i) {
            const double t = static_cast<double>(i) / 1000.0;
            samples[i] = (1.0 + 0.2 * std::sin(2.0 * std::numbers::pi * swell_hz * t)) *
                         std::sin(2.0 * std::numbers::pi * line * t);
        }
        simulator::add_noise(samples, 1.0, 1000.0, Noise{45.0}, generator);
        const auto hum = simulator::with_samples(std::move(samples), 1000.0, MeasuredQuantity::displacement);
        CHECK(find_events(hum.recording).events.empty());

        const auto bar = simulator::taps({line, 2e-4}, 2000.0, 5.0, {0.5}, 0.002,
                                         MeasuredQuantity::acceleration, Noise{45.0}, generator);
        CHECK(find_events(bar.recording).events.size() == 1);
    }
}
