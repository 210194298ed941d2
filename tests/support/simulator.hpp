#pragma once
// Recordings of known truth for the tests of the event search. The motion is the exact solution of
// x'' + 2ζω x' + ω² x = f(t) (release from a plateau, general start) or its integral by Runge and Kutta's
// fourth-order rule at 200 steps a cycle or finer (taps); noise from the generator below with the seed
// written in the test.

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <numbers>
#include <vector>

#include "ringwright/recording.hpp"

namespace simulator {

/// Marsaglia's xorshift64* (J. Stat. Softw. 8(14), 2003, and Vigna 2016); sums of twelve uniforms less six
/// stand for normal numbers.
class Generator {
  public:
    explicit Generator(std::uint64_t seed) : state_(seed * 0x9E3779B97F4A7C15ULL + 0x1234567ULL) {}
    double uniform() {
        state_ ^= state_ >> 12, state_ ^= state_ << 25, state_ ^= state_ >> 27;
        return static_cast<double>((state_ * 0x2545F4914F6CDD1DULL) >> 11) * 0x1.0p-53;
    }
    double normal() {
        double sum = -6.0;
        for (int i = 0; i < 12; ++i) sum += uniform();
        return sum;
    }

  private:
    std::uint64_t state_;
};

struct Mode {
    double frequency_hz = 5.0;  ///< undamped
    double damping_ratio = 0.05;
};

/// Displacement, velocity and acceleration of a free decay.
struct Motion {
    double x = 0.0, v = 0.0, a = 0.0;
};

/// t after a start with displacement x0 and velocity v0.
inline Motion free_decay(const Mode& mode, double x0, double v0, double t) {
    const double w = 2.0 * std::numbers::pi * mode.frequency_hz, z = mode.damping_ratio, s = z * w;
    const double p = w * w * (1.0 - z * z), root = std::sqrt(std::abs(p));
    double c = 0.0, d = 0.0;  // e^(−st)·C, e^(−st)·S
    if (root * t < 1e-7) {
        c = std::exp(-s * t), d = t * c;
    } else if (p > 0.0) {
        c = std::exp(-s * t) * std::cos(root * t), d = std::exp(-s * t) * std::sin(root * t) / root;
    } else {
        const double slow = std::exp(-(s - root) * t), fast = std::exp(-(s + root) * t);
        c = 0.5 * (slow + fast), d = 0.5 * (slow - fast) / root;
    }
    const double b = v0 + s * x0;
    Motion motion;
    motion.x = x0 * c + b * d;
    motion.v = v0 * c - (s * v0 + w * w * x0) * d;
    motion.a = -2.0 * s * motion.v - w * w * motion.x;
    return motion;
}

/// First-order autoregressive noise of standard deviation `rms`.
inline std::vector<double> coloured_noise(Generator& generator, std::size_t n, double rms, double phi) {
    std::vector<double> noise(n);
    double last = rms * generator.normal();
    const double step = rms * std::sqrt(1.0 - phi * phi);
    for (double& value : noise) value = last, last = phi * last + step * generator.normal();
    return noise;
}

struct Noise {
    double decibels_below = 40.0;  ///< of the start amplitude
    double phi = 0.0;
    double hum_hz = 0.0;
    double hum_decibels_below = 40.0;
};

struct Simulated {
    ringwright::Recording recording;
    std::vector<std::size_t> begins;  ///< first sample of free decay of each event
    double samples_per_cycle = 0.0;
};

inline void add_noise(std::vector<double>& samples, double amplitude, double rate_hz, const Noise& noise,
                      Generator& generator) {
    const double rms = amplitude * std::pow(10.0, -noise.decibels_below / 20.0);
    const std::vector<double> random = coloured_noise(generator, samples.size(), rms, noise.phi);
    const double hum =
        noise.hum_hz > 0.0 ? amplitude * std::pow(10.0, -noise.hum_decibels_below / 20.0) : 0.0;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double t = static_cast<double>(i) / rate_hz;
        samples[i] += random[i] + hum * std::sin(2.0 * std::numbers::pi * noise.hum_hz * t + 1.0);
    }
}

inline Simulated with_samples(std::vector<double> samples, double rate_hz,
                              ringwright::MeasuredQuantity quantity) {
    Simulated simulated;
    simulated.recording.samples = std::move(samples);
    simulated.recording.clock.sample_rate_hz = rate_hz;
    simulated.recording.quantity = quantity;
    return simulated;
}

inline double part_of(const Motion& motion, ringwright::MeasuredQuantity quantity, double w) {
    if (quantity == ringwright::MeasuredQuantity::velocity) return motion.v / w;
    if (quantity == ringwright::MeasuredQuantity::acceleration) return motion.a / (w * w);
    return motion.x;
}

/// The record begins with the decay already running.
inline Simulated running_decay(const Mode& mode, double rate_hz, double duration_s, double phase,
                               const Noise& noise, Generator& generator) {
    const double w = 2.0 * std::numbers::pi * mode.frequency_hz;
    std::vector<double> samples(static_cast<std::size_t>(duration_s * rate_hz));
    for (std::size_t i = 0; i < samples.size(); ++i)
        samples[i] =
            0.3 + free_decay(mode, std::cos(phase), -w * std::sin(phase), static_cast<double>(i) / rate_hz).x;
    add_noise(samples, 1.0, rate_hz, noise, generator);
    Simulated simulated =
        with_samples(std::move(samples), rate_hz, ringwright::MeasuredQuantity::displacement);
    simulated.begins = {0};
    simulated.samples_per_cycle = rate_hz / mode.frequency_hz;
    return simulated;
}

struct Pull {
    double quiet_s = 1.0, ramp_s = 2.0, hold_s = 0.7, decay_s = 4.0;
    double tremor = 0.0;  ///< amplitude of the hand's tremor on the plateau, share of the pull
    int repeats = 1;
};

/// Quiet, a hand pulls along half a cosine, holds, lets go; so often. quiet_s = 0 and ramp_s = 0: held from
/// the first sample.
inline Simulated plucks(const Mode& mode, double rate_hz, const Pull& pull,
                        ringwright::MeasuredQuantity quantity, const Noise& noise, Generator& generator) {
    const double w = 2.0 * std::numbers::pi * mode.frequency_hz, pi = std::numbers::pi;
    const double one = pull.quiet_s + pull.ramp_s + pull.hold_s + pull.decay_s;
    std::vector<double> samples(static_cast<std::size_t>(one * pull.repeats * rate_hz));
    std::vector<double> releases;
    for (int k = 0; k < pull.repeats; ++k)
        releases.push_back(one * k + pull.quiet_s + pull.ramp_s + pull.hold_s + 0.37 / rate_hz * (k + 1));
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double t = static_cast<double>(i) / rate_hz;
        const auto k = std::min(static_cast<std::size_t>(t / one), releases.size() - 1);
        const double local = t - one * static_cast<double>(k);
        Motion motion;
        if (k > 0) motion = free_decay(mode, 1.0, 0.0, t - releases[k - 1]);
        if (t >= releases[k]) {
            motion = free_decay(mode, 1.0, 0.0, t - releases[k]);
        } else if (local >= pull.quiet_s + pull.ramp_s) {
            const double tremor = 2.0 * pi * 8.0 * (local - pull.quiet_s);
            motion = {1.0 + pull.tremor * std::sin(tremor), 0.0, 0.0};
        } else if (local >= pull.quiet_s) {
            const double turn = pi / pull.ramp_s, at = turn * (local - pull.quiet_s);
            motion = {0.5 - 0.5 * std::cos(at), 0.5 * turn * std::sin(at), 0.5 * turn * turn * std::cos(at)};
        }
        samples[i] = part_of(motion, quantity, w);
    }
    add_noise(samples, 1.0, rate_hz, noise, generator);
    Simulated simulated = with_samples(std::move(samples), rate_hz, quantity);
    for (const double release : releases)
        simulated.begins.push_back(static_cast<std::size_t>(std::ceil(release * rate_hz)));
    simulated.samples_per_cycle = rate_hz / mode.frequency_hz;
    return simulated;
}

/// Blows of half a sine of `contact_s` at the given times, each of the same momentum; scaled so that the free
/// motion after one blow has an amplitude near one.
inline Simulated taps(const Mode& mode, double rate_hz, double duration_s, const std::vector<double>& times_s,
                      double contact_s, ringwright::MeasuredQuantity quantity, const Noise& noise,
                      Generator& generator) {
    const double pi = std::numbers::pi, w = 2.0 * pi * mode.frequency_hz;
    const double height = w * pi / (2.0 * contact_s);
    const auto force = [&](double t) {
        double sum = 0.0;
        for (const double at : times_s)
            if (t >= at && t < at + contact_s) sum += height * std::sin(pi * (t - at) / contact_s);
        return sum;
    };
    const auto acceleration = [&](double t, double x, double v) {
        return force(t) - 2.0 * mode.damping_ratio * w * v - w * w * x;
    };
    const double finest = std::min({1.0 / rate_hz, 1.0 / (200.0 * mode.frequency_hz), contact_s / 20.0});
    const int steps = static_cast<int>(std::ceil(1.0 / rate_hz / finest));
    const double h = 1.0 / rate_hz / steps;
    std::vector<double> samples(static_cast<std::size_t>(duration_s * rate_hz));
    double x = 0.0, v = 0.0;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        double t = static_cast<double>(i) / rate_hz;
        samples[i] = part_of({x, v, acceleration(t, x, v)}, quantity, w);
        for (int j = 0; j < steps; ++j, t += h) {
            const double a1 = acceleration(t, x, v);
            const double v2 = v + 0.5 * h * a1, a2 = acceleration(t + 0.5 * h, x + 0.5 * h * v, v2);
            const double v3 = v + 0.5 * h * a2, a3 = acceleration(t + 0.5 * h, x + 0.5 * h * v2, v3);
            const double v4 = v + h * a3, a4 = acceleration(t + h, x + h * v3, v4);
            x += h / 6.0 * (v + 2.0 * v2 + 2.0 * v3 + v4);
            v += h / 6.0 * (a1 + 2.0 * a2 + 2.0 * a3 + a4);
        }
    }
    add_noise(samples, 1.0, rate_hz, noise, generator);
    Simulated simulated = with_samples(std::move(samples), rate_hz, quantity);
    for (const double at : times_s)
        simulated.begins.push_back(static_cast<std::size_t>(std::ceil((at + contact_s) * rate_hz)));
    simulated.samples_per_cycle = rate_hz / mode.frequency_hz;
    return simulated;
}

/// A mass that falls from `height_m` on to a spring and damper which push and cannot pull, held before
/// `release_s`. Displacement in m downwards from first touch, or what an accelerometer on the mass shows (its
/// acceleration less that of gravity, upwards positive, m/s²). begins: the first sample of unbroken contact.
inline Simulated drop(const Mode& mode, double rate_hz, double duration_s, double release_s, double height_m,
                      ringwright::MeasuredQuantity quantity, const Noise& noise, Generator& generator) {
    constexpr double gravity = 9.80665;
    const double w = 2.0 * std::numbers::pi * mode.frequency_hz;
    const double step = std::min(1.0 / rate_hz / 8.0, 1.0 / (2000.0 * mode.frequency_hz));
    const int steps = static_cast<int>(std::ceil(1.0 / rate_hz / step));
    const double h = 1.0 / rate_hz / steps;
    std::vector<double> samples(static_cast<std::size_t>(duration_s * rate_hz));
    const auto pushes = [&](double below, double speed) {
        return below >= 0.0 ? std::max(0.0, w * w * below + 2.0 * mode.damping_ratio * w * speed) : 0.0;
    };
    const auto falls = [&](double below, double speed) { return gravity - pushes(below, speed); };
    double x = -height_m, v = 0.0;
    std::size_t contact_since = 0;
    bool touching = false;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double t = static_cast<double>(i) / rate_hz;
        const double push = pushes(x, v);
        const bool held = t < release_s;
        const bool accelerometer = quantity == ringwright::MeasuredQuantity::acceleration;
        samples[i] = accelerometer ? (held ? gravity : push) : x;
        if (push > 0.0 && !touching) contact_since = i;
        touching = push > 0.0;
        for (int j = 0; j < steps && !held; ++j) {
            // In flight as far as the touch, where the push jumps; then Runge–Kutta's classical step. A
            // method of first order has a damped mass swing at (1 + ζωh/2) times its frequency.
            const double flight =
                x < 0.0 ? std::min(h, (std::sqrt(v * v - 2.0 * gravity * x) - v) / gravity) : 0.0;
            x = flight > 0.0 && flight < h ? 0.0 : x + flight * (v + 0.5 * gravity * flight);
            v += gravity * flight;
            const double left = h - flight;
            const double a1 = falls(x, v), v2 = v + 0.5 * left * a1;
            const double a2 = falls(x + 0.5 * left * v, v2), v3 = v + 0.5 * left * a2;
            const double a3 = falls(x + 0.5 * left * v2, v3), v4 = v + left * a3;
            const double a4 = falls(x + left * v3, v4);
            x += left / 6.0 * (v + 2.0 * v2 + 2.0 * v3 + v4);
            v += left / 6.0 * (a1 + 2.0 * a2 + 2.0 * a3 + a4);
        }
    }
    const double scale = quantity == ringwright::MeasuredQuantity::acceleration ? gravity : gravity / (w * w);
    add_noise(samples, scale, rate_hz, noise, generator);
    Simulated simulated = with_samples(std::move(samples), rate_hz, quantity);
    simulated.begins = {contact_since};
    simulated.samples_per_cycle = rate_hz / mode.frequency_hz;
    return simulated;
}

}  // namespace simulator
