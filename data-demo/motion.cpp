#include "motion.hpp"

#include <algorithm>
#include <cmath>
#include <functional>
#include <numbers>

namespace demo {
namespace {

constexpr double pi = std::numbers::pi;
constexpr double gravity = 9.80665;  // m/s²

using Acceleration = std::function<double(double time_s, const State& state)>;

/// One step of the classical fourth-order Runge–Kutta method.
State stepped(const Acceleration& acceleration, double time_s, const State& at, double step_s) {
    const auto moved = [&](const State& slope, double share) {
        return State{at.position + share * step_s * slope.position,
                     at.velocity + share * step_s * slope.velocity};
    };
    const auto slope_at = [&](double time, const State& state) {
        return State{state.velocity, acceleration(time, state)};
    };
    const State first = slope_at(time_s, at);
    const State second = slope_at(time_s + step_s / 2, moved(first, 0.5));
    const State third = slope_at(time_s + step_s / 2, moved(second, 0.5));
    const State fourth = slope_at(time_s + step_s, moved(third, 1.0));
    const auto mean = [&](double State::*part) {
        return (first.*part + 2.0 * second.*part + 2.0 * third.*part + fourth.*part) / 6.0;
    };
    return {at.position + step_s * mean(&State::position), at.velocity + step_s * mean(&State::velocity)};
}

/// Zero to one with no jump in slope.
double eased(double share) {
    const double x = std::clamp(share, 0.0, 1.0);
    return x * x * (3.0 - 2.0 * x);
}

/// Tremor of a hand: three sinusoids about 9 Hz (physiological tremor lies between 8 and 12 Hz; common
/// practice, no source).
struct Tremor {
    double amplitude = 0.0;
    double phases[3] = {};
    [[nodiscard]] double at(double time_s) const {
        double sum = 0.0;
        for (int i = 0; i < 3; ++i) sum += std::sin(2.0 * pi * (8.3 + 0.9 * i) * time_s + phases[i]);
        return amplitude * sum / std::sqrt(1.5);
    }
};

double held_position(const HandPull& pull, const Tremor& tremor, double time_s) {
    const double share = eased((time_s - pull.start_s) / pull.draw_s);
    return share * (pull.distance + tremor.at(time_s));
}

/// Steps the article over one sample, in `parts` parts.
State over_sample(const Acceleration& acceleration, State state, double from_s, double length_s, int parts) {
    const double step = length_s / parts;
    for (int i = 0; i < parts; ++i) state = stepped(acceleration, from_s + i * step, state, step);
    return state;
}

}  // namespace

double Random::uniform() {
    state_ += 0x9E3779B97F4A7C15ULL;
    std::uint64_t z = state_;
    z = (z ^ (z >> 30)) * 0xBF58476D1CE4E5B9ULL;
    z = (z ^ (z >> 27)) * 0x94D049BB133111EBULL;
    z ^= z >> 31;
    return (static_cast<double>(z >> 11) + 0.5) * 0x1.0p-53;
}

double Random::normal() {
    const double radius = std::sqrt(-2.0 * std::log(uniform()));
    return radius * std::cos(2.0 * pi * uniform());
}

double Oscillator::natural_frequency_hz() const {
    return std::sqrt(stiffness / mass) / (2.0 * pi);
}
double Oscillator::damping_ratio() const {
    return damping / (2.0 * std::sqrt(stiffness * mass));
}

std::vector<double> pulled_motion(const Oscillator& article, const std::vector<HandPull>& pulls,
                                  double rate_hz, double duration_s, Random& random) {
    std::vector<double> positions;
    State state;
    std::size_t next = 0;
    Tremor tremor;
    double force_at_release = 0.0, released_s = -1.0, let_go_s = 1.0;
    const Acceleration free = [&](double time_s, const State& at) {
        const double grip = force_at_release * (1.0 - eased((time_s - released_s) / let_go_s));
        return (grip - article.damping * at.velocity - article.stiffness * at.position) / article.mass;
    };
    const auto count = static_cast<std::size_t>(duration_s * rate_hz);
    for (std::size_t i = 0; i < count; ++i) {
        const double time_s = static_cast<double>(i) / rate_hz;
        positions.push_back(state.position);
        if (next < pulls.size() && time_s >= pulls[next].start_s) {
            const HandPull& pull = pulls[next];
            if (tremor.amplitude == 0.0)
                tremor = {pull.tremor,
                          {6.28 * random.uniform(), 6.28 * random.uniform(), 6.28 * random.uniform()}};
            const double after = time_s + 1.0 / rate_hz;
            const double before = held_position(pull, tremor, time_s);
            state = {held_position(pull, tremor, after),
                     (held_position(pull, tremor, after) - before) * rate_hz};
            if (after < pull.start_s + pull.draw_s + pull.hold_s) continue;
            force_at_release = article.stiffness * state.position;
            released_s = after;
            let_go_s = pull.let_go_s;
            tremor.amplitude = 0.0;
            ++next;
            continue;
        }
        state = over_sample(free, state, time_s, 1.0 / rate_hz, 8);
    }
    return positions;
}

std::vector<double> struck_acceleration(const Oscillator& mode, const Blow& blow, double rate_hz,
                                        double duration_s) {
    const Acceleration acceleration = [&](double time_s, const State& at) {
        const double share = (time_s - blow.start_s) / blow.length_s;
        const double force = share > 0.0 && share < 1.0 ? blow.peak_force * std::sin(pi * share) : 0.0;
        return (force - mode.damping * at.velocity - mode.stiffness * at.position) / mode.mass;
    };
    std::vector<double> values;
    State state;
    const auto count = static_cast<std::size_t>(duration_s * rate_hz);
    for (std::size_t i = 0; i < count; ++i) {
        const double time_s = static_cast<double>(i) / rate_hz;
        values.push_back(acceleration(time_s, state));
        state = over_sample(acceleration, state, time_s, 1.0 / rate_hz, 4);
    }
    return values;
}

std::vector<double> dropped_height(const Oscillator& on_cushion, double height, double release_s,
                                   double rate_hz, double duration_s) {
    const Acceleration acceleration = [&](double, const State& at) {
        const double push = -on_cushion.stiffness * at.position - on_cushion.damping * at.velocity;
        return (at.position < 0.0 ? std::max(push, 0.0) : 0.0) / on_cushion.mass - gravity;
    };
    std::vector<double> heights;
    State state{height, 0.0};
    const auto count = static_cast<std::size_t>(duration_s * rate_hz);
    for (std::size_t i = 0; i < count; ++i) {
        const double time_s = static_cast<double>(i) / rate_hz;
        heights.push_back(state.position);
        if (time_s >= release_s) state = over_sample(acceleration, state, time_s, 1.0 / rate_hz, 64);
    }
    return heights;
}

}  // namespace demo
