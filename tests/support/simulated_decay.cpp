#include "support/simulated_decay.hpp"

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <numbers>

namespace simulated {

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

// Displacement of a plucked oscillator, start amplitude 1, released at t = 0 from rest.
double pluck(double frequency_hz, double zeta, double t) {
    if (t <= 0.0) return 1.0;
    const double omega = two_pi * frequency_hz, s = zeta * omega, p = omega * omega * (1.0 - zeta * zeta);
    const double root = std::sqrt(std::abs(p));
    if (std::abs(p) * t * t < 1e-8) return std::exp(-s * t) * (1.0 + s * t);
    if (p > 0.0) return std::exp(-s * t) * (std::cos(root * t) + s * std::sin(root * t) / root);
    const double slow = std::exp(-(s - root) * t), fast = std::exp(-(s + root) * t);
    return 0.5 * (slow + fast) + 0.5 * s * (slow - fast) / root;
}

// The same where the holding force falls to nothing along a straight line: the mean of releases at each
// instant of it, by the midpoint rule.
double let_go(const Truth& truth, double t) {
    const double length = truth.letting_go_cycles / truth.frequency_hz;
    if (length == 0.0) return pluck(truth.frequency_hz, truth.damping_ratio, t);
    constexpr int parts = 50;
    double sum = 0.0;
    for (int i = 0; i < parts; ++i)
        sum += pluck(truth.frequency_hz, truth.damping_ratio, t - length * (i + 0.5) / parts);
    return sum / parts;
}

}  // namespace

double Deviates::normal() {
    if (stored_) {
        stored_ = false;
        return next_;
    }
    double u = 0.0, v = 0.0, q = 0.0;
    do {
        u = 2.0 * uniform() - 1.0;
        v = 2.0 * uniform() - 1.0;
        q = u * u + v * v;
    } while (q >= 1.0 || q == 0.0);
    const double factor = std::sqrt(-2.0 * std::log(q) / q);
    next_ = v * factor;
    stored_ = true;
    return u * factor;
}

Sample draw(const Truth& truth, Deviates& deviates) {
    const double rate = truth.frequency_hz * truth.samples_per_cycle;
    const auto held = static_cast<std::size_t>(std::lround(truth.held_cycles * truth.samples_per_cycle));
    const auto decay = static_cast<std::size_t>(std::lround(truth.cycles * truth.samples_per_cycle));
    const double sigma = std::pow(10.0, -truth.signal_to_noise_db / 20.0), phi = truth.noise_correlation;
    const double hum_phase = two_pi * deviates.uniform();
    Sample sample;
    auto& recording = sample.recording;
    recording.clock.sample_rate_hz = rate;
    double noise = sigma * deviates.normal();
    for (std::size_t i = 0; i < held + decay; ++i) {
        const double jitter = truth.jitter_share * deviates.normal() / rate;
        const double t = (static_cast<double>(i) - static_cast<double>(held)) / rate + jitter;
        if (truth.jitter_share > 0.0) recording.clock.times_s.push_back(t);
        double y = let_go(truth, t) + truth.offset + noise;
        y += truth.hum_share * std::sin(two_pi * truth.hum_hz * t + hum_phase);
        if (truth.clip_share > 0.0) {
            const double high = truth.offset + truth.clip_share, low = truth.offset - truth.clip_share;
            if (y >= high || y <= low) {
                y = std::clamp(y, low, high);
                if (!recording.clipped.empty() && recording.clipped.back().end == i)
                    recording.clipped.back().end = i + 1;
                else
                    recording.clipped.push_back({i, i + 1});
            }
        }
        if (truth.bits > 0) {
            const double step = 2.4 / std::pow(2.0, truth.bits);
            y = std::round(y / step) * step;
            recording.resolution = step;
        }
        recording.samples.push_back(y);
        noise = phi * noise + std::sqrt(1.0 - phi * phi) * sigma * deviates.normal();
    }
    auto& event = sample.event;
    event.begin = held;
    event.rest_end = held + decay;
    const double fall =
        truth.damping_ratio < 1.0
            ? truth.damping_ratio
            : 1.0 / (truth.damping_ratio + std::sqrt(truth.damping_ratio * truth.damping_ratio - 1.0));
    const double to_noise = std::log(1.0 / sigma) / (two_pi * fall) * truth.samples_per_cycle;
    event.end =
        std::min(event.rest_end, held + std::max<std::size_t>(16, static_cast<std::size_t>(to_noise)));
    event.frequency_guess_hz = truth.damping_ratio < 0.3 ? truth.frequency_hz * 1.01 : 0.0;
    event.noise_level = sigma;
    event.start_amplitude = 1.0;
    return sample;
}

Bound cramer_rao(const Truth& truth) {
    const auto n = static_cast<Eigen::Index>(std::lround(truth.cycles * truth.samples_per_cycle));
    const double rate = truth.frequency_hz * truth.samples_per_cycle;
    const double sigma = std::pow(10.0, -truth.signal_to_noise_db / 20.0), phi = truth.noise_correlation;
    Eigen::MatrixXd design(n, 5);
    const auto velocity_like = [&](double f, double z,
                                   double t) {  // the second solution, by differencing the first
        const double h = 1e-4 / f;
        return (pluck(f, z, t + h) - pluck(f, z, std::max(t - h, 0.0))) / (t > h ? 2.0 * h : h + t) / f;
    };
    for (Eigen::Index i = 0; i < n; ++i) {
        const double t = (static_cast<double>(i) + 0.0) / rate, f = truth.frequency_hz,
                     z = truth.damping_ratio;
        constexpr double h = 1e-5;
        design(i, 0) = (pluck(f * (1.0 + h), z, t) - pluck(f * (1.0 - h), z, t)) / (2.0 * h);
        design(i, 1) = (pluck(f, z + h, t) - pluck(f, z - h, t)) / (2.0 * h);
        design(i, 2) = 1.0;
        design(i, 3) = pluck(f, z, t);
        design(i, 4) = velocity_like(f, z, t);
    }
    for (Eigen::Index i = n - 1; i > 0; --i)
        design.row(i) = (design.row(i) - phi * design.row(i - 1)) / std::sqrt(1.0 - phi * phi);
    const Eigen::MatrixXd information = design.transpose() * design / (sigma * sigma);
    const Eigen::MatrixXd covariance = information.llt().solve(Eigen::MatrixXd::Identity(5, 5));
    return {std::sqrt(covariance(0, 0)), std::sqrt(covariance(1, 1))};
}

}  // namespace simulated
