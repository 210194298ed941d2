#include "support/bench_kinds.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <iterator>
#include <numbers>
#include <utility>

#include "support/simulated_law.hpp"

namespace simulated {

namespace {

using ringwright::MeasuredQuantity;
using ringwright::Quantity;
using simulator::free_decay;
using simulator::Generator;
using simulator::Mode;

constexpr double pi = std::numbers::pi;
const simulator::Noise silence{300.0};

double between(Generator& draws, double low, double high) {
    return low + (high - low) * draws.uniform();
}
double log_between(Generator& draws, double low, double high) {
    return low * std::pow(high / low, draws.uniform());
}
bool chance(Generator& draws, double share) {
    return draws.uniform() < share;
}

/// What the sensor and its recorder add to the motion.
struct Conditions {
    double rate_hz = 1000.0, decibels = 40.0, phi = 0.0;
    int bits = 0;  // over ±1.2 times the largest value; 0: continuous

    [[nodiscard]] std::string text() const {
        return fmt::format("{:.0f} Hz, {:.0f} dB, φ {:.2f}", rate_hz, decibels, phi) +
               (bits > 0 ? fmt::format(", {} bits", bits) : "");
    }
};

/// Twenty samples a cycle of the highest mode or more, 200 to 2,000 a second.
Conditions draw_conditions(Generator& draws, double highest_hz) {
    Conditions c;
    c.rate_hz = log_between(draws, std::max(200.0, 20.0 * highest_hz), std::max(2000.0, 40.0 * highest_hz));
    c.decibels = between(draws, 25.0, 60.0);
    c.phi = chance(draws, 0.4) ? 0.0 : between(draws, 0.5, 0.9);
    c.bits = chance(draws, 0.5) ? 0 : static_cast<int>(between(draws, 10.0, 17.0));
    return c;
}

std::string header_of(MeasuredQuantity quantity) {
    if (quantity == MeasuredQuantity::velocity) return "time [s],velocity [m/s]\n";
    if (quantity == MeasuredQuantity::acceleration) return "time [s],acceleration [m/s^2]\n";
    return "time [s],displacement [mm]\n";
}

using Signal = std::vector<double>;

double largest_of(const Signal& signal) {
    double largest = 0.0;
    for (const double value : signal) largest = std::max(largest, std::abs(value));
    return largest;
}

/// Noise that many decibels below `size` and steps of the recorder; SI.
void record(Signal& signal, const Conditions& c, Generator& draws, double size) {
    simulator::add_noise(signal, size, c.rate_hz, {c.decibels, c.phi}, draws);
    if (c.bits == 0) return;
    const double step = 2.4 * largest_of(signal) / std::pow(2.0, c.bits);
    for (double& value : signal) value = step * std::round(value / step);
}
void record(Signal& signal, const Conditions& c, Generator& draws) {
    record(signal, c, draws, largest_of(signal));
}

std::string written(const Signal& signal, const Signal& times, MeasuredQuantity quantity) {
    std::string text = header_of(quantity);
    const double unit = quantity == MeasuredQuantity::displacement ? 1000.0 : 1.0;
    for (std::size_t i = 0; i < signal.size(); ++i)
        fmt::format_to(std::back_inserter(text), "{:.6f},{:.7g}\n", times[i], unit * signal[i]);
    return text;
}

std::string written(const Signal& signal, double rate_hz, MeasuredQuantity quantity) {
    Signal times(signal.size());
    for (std::size_t i = 0; i < times.size(); ++i) times[i] = static_cast<double>(i) / rate_hz;
    return written(signal, times, quantity);
}

Mode draw_mode(Generator& draws, double least_damping, double most_damping) {
    return {log_between(draws, 2.0, 15.0), log_between(draws, least_damping, most_damping)};
}

/// Until e^-5 of the start, four cycles at least and 12 s at most.
double length_of(const Mode& mode) {
    const double z = mode.damping_ratio, slow = z <= 1.0 ? z : z - std::sqrt(z * z - 1.0);
    return std::clamp(5.0 / (2.0 * pi * mode.frequency_hz * slow), 4.0 / mode.frequency_hz, 12.0);
}

double draw_height(Generator& draws) {
    return log_between(draws, 0.003, 0.040);
}

/// A hand pulls, holds and lets go; or the recording begins with the hold.
simulator::Pull draw_pull(Generator& draws, const Mode& mode) {
    simulator::Pull pull;
    pull.hold_s = between(draws, 0.2, 1.0);
    pull.decay_s = length_of(mode);
    if (chance(draws, 0.5))
        pull.quiet_s = pull.ramp_s = 0.0;
    else
        pull.quiet_s = between(draws, 0.3, 1.0), pull.ramp_s = between(draws, 0.8, 2.0);
    return pull;
}

/// Noise-free, SI: displacement, or acceleration in m/s².
Signal pulled(const Mode& mode, const simulator::Pull& pull, double rate_hz, double height,
              MeasuredQuantity quantity) {
    Generator unused(1);
    const double omega = 2.0 * pi * mode.frequency_hz;
    Signal signal = simulator::plucks(mode, rate_hz, pull, quantity, silence, unused).recording.samples;
    const double scale = quantity == MeasuredQuantity::acceleration ? height * omega * omega : height;
    for (double& value : signal) value *= scale;
    return signal;
}

BenchRecording in_a_file(const Signal& signal, const Conditions& c, const Mode& mode,
                         MeasuredQuantity quantity) {
    BenchRecording made{written(signal, c.rate_hz, quantity), {}};
    made.truth.mode = mode;
    made.truth.conditions = c.text();
    return made;
}

/// Noise and recorder over a signal of one mode.
BenchRecording finished(Signal signal, const Conditions& c, Generator& draws, const Mode& mode,
                        MeasuredQuantity quantity = MeasuredQuantity::displacement) {
    record(signal, c, draws);
    return in_a_file(signal, c, mode, quantity);
}

/// One release with damping ratios of the range, displacement or acceleration; `change` works on the signal
/// before the noise, with the instant of release.
using Change = std::function<void(Signal&, const Conditions&, double release_s, Generator&)>;

BenchRecording one_release(Generator& draws, const Mode& mode, MeasuredQuantity quantity,
                           const Change& change = {}) {
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    const simulator::Pull pull = draw_pull(draws, mode);
    Signal signal = pulled(mode, pull, c.rate_hz, draw_height(draws), quantity);
    if (change) change(signal, c, pull.quiet_s + pull.ramp_s + pull.hold_s, draws);
    return finished(std::move(signal), c, draws, mode, quantity);
}

BenchRecording viscous(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.003, 0.5);
    return one_release(draws, mode,
                       chance(draws, 0.5) ? MeasuredQuantity::displacement : MeasuredQuantity::acceleration);
}

BenchRecording critical(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode{log_between(draws, 2.0, 8.0), chance(draws, 0.5) ? 1.0 : 1.8};
    return one_release(draws, mode, MeasuredQuantity::displacement);
}

BenchRecording any_damping(std::uint64_t seed) {
    Generator draws(seed);
    return one_release(draws, draw_mode(draws, 0.0002, 5.0), MeasuredQuantity::displacement);
}

/// A 40 mm fall on a mount of 6 Hz and ζ = 0.15, and others about that.
BenchRecording dropped(std::uint64_t seed, MeasuredQuantity quantity) {
    Generator draws(seed);
    const Mode mode{between(draws, 5.0, 7.5), between(draws, 0.1, 0.2)};
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    const double omega = 2.0 * pi * mode.frequency_hz, height = between(draws, 0.02, 0.06);
    Signal signal =
        simulator::drop(mode, c.rate_hz, 3.0, between(draws, 0.3, 0.6), height, quantity, silence, draws)
            .recording.samples;
    if (quantity ==
        MeasuredQuantity::displacement)  // about the rest position, as a sensor that was zeroed there
        for (double& value : signal) value -= 9.80665 / (omega * omega);
    return finished(std::move(signal), c, draws, mode, quantity);
}
BenchRecording drop_displacement(std::uint64_t seed) {
    return dropped(seed, MeasuredQuantity::displacement);
}
BenchRecording drop_acceleration(std::uint64_t seed) {
    return dropped(seed, MeasuredQuantity::acceleration);
}

/// The high-pass of first order that an AC-coupled sensor is, on a signal that was at rest at its first
/// value; what came before the recording is that value, held for ever. Exact for straight lines between
/// samples.
void pass_high(Signal& signal, double rate_hz, double corner_hz) {
    const double beta = 2.0 * pi * corner_hz, keep = std::exp(-beta / rate_hz);
    double state = 0.0, before = signal.front();
    for (double& value : signal) {
        state = keep * state + (value - before) * (1.0 - keep) * rate_hz / beta;
        before = value;
        value = state;
    }
}

BenchRecording ac_coupled(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = chance(draws, 0.5) ? Mode{4.0, 0.12}
                                         : Mode{log_between(draws, 2.5, 8.0), log_between(draws, 0.02, 0.25)};
    const double corner = mode.damping_ratio == 0.12 ? 1.0 : log_between(draws, 0.2, 1.5);
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    const simulator::Pull pull = draw_pull(draws, mode);
    constexpr std::size_t finer = 10;
    Signal fine = pulled(mode, pull, finer * c.rate_hz, draw_height(draws), MeasuredQuantity::displacement);
    pass_high(fine, finer * c.rate_hz, corner);
    Signal signal;
    for (std::size_t i = 0; i < fine.size(); i += finer) signal.push_back(fine[i]);
    return finished(std::move(signal), c, draws, mode);
}

BenchRecording slow_ramp(std::uint64_t seed) {
    Generator draws(seed);
    return one_release(draws, draw_mode(draws, 0.01, 0.2), MeasuredQuantity::displacement,
                       [](Signal& signal, const Conditions& c, double, Generator& more) {
                           const double size = largest_of(signal) * between(more, -0.3, 0.3);
                           const double constant = between(more, 3.0, 15.0);  // s, of the sensor's warming
                           for (std::size_t i = 0; i < signal.size(); ++i)
                               signal[i] +=
                                   size * (1.0 - std::exp(-static_cast<double>(i) / c.rate_hz / constant));
                       });
}

/// A rail at 40 to 85 % of the release; the recorder's steps go with the rail.
BenchRecording clipped_start(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.01, 0.15);
    Conditions c = draw_conditions(draws, mode.frequency_hz);
    c.bits = 0;
    Signal signal =
        pulled(mode, draw_pull(draws, mode), c.rate_hz, draw_height(draws), MeasuredQuantity::displacement);
    record(signal, c, draws);
    const double rail = largest_of(signal) * between(draws, 0.4, 0.85);
    for (double& value : signal) value = std::clamp(value, -rail, rail);
    return in_a_file(signal, c, mode, MeasuredQuantity::displacement);
}

/// The noise goes by what rings after the last blow, which may be far lower than the blow.
BenchRecording tapped(Generator& draws, const Mode& mode, const std::vector<double>& at_s, double contact_s) {
    const Conditions c = draw_conditions(draws, std::max(mode.frequency_hz, 0.5 / contact_s));
    const MeasuredQuantity quantity =
        chance(draws, 0.5) ? MeasuredQuantity::acceleration : MeasuredQuantity::displacement;
    Signal signal = simulator::taps(mode, c.rate_hz, at_s.back() + length_of(mode), at_s, contact_s, quantity,
                                    silence, draws)
                        .recording.samples;
    const double omega = 2.0 * pi * mode.frequency_hz;
    const double scale = 0.002 * (quantity == MeasuredQuantity::acceleration ? omega * omega : 1.0);
    for (double& value : signal) value *= scale;
    const auto free = static_cast<std::ptrdiff_t>(std::ceil((at_s.back() + contact_s) * c.rate_hz));
    record(signal, c, draws, largest_of(Signal(signal.begin() + free, signal.end())));
    return in_a_file(signal, c, mode, quantity);
}

/// The hand or hammer comes back 0.3 to 3 cycles later.
BenchRecording double_hit(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.005, 0.1);
    const double first = between(draws, 0.3, 0.6), later = between(draws, 0.3, 3.0) / mode.frequency_hz;
    return tapped(draws, mode, {first, first + later}, log_between(draws, 0.02, 0.2) / mode.frequency_hz);
}

/// A tip of steel to one of soft rubber.
BenchRecording tap(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.005, 0.1);
    return tapped(draws, mode, {between(draws, 0.3, 0.6)}, log_between(draws, 0.01, 0.4) / mode.frequency_hz);
}

/// The holding force falls to nothing over 0.05 to 0.5 cycles: the mean of releases at each instant of it.
BenchRecording slow_release(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.005, 0.2);
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    const double takes_s = between(draws, 0.05, 0.5) / mode.frequency_hz, height = draw_height(draws);
    simulator::Pull pull = draw_pull(draws, mode);
    constexpr int parts = 40;
    Signal signal;
    for (int k = 0; k < parts; ++k) {
        simulator::Pull part = pull;
        part.hold_s += takes_s * (k + 0.5) / parts;
        part.decay_s += takes_s * (1.0 - (k + 0.5) / parts);
        const Signal one = pulled(mode, part, c.rate_hz, height / parts, MeasuredQuantity::displacement);
        signal.resize(signal.empty() ? one.size() : std::min(signal.size(), one.size()));
        for (std::size_t i = 0; i < signal.size(); ++i) signal[i] += one[i];
    }
    return finished(std::move(signal), c, draws, mode);
}

/// When samples were taken: a jittering clock, gaps, lost samples, or a rate that changes half-way.
Signal irregular_times(double rate_hz, double length_s, Generator& draws) {
    const double step = 1.0 / rate_hz;
    const int what = static_cast<int>(4.0 * draws.uniform());
    const double slower = chance(draws, 0.5) ? 2.0 : 3.0, change_s = between(draws, 0.3, 0.7) * length_s;
    const double gap_s = between(draws, 0.55, 0.9) * length_s, gap_for_s = between(draws, 0.05, 0.3);
    Signal times;
    for (double t = 0.0; t < length_s; t += what == 3 && t > change_s ? slower * step : step) {
        if (what == 1 && chance(draws, 0.05)) continue;
        if (what == 2 && t > gap_s && t < gap_s + gap_for_s) continue;
        times.push_back(what == 0 ? t + std::clamp(0.15 * draws.normal(), -0.4, 0.4) * step : t);
    }
    return times;
}

BenchRecording irregular_clock(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.005, 0.15);
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    const double held_s = between(draws, 0.3, 1.0), height = draw_height(draws);
    const Signal times = irregular_times(c.rate_hz, held_s + length_of(mode), draws);
    Signal signal;
    for (const double t : times)
        signal.push_back(t < held_s ? height : free_decay(mode, height, 0.0, t - held_s).x);
    record(signal, c, draws);
    BenchRecording made{written(signal, times, MeasuredQuantity::displacement), {}};
    made.truth.mode = mode;
    made.truth.conditions = c.text();
    return made;
}

/// Two modes let go together; the second has a share of the height of the first.
BenchRecording two_modes(Generator& draws, const Mode& first, const Mode& second, double share) {
    const Conditions c = draw_conditions(draws, std::max(first.frequency_hz, second.frequency_hz));
    const double height = draw_height(draws);
    simulator::Pull pull = draw_pull(draws, first);
    Signal signal = pulled(first, pull, c.rate_hz, height, MeasuredQuantity::displacement);
    const Signal other = pulled(second, pull, c.rate_hz, share * height, MeasuredQuantity::displacement);
    for (std::size_t i = 0; i < signal.size(); ++i) signal[i] += other[i];
    BenchRecording made = finished(std::move(signal), c, draws, first);
    made.truth.second_mode = second;
    return made;
}

BenchRecording close_modes(std::uint64_t seed) {
    Generator draws(seed);
    const Mode first{18.0, between(draws, 0.006, 0.02)}, second{20.2, between(draws, 0.006, 0.02)};
    return two_modes(draws, first, second, between(draws, 0.4, 0.95));
}

BenchRecording with_frame(std::uint64_t seed) {
    Generator draws(seed);
    const Mode article{log_between(draws, 3.0, 10.0), log_between(draws, 0.01, 0.15)};
    const Mode frame{article.frequency_hz * between(draws, 2.3, 6.0), log_between(draws, 0.005, 0.03)};
    return two_modes(draws, article, frame, between(draws, 0.1, 0.4));
}

BenchRecording five_releases(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.02, 0.1);
    const Conditions c = draw_conditions(draws, mode.frequency_hz);
    simulator::Pull pull;
    pull.quiet_s = between(draws, 0.3, 0.8), pull.ramp_s = between(draws, 0.8, 1.5), pull.repeats = 5;
    pull.decay_s = length_of(mode);
    Signal signal = pulled(mode, pull, c.rate_hz, draw_height(draws), MeasuredQuantity::displacement);
    BenchRecording made = finished(std::move(signal), c, draws, mode);
    made.truth.events = 5;
    return made;
}

/// 5 kg on 8 kN/m under a law, let go from 20 to 40 mm, measured as displacement or acceleration.
BenchRecording under_law(Generator& draws, Law law, std::string model,
                         std::map<Quantity, double> coefficients) {
    Conditions c = draw_conditions(draws, 10.0);
    law.release = between(draws, 0.020, 0.040);
    const MeasuredQuantity quantity =
        chance(draws, 0.5) ? MeasuredQuantity::displacement : MeasuredQuantity::acceleration;
    const auto held = static_cast<std::size_t>(between(draws, 0.3, 0.8) * c.rate_hz);
    const Motion motion = integrate(law, c.rate_hz, static_cast<std::size_t>(3.0 * c.rate_hz));
    const bool displaced = quantity == MeasuredQuantity::displacement;
    Signal signal(held, displaced ? law.release : 0.0);
    const Signal& values = displaced ? motion.displacement : motion.acceleration;
    signal.insert(signal.end(), values.begin(), values.end());
    BenchRecording made =
        finished(std::move(signal), c, draws, {law.angular_frequency() / (2.0 * pi), 0.0}, quantity);
    made.truth.model = std::move(model);
    for (auto& [key, value] : coefficients) value /= law.mass;
    made.truth.per_mass = std::move(coefficients);
    return made;
}

BenchRecording friction(std::uint64_t seed) {
    Generator draws(seed);
    Law law;
    law.friction = 6.0;
    return under_law(draws, law, "viscous+friction",
                     {{Quantity::friction_force, 6.0}, {Quantity::damping_coefficient, 10.0}});
}

BenchRecording two_way(std::uint64_t seed) {
    Generator draws(seed);
    Law law;
    law.compression = 60.0, law.rebound = 180.0;
    return under_law(draws, law, "two-way",
                     {{Quantity::compression_damping, 60.0}, {Quantity::rebound_damping, 180.0}});
}

BenchRecording quadratic(std::uint64_t seed) {
    Generator draws(seed);
    Law law;
    law.compression = law.rebound = 20.0, law.quadratic = 60.0;
    return under_law(draws, law, "viscous+quadratic",
                     {{Quantity::quadratic_damping, 60.0}, {Quantity::damping_coefficient, 20.0}});
}

BenchRecording cubic(std::uint64_t seed) {
    Generator draws(seed);
    Law law;
    law.compression = law.rebound = 20.0;
    const bool harder = chance(draws, 0.5);
    law.cubic = harder ? 3e6 : -2e6;
    return under_law(draws, law, harder ? "viscous+hardening" : "viscous+softening",
                     {{Quantity::cubic_stiffness, law.cubic}, {Quantity::damping_coefficient, 20.0}});
}

/// No event: noise over a signal that is not let go.
BenchRecording without_event(Signal signal, Conditions c, Generator& draws) {
    record(signal, c, draws);
    BenchRecording made{written(signal, c.rate_hz, MeasuredQuantity::displacement), {}};
    made.truth.events = 0;
    made.truth.conditions = c.text();
    return made;
}

BenchRecording noise_alone(std::uint64_t seed) {
    Generator draws(seed);
    constexpr double phis[] = {0.0, 0.5, 0.9, 0.99, 0.995};
    const double phi = phis[static_cast<int>(5.0 * draws.uniform())];
    Conditions c = draw_conditions(draws, 10.0);
    c.decibels = 60.0, c.phi = 0.0;
    return without_event(
        simulator::coloured_noise(draws, static_cast<std::size_t>(4.0 * c.rate_hz), 0.01, phi), c, draws);
}

/// A hand or jack moves the article from one level to another, once or in steps; or it creeps.
BenchRecording lowered(std::uint64_t seed) {
    Generator draws(seed);
    const Conditions c = draw_conditions(draws, 10.0);
    const int steps = chance(draws, 0.5) ? 1 : 3;
    const bool creeps = chance(draws, 0.3);
    const double start = between(draws, 0.5, 1.0), takes = between(draws, 0.3, 2.0) / steps, pause = 0.7;
    Signal signal(static_cast<std::size_t>(7.0 * c.rate_hz));
    for (std::size_t i = 0; i < signal.size(); ++i) {
        const double t = static_cast<double>(i) / c.rate_hz;
        double level = 0.0;
        for (int k = 0; k < steps; ++k) {
            const double share = std::clamp((t - start - k * (takes + pause)) / takes, 0.0, 1.0);
            level +=
                share * share * share * (10.0 - 15.0 * share + 6.0 * share * share) / steps;  // of least jerk
        }
        if (creeps && t > start + takes) level += 0.05 * std::log1p((t - start - takes) / 0.3);
        signal[i] = 0.02 * (1.0 - level);
    }
    return without_event(std::move(signal), c, draws);
}

/// A mode that the ground keeps in motion, all through the recording.
BenchRecording kept_in_motion(std::uint64_t seed) {
    Generator draws(seed);
    const Mode mode = draw_mode(draws, 0.01, 0.1);
    Conditions c = draw_conditions(draws, mode.frequency_hz);
    const double omega = 2.0 * pi * mode.frequency_hz, s = mode.damping_ratio * omega, h = 1.0 / c.rate_hz;
    const double root = std::sqrt(omega * omega - s * s), keep = std::exp(-s * h);
    const double a1 = 2.0 * keep * std::cos(root * h), a2 = -keep * keep;
    Signal signal;
    double last = 0.0, before = 0.0;
    const auto settle = static_cast<std::size_t>(5.0 / s * c.rate_hz),
               n = static_cast<std::size_t>(6.0 * c.rate_hz);
    for (std::size_t i = 0; i < settle + n; ++i) {
        const double value = a1 * last + a2 * before + draws.normal();
        before = last, last = value;
        if (i >= settle) signal.push_back(value);
    }
    const double scale = 0.001 / largest_of(signal);
    for (double& value : signal) value *= scale;
    return without_event(std::move(signal), c, draws);
}

/// Mains hum of 50 or 60 Hz with a harmonic, whose size swells and fades.
BenchRecording hum_alone(std::uint64_t seed) {
    Generator draws(seed);
    const Conditions c = draw_conditions(draws, 20.0);
    const double line = chance(draws, 0.5) ? 50.0 : 60.0, off = between(draws, -0.05, 0.05);
    const double swell = between(draws, 0.0, 0.2), swell_hz = between(draws, 0.02, 0.3),
                 third = between(draws, 0.0, 0.5);
    Signal signal(static_cast<std::size_t>(5.0 * c.rate_hz));
    for (std::size_t i = 0; i < signal.size(); ++i) {
        const double t = static_cast<double>(i) / c.rate_hz, phase = 2.0 * pi * (line + off) * t;
        signal[i] = 0.001 * (1.0 + swell * std::sin(2.0 * pi * swell_hz * t)) *
                    (std::sin(phase) + third * std::sin(3.0 * phase + 0.7));
    }
    return without_event(std::move(signal), c, draws);
}

}  // namespace

const std::vector<BenchKind>& bench_kinds() {
    static const std::vector<BenchKind> kinds{
        {"viscous, ζ 0.003 to 0.5", {0.01, 0.1}, viscous},
        {"ζ = 1.0 and 1.8", {0.05, 0.05}, critical},
        {"ζ 0.0002 to 5", {0.05, 0.1}, any_damping},
        {"drop, displacement", {0.02, 0.1}, drop_displacement},
        {"drop, acceleration", {0.02, 0.1}, drop_acceleration},
        {"AC-coupled", {0.01, 0.05}, ac_coupled},
        {"slow ramp", {0.01, 0.1}, slow_ramp},
        {"clipped start", {0.01, 0.1}, clipped_start},
        {"double hit", {0.01, 0.1}, double_hit},
        {"tap", {0.01, 0.1}, tap},
        {"slow release", {0.01, 0.1}, slow_release},
        {"irregular clock", {0.01, 0.1}, irregular_clock},
        {"18.0 and 20.2 Hz", {0.002, 0.06}, close_modes},
        {"with a frame", {0.01, 0.1}, with_frame},
        {"five releases", {0.005, 0.03}, five_releases},
        {"friction", {0.01, 0.1}, friction},
        {"two-way", {0.01, 0.1}, two_way},
        {"quadratic", {0.01, 0.1}, quadratic},
        {"hardening, softening", {0.01, 0.1}, cubic},
        {"noise alone", {}, noise_alone},
        {"lowered", {}, lowered},
        {"kept in motion", {}, kept_in_motion},
        {"hum alone", {}, hum_alone},
    };
    return kinds;
}

}  // namespace simulated
