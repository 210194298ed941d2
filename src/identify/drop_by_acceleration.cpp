#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <numbers>
#include <optional>
#include <span>
#include <vector>

#include "identify/fall_reading.hpp"

namespace ringwright::identify {

namespace {

double square(double value) {
    return value * value;
}

/// A mean of samples and what noise does to it.
struct Level {
    double value = 0.0, variance = 0.0;
};

/// Noise as the decay shows it, or as the stretch itself does, whichever is more.
Level level_of(const Recording& recording, std::size_t begin, std::size_t end, double noise_density) {
    const std::span<const double> y{recording.samples.data() + begin, end - begin};
    const auto n = static_cast<double>(y.size());
    Level level;
    for (const double value : y) level.value += value / n;
    double squares = 0.0;
    for (const double value : y) squares += square(value - level.value);
    const double time = n / recording.clock.sample_rate_hz;
    level.variance = std::max(squares / std::max(1.0, n * (n - 1.0)), noise_density / time);
    return level;
}

/// A moment in the recording, s, and its standard uncertainty.
struct Moment {
    double time_s = 0.0, deviation_s = 0.0;
};

/// Samples [begin, end), as a share of gravity, 0 in free fall: what holds or pushes the mass. Means of
/// blocks where there are more than are needed to place a moment to a thousandth of the fall.
struct Push {
    std::vector<double> time, share;
    double step_s = 0.0;
};

Push push_between(const Recording& recording, std::size_t begin, std::size_t end, double free,
                  double gravity) {
    constexpr std::size_t most = 600;
    end = std::min(end, recording.size());
    const std::size_t block = 1 + (end - begin) / most;
    const double later = 0.5 * static_cast<double>(block - 1) / recording.clock.sample_rate_hz;
    Push push;
    push.step_s = static_cast<double>(block) / recording.clock.sample_rate_hz;
    for (std::size_t i = begin; i + block <= end; i += block) {
        double sum = 0.0;
        for (std::size_t k = i; k < i + block; ++k) sum += recording.samples[k];
        push.time.push_back(recording.clock.time_of(i) + later);
        push.share.push_back((sum / static_cast<double>(block) - free) / gravity);
    }
    return push;
}

/// Sum of squares about a hold of height `held` that is let go within `width` about `middle`, evenly.
double sum_about_release(const Push& push, double held, double middle, double width) {
    double squares = 0.0;
    for (std::size_t i = 0; i < push.time.size(); ++i) {
        const double gone = width > 0.0 ? std::clamp((push.time[i] - middle) / width + 0.5, 0.0, 1.0)
                                        : (push.time[i] < middle ? 0.0 : 1.0);
        squares += square(push.share[i] - held * (1.0 - gone));
    }
    return squares;
}

/// Standard deviation of the moment of a step of height h in white noise of density N, by least squares:
/// √26·N/h² (Ibragimov and Has'minskii 1981, from memory), and of sampling.
double step_deviation(double noise_density, double height, double step_s) {
    return std::hypot(std::sqrt(26.0) * noise_density / square(height), step_s / std::sqrt(12.0));
}

/// When the mass is let go: a step, or a ramp where that explains the samples much better; then known to the
/// time it takes, as a rectangular distribution (JCGM 100, 4.3.7). Nothing where the best place lies at the
/// edge.
std::optional<Moment> release_of(const Push& push, double held, double noise_density) {
    constexpr std::array<double, 8> widths{0.0, 0.002, 0.004, 0.008, 0.015, 0.03, 0.045, 0.06};
    constexpr double better = 9.0;
    double best = std::numeric_limits<double>::infinity();
    Moment moment;
    double of_steps = best;
    for (const double width : widths) {
        if (width > 0.0 && width < 2.0 * push.step_s) continue;
        double least = std::numeric_limits<double>::infinity(), at = 0.0;
        for (const double time : push.time) {
            const double middle = time - 0.5 * push.step_s,
                         sum = sum_about_release(push, held, middle, width);
            if (sum < least) least = sum, at = middle;
        }
        if (width == 0.0) of_steps = least;
        const double variance =
            std::max(noise_density / push.step_s, of_steps / static_cast<double>(push.time.size()));
        if (width > 0.0 && least > best - better * variance) continue;
        best = least;
        moment = {at, std::hypot(step_deviation(noise_density, held, push.step_s), width / std::sqrt(12.0))};
    }
    const double margin = 1.5 * push.step_s;
    if (moment.time_s < push.time.front() + margin || moment.time_s > push.time.back() - margin) return {};
    return moment;
}

/// Push t after a touch at speed v (m/s): that of spring and damper on a mass that comes in from free fall,
/// as a share of gravity g.
double push_after_touch(const Support& support, double v, double g, double t) {
    const double s2 = 2.0 * support.damping_ratio * support.angular_frequency;
    const double jump = g - s2 * v;
    const double rate = -s2 * jump - square(support.angular_frequency) * v;
    return 1.0 - support.motion(jump, rate, t) / g;
}

/// When the mass touches, by least squares over the motion before and after it. Nothing where the best place
/// lies at the edge.
std::optional<Moment> touch_of(const Push& push, const Support& support, double release_s, double g,
                               double noise_density) {
    constexpr double places = 4.0;  // a sample
    double least = std::numeric_limits<double>::infinity(), at = 0.0;
    for (double touch = push.time.front(); touch < push.time.back(); touch += push.step_s / places) {
        const double speed = g * (touch - release_s);
        double squares = 0.0;
        for (std::size_t i = 0; i < push.time.size(); ++i) {
            const double t = push.time[i] - touch;
            squares += square(push.share[i] - (t < 0.0 ? 0.0 : push_after_touch(support, speed, g, t)));
        }
        if (squares < least) least = squares, at = touch;
    }
    const double margin = 2.5 * push.step_s;
    if (at < push.time.front() + margin || at > push.time.back() - margin) return {};
    const double speed = g * (at - release_s), step = 0.25 * push.step_s;
    double information = 0.0;
    for (const double time : push.time) {
        const double t = time - at;
        if (t <= step) continue;
        const double rise =
            push_after_touch(support, speed, g, t + step) - push_after_touch(support, speed, g, t - step);
        information += square(rise / (2.0 * step)) * push.step_s;
    }
    const double by_slope =
        std::hypot(std::sqrt(noise_density / std::max(information, 1e-300)), push.step_s / std::sqrt(12.0));
    const double by_jump =
        step_deviation(noise_density, push_after_touch(support, speed, g, 0.0), push.step_s);
    return Moment{at, std::min(by_slope, by_jump)};
}

/// First sample of what is clipped from `begin` on.
std::size_t clipped_from(const Recording& recording, std::size_t begin) {
    std::size_t first = recording.size();
    for (const SampleRange& range : recording.clipped)
        if (range.end > begin) first = std::min(first, std::max(range.begin, begin));
    return first;
}

/// How long the fall lasted. Nothing where hold, fall and what follows do not go together.
std::optional<Moment> time_of_fall(const Recording& recording, const Event& event, const RestingDecay& decay,
                                   const Level& free, double gravity) {
    constexpr double let_go_s = 0.06, contact = 0.25, like_gravity = 0.3;
    const SampleRange& fall = event.flights.front();
    const double rate = recording.clock.sample_rate_hz, seen = decay.level - free.value;
    const std::size_t time = fall.end - fall.begin;
    const auto margin = static_cast<std::size_t>(std::ceil(let_go_s * rate));
    const std::size_t let_go = fall.begin - std::min(fall.begin, margin);
    const std::size_t before = let_go - std::min(let_go, time + margin);
    if (let_go < before + 8) return {};
    const Level hold = level_of(recording, before, let_go, 0.0);
    const double hold_s = static_cast<double>(let_go - before) / rate;
    const double density = std::max(decay.noise_density, hold.variance * hold_s) / square(seen);
    const double held = (hold.value - free.value) / seen;
    if (std::abs(held - 1.0) > like_gravity) return {};
    const std::size_t middle = fall.begin + time / 2;
    const auto release = release_of(push_between(recording, before, middle, free.value, seen), held, density);
    if (!release) return {};
    const Support support{2.0 * std::numbers::pi * decay.natural_frequency.value, decay.damping_ratio.value,
                          0.0};
    const auto contact_samples =
        static_cast<std::size_t>(std::ceil(contact / decay.natural_frequency.value * rate));
    const std::size_t end = std::min(clipped_from(recording, middle), fall.end + contact_samples);
    if (end < fall.end + 4) return {};
    const Push push = push_between(recording, middle, end, free.value, seen);
    const auto touch = touch_of(push, support, release->time_s, gravity, density);
    if (!touch || !(touch->time_s > release->time_s)) return {};
    return Moment{touch->time_s - release->time_s, std::hypot(release->deviation_s, touch->deviation_s)};
}

}  // namespace

DropReading read_acceleration(const Recording& recording, const Event& event, const RestingDecay& decay,
                              const Gravity& gravity, double confidence_level) {
    const SampleRange& fall = event.flights.front();
    const std::size_t inner = (fall.end - fall.begin) / 5;
    const Level free = level_of(recording, fall.begin + inner, fall.end - inner, decay.noise_density);
    const double freedom = decay.natural_frequency.degrees_of_freedom;
    DropReading reading;
    const double deflection = gravity.value / square(2.0 * std::numbers::pi * decay.natural_frequency.value);
    const double relative =
        2.0 * decay.natural_frequency.standard_uncertainty / decay.natural_frequency.value;
    reading.quantities[Quantity::static_deflection] =
        estimate_of_reading(deflection, deflection * relative, freedom, confidence_level);
    const double shown = std::abs(decay.level - free.value);
    const double shown_off = std::sqrt(square(decay.level_standard_uncertainty) + free.variance +
                                       square(gravity.standard_uncertainty));
    if (disagrees(shown / gravity.value, shown_off / gravity.value, freedom))
        reading.findings.push_back(
            fall_finding(shown, gravity.value, "Between free fall and rest the sensor shows"));
    if (!event.hold_seen) return reading;
    const std::optional<Moment> lasts = time_of_fall(recording, event, decay, free, gravity.value);
    if (!lasts) return reading;
    const double off = lasts->deviation_s / lasts->time_s, speed = gravity.value * lasts->time_s;
    const double height = 0.5 * speed * lasts->time_s;
    reading.quantities[Quantity::drop_height] =
        estimate_of_reading(height, 2.0 * height * off, freedom, confidence_level);
    reading.quantities[Quantity::contact_velocity] =
        estimate_of_reading(speed, speed * off, freedom, confidence_level);
    return reading;
}

}  // namespace ringwright::identify
