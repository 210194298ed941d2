#include "event/drop_motion.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

constexpr std::size_t most_bounces = 12;
constexpr std::size_t fewest_points = 24;

double cycle_of(const DecayShape& shape) {
    return 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
}

using Trial = MotionTrial<DropNumbers>;

/// Moments of release, frequencies and damping ratios about those expected.
std::vector<Trial> grid(std::span<const double> points, const DropSearch& search, double gravity) {
    constexpr double moments_a_cycle = 24.0;
    const double step = std::max(1.0, cycle_of(search.like.shape) / moments_a_cycle);
    std::vector<Trial> trials;
    for (double release = search.latest; release > search.earliest; release -= step)
        for (const double faster : {0.92, 1.0, 1.09, 1.18})
            for (const double damped : {0.7, 1.2}) {
                DropNumbers numbers = search.like;
                numbers.release = release;
                numbers.shape.undamped_angular_frequency *= faster;
                numbers.shape.damping_ratio *= damped;
                const DropMotion motion(numbers, gravity);
                if (motion.height() > 0.0) trials.push_back({numbers, sum_left_by(motion, points)});
            }
    return trials;
}

DropFit refine(std::span<const double> points, const DropNumbers& start, double gravity) {
    // Hold, rest, release, ln ω, ln ζ.
    const auto make = [gravity](const Eigen::VectorXd& at) {
        constexpr double slowest = 1e-4, fastest = 3.0, least_damping = 1e-4, most_damping = 3.0;
        return DropMotion({at(0),
                           at(1),
                           at(2),
                           {std::clamp(std::exp(at(3)), slowest, fastest),
                            std::clamp(std::exp(at(4)), least_damping, most_damping)}},
                          gravity);
    };
    const double size = 1e-3 * std::abs(start.rest - start.hold);
    Eigen::VectorXd at(5), steps(5);
    at << start.hold, start.rest, start.release, std::log(start.shape.undamped_angular_frequency),
        std::log(start.shape.damping_ratio);
    steps << size, size, 1e-2, 1e-4, 1e-4;
    return fit_motion(points, make, at, steps);
}

}  // namespace

DropMotion::DropMotion(const DropNumbers& numbers, double gravity) : numbers_(numbers), gravity_(gravity) {
    const double omega = numbers.shape.undamped_angular_frequency;
    down_ = numbers.rest > numbers.hold ? 1.0 : -1.0;
    sag_ = gravity / (omega * omega);
    height_ = std::abs(numbers.rest - numbers.hold) - sag_;
    phases_.push_back({numbers.release, height_ > 0.0, -sag_ - height_, 0.0});
    for (std::size_t bounce = 0; bounce < most_bounces; ++bounce) {
        if (phases_.back().free) phases_.push_back(contact_after(phases_.back()));
        const std::optional<Phase> flight = flight_after(phases_.back());
        if (!flight) return;
        phases_.push_back(*flight);
    }
    phases_.push_back(contact_after(phases_.back()));
}

double DropMotion::push(double way, double speed) const {
    const double omega = numbers_.shape.undamped_angular_frequency;
    return omega * omega * (way + sag_) + 2.0 * numbers_.shape.decay_rate() * speed;
}

DecayAmplitudes DropMotion::swing_in(const Phase& contact) const {
    return {contact.way, contact.speed + numbers_.shape.decay_rate() * contact.way};
}

double DropMotion::way_in(const Phase& phase, double t) const {
    const double after = t - phase.begin;
    if (phase.free) return phase.way + after * (phase.speed + 0.5 * gravity_ * after);
    return swing_in(phase).at(decay_terms(numbers_.shape, after));
}

double DropMotion::speed_in(const Phase& phase, double t) const {
    const double after = t - phase.begin;
    if (phase.free) return phase.speed + gravity_ * after;
    return rate_of(numbers_.shape, swing_in(phase)).at(decay_terms(numbers_.shape, after));
}

/// Of a flight from below the level of first touch the damper, drawn out, may push again before the mass has
/// risen to that level: the push F₀ + Ḟ₀t + ω²gt²/2 is 0 at the beginning of the flight. Above the level
/// nothing touches before the mass comes down to it.
DropMotion::Phase DropMotion::contact_after(const Phase& flight) const {
    const double omega = numbers_.shape.undamped_angular_frequency;
    const double rising = omega * omega * flight.speed + 2.0 * numbers_.shape.decay_rate() * gravity_;
    const double pushes_again = -2.0 * rising / (omega * omega * gravity_);
    const double depth = flight.way + sag_;  // below first touch
    const double square = flight.speed * flight.speed - 2.0 * gravity_ * depth;
    double after = std::max(pushes_again, 0.0);
    if (square > 0.0) {
        const double root = std::sqrt(square);
        const double up = (-flight.speed - root) / gravity_, back = (-flight.speed + root) / gravity_;
        if (depth <= 0.0 || up < after) after = back;
    }
    const double t = flight.begin + after;
    return {t, false, way_in(flight, t), speed_in(flight, t)};
}

/// Where spring and damper would begin to pull, within a cycle of the touch; later crests are lower.
std::optional<DropMotion::Phase> DropMotion::flight_after(const Phase& contact) const {
    constexpr double looks = 48.0, fine = 1e-3, none = 1e-9;
    if (numbers_.shape.damping_ratio >= 1.0) return {};
    const double cycle = cycle_of(numbers_.shape), step = cycle / looks;
    const auto pushes = [&](double t) {
        return push(way_in(contact, t), speed_in(contact, t)) > -none * gravity_;
    };
    double held = contact.begin;
    while (held < contact.begin + cycle && pushes(held + step)) held += step;
    if (held >= contact.begin + cycle) return {};
    double free = held + step;
    while (free - held > fine) {
        const double middle = 0.5 * (held + free);
        (pushes(middle) ? held : free) = middle;
    }
    return Phase{free, true, way_in(contact, free), speed_in(contact, free)};
}

std::vector<DropMotion::Free> DropMotion::flights() const {
    std::vector<Free> flights;
    for (std::size_t i = 0; i + 1 < phases_.size(); ++i)
        if (phases_[i].free) flights.push_back({phases_[i].begin, phases_[i + 1].begin});
    return flights;
}

double DropMotion::value_at(double t) const {
    if (t < numbers_.release) return numbers_.hold;
    std::size_t i = phases_.size() - 1;
    while (i > 0 && t < phases_[i].begin) --i;
    return numbers_.rest + down_ * way_in(phases_[i], t);
}

std::optional<DropFit> fit_drop(std::span<const double> points, const DropSearch& search, double gravity) {
    constexpr std::size_t kept = 3;
    if (points.size() < fewest_points) return {};
    return best_refined(grid(points, search, gravity), kept,
                        [&](const DropNumbers& start) { return refine(points, start, gravity); });
}

}  // namespace ringwright::event_search
