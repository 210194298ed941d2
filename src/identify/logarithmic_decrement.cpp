#include "identify/logarithmic_decrement.hpp"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double smallest_ratio = 5.0;  // of a difference to its own standard deviation
constexpr std::size_t fewest_extremes = 3;
constexpr double half_window = 0.125;  // cycles to each side of the vertex

struct Extreme {
    double time = 0.0, value = 0.0;
};

struct Window {
    Index first = 0, last = 0;
    bool operator==(const Window&) const = default;
};

// The first sample for which `reached(time)`: where steps are equal, a step or so from where it must be.
template <typename Reached>
Index first_sample(const DecaySamples& samples, double near_time, Reached reached) {
    const VectorXd& time = samples.time;
    if (!samples.uniform || samples.stretches.size() != 1)
        return std::partition_point(time.begin(), time.end(), [&](double t) { return !reached(t); }) -
               time.begin();
    const double steps = std::ceil((near_time - time(0)) / samples.step_s);
    auto at = static_cast<Index>(std::clamp(steps, 0.0, static_cast<double>(time.size())));
    while (at > 0 && reached(time(at - 1))) --at;
    while (at < time.size() && !reached(time(at))) ++at;
    return at;
}

Window window_about(const DecaySamples& samples, double centre, double half_width) {
    const double begin = centre - half_width, end = centre + half_width;
    return {first_sample(samples, begin, [&](double t) { return t >= begin; }),
            first_sample(samples, end, [&](double t) { return t > end; })};
}

// Coefficients of 1, x, x² from the sums of xⁱ (i = 0 … 4) and of y xⁱ (i = 0 … 2), by Cholesky's factor; not
// finite where three samples do not make a parabola.
std::array<double, 3> parabola(const std::array<double, 5>& s, const std::array<double, 3>& m) {
    const double l00 = std::sqrt(s[0]), l10 = s[1] / l00, l20 = s[2] / l00;
    const double l11 = std::sqrt(s[2] - l10 * l10), l21 = (s[3] - l20 * l10) / l11;
    const double l22 = std::sqrt(s[4] - l20 * l20 - l21 * l21);
    const double y0 = m[0] / l00, y1 = (m[1] - l10 * y0) / l11, y2 = (m[2] - l20 * y0 - l21 * y1) / l22;
    const double c2 = y2 / l22, c1 = (y1 - l21 * c2) / l11;
    return {(y0 - l10 * c1 - l20 * c2) / l00, c1, c2};
}

// Parabola by least squares over the samples of a window (moments about its centre).
std::optional<Extreme> vertex_within(const DecaySamples& samples, const Window& window, double centre,
                                     double half_width) {
    const auto [first, last] = window;
    if (last - first < 3) return std::nullopt;
    std::array<double, 5> s{};
    std::array<double, 3> m{};
    for (Index i = first; i < last; ++i) {
        const double x = (samples.time(i) - centre) / half_width, y = samples.value(i);
        const double x2 = x * x;
        s[0] += 1.0;
        s[1] += x;
        s[2] += x2;
        s[3] += x2 * x;
        s[4] += x2 * x2;
        m[0] += y;
        m[1] += y * x;
        m[2] += y * x2;
    }
    const auto [c0, c1, c2] = parabola(s, m);
    if (!std::isfinite(c0) || !std::isfinite(c1) || !std::isfinite(c2) || c2 == 0.0) return std::nullopt;
    const double x = std::clamp(-c1 / (2.0 * c2), -1.5, 1.5);
    return Extreme{centre + x * half_width, c0 + x * (c1 + x * c2)};
}

// The vertex, the window centred on it by two further passes; nothing when it lies farther than `reach` from
// where it should be.
std::optional<Extreme> refine(const DecaySamples& samples, double expected, double half_width, double reach) {
    constexpr int most_passes = 3;
    std::optional<Extreme> extreme;
    Window window = window_about(samples, expected, half_width);
    double time = expected;
    for (int pass = 0; pass < most_passes; ++pass) {
        extreme = vertex_within(samples, window, time, half_width);
        if (!extreme || std::abs(extreme->time - expected) > reach) return std::nullopt;
        time = extreme->time;
        const Window moved = window_about(samples, time, half_width);
        if (moved == window) break;  // the same samples have the same parabola
        window = moved;
    }
    return extreme;
}

std::vector<Extreme> find_extremes(const DecaySamples& samples, const DecrementSettings& settings) {
    std::vector<Extreme> extremes;
    const double half_width = 2.0 * half_window * settings.half_period_s;
    for (int i = 0; i < settings.extremes; ++i) {
        const double expected = settings.first_time_s + i * settings.half_period_s;
        const std::optional<Extreme> extreme =
            refine(samples, expected, half_width, 0.4 * settings.half_period_s);
        if (!extreme) break;
        if (extremes.size() >= 2) {  // signs alternate
            const double last = extremes.back().value - extremes[extremes.size() - 2].value;
            if (last * (extreme->value - extremes.back().value) >= 0.0) break;
        }
        extremes.push_back(*extreme);
    }
    return extremes;
}

// Generalised least squares of ln D on its number; neighbouring differences share an extreme (correlation
// −1/2). Covariance of ln D for differences of the sizes given is tridiagonal; its Cholesky factor has two
// diagonals.
VectorXd solve_weighted(const MatrixXd& design, const VectorXd& response, const VectorXd& size) {
    const Index n = size.size();
    MatrixXd whitened(n, design.cols() + 1);
    whitened << design, response;
    double below = 0.0, diagonal = 0.0;
    for (Index i = 0; i < n; ++i) {
        const double variance = 2.0 / (size(i) * size(i));
        below = i > 0 ? -1.0 / (size(i) * size(i - 1)) / diagonal : 0.0;
        diagonal = std::sqrt(variance - below * below);
        if (i > 0) whitened.row(i) -= below * whitened.row(i - 1);
        whitened.row(i) /= diagonal;
    }
    const MatrixXd left = whitened.leftCols(design.cols());
    return (left.transpose() * left).ldlt().solve(left.transpose() * whitened.col(design.cols()));
}

}  // namespace

DecrementSettings choose_decrement_settings(const DecaySamples& samples, const Oscillator& oscillator,
                                            double cosine_amplitude, double sine_amplitude, double noise) {
    DecrementSettings settings;
    const double pi = std::numbers::pi, turn = 2.0 * pi * oscillator.damped_frequency_hz();
    const double decay = oscillator.decay_rate();
    settings.half_period_s = pi / turn;
    const double half_width = 2.0 * half_window * settings.half_period_s;
    // e^(−st)(A cos + B' sin) turns where (B' √p − A s) cos = (A √p + B' s) sin.
    const double sine = sine_amplitude * oscillator.angular_frequency() / turn;
    double first =
        std::atan2(sine * turn - cosine_amplitude * decay, cosine_amplitude * turn + sine * decay) / turn;
    while (first < samples.time(0) + half_width) first += settings.half_period_s;
    settings.first_time_s = first;
    const double size =
        std::hypot(cosine_amplitude, sine) * (1.0 + std::exp(-decay * settings.half_period_s));
    const double per_extreme = std::max(1.0, 2.0 * half_width / samples.step_s);
    const double deviation = 1.5 * noise * std::sqrt(2.0 / per_extreme);
    const double last_time = samples.time(samples.size() - 1) - half_width;
    for (double time = first; time <= last_time; time += settings.half_period_s) {
        const double difference = size * std::exp(-decay * (time - settings.half_period_s));
        if (settings.extremes > 0 && difference < smallest_ratio * deviation) break;
        ++settings.extremes;
    }
    return settings;
}

DecrementReading read_decrement(const DecaySamples& samples, const DecrementSettings& settings) {
    DecrementReading reading;
    const std::vector<Extreme> extremes = find_extremes(samples, settings);
    if (extremes.size() < fewest_extremes) {
        reading.reason =
            fmt::format("only {} extreme{} stand{} above the noise; at least {} are needed", extremes.size(),
                        extremes.size() == 1 ? "" : "s", extremes.size() == 1 ? "s" : "", fewest_extremes);
        return reading;
    }
    const auto n = static_cast<Index>(extremes.size()) - 1;
    VectorXd logarithm(n), size(n), number(n);
    for (Index j = 0; j < n; ++j) {
        size(j) = std::abs(extremes[static_cast<std::size_t>(j + 1)].value -
                           extremes[static_cast<std::size_t>(j)].value);
        logarithm(j) = std::log(size(j));
        number(j) = static_cast<double>(j);
    }
    MatrixXd design(n, 2);
    design << VectorXd::Ones(n), number;
    // Two passes: the weights from the sizes as read, then from the line through them.
    VectorXd line = solve_weighted(design, logarithm, size);
    const VectorXd smooth = (design * line).array().exp();
    line = solve_weighted(design, logarithm, smooth);
    if (n >= 4) {
        MatrixXd bent(n, 3);
        bent << design, number.array().square();
        reading.bend = solve_weighted(bent, logarithm, smooth)(2);
    }
    reading.decrement = -2.0 * line(1);
    reading.damping_ratio = reading.decrement / std::hypot(2.0 * std::numbers::pi, reading.decrement);
    VectorXd times(n + 1), count(n + 1), weight(n + 1);
    for (Index j = 0; j <= n; ++j) {
        times(j) = extremes[static_cast<std::size_t>(j)].time;
        count(j) = static_cast<double>(j);
        weight(j) = std::exp(line(1) * count(j));
        reading.extreme_time.push_back(times(j));
    }
    const VectorXd w = weight.array().square();
    const double mean_count = w.dot(count) / w.sum(), mean_time = w.dot(times) / w.sum();
    const VectorXd centred = count.array() - mean_count;
    const double half_period = (w.array() * centred.array() * (times.array() - mean_time)).sum() /
                               (w.array() * centred.array().square()).sum();
    const double damped = 0.5 / half_period;
    reading.natural_frequency_hz = damped / std::sqrt(1.0 - reading.damping_ratio * reading.damping_ratio);
    reading.half_cycle.assign(number.begin(), number.end());
    reading.log_difference.assign(logarithm.begin(), logarithm.end());
    const VectorXd fitted = design * line;
    reading.line.assign(fitted.begin(), fitted.end());
    reading.valid = std::isfinite(reading.natural_frequency_hz) && std::isfinite(reading.damping_ratio);
    if (!reading.valid) reading.reason = "the extremes do not follow a decay";
    return reading;
}

}  // namespace ringwright::identify
