#include "support/simulated_law.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace simulated {

namespace {

struct Point {
    double x = 0.0, v = 0.0;
};

double acceleration(const Law& law, const Point& p, double direction) {
    const double damping = direction > 0.0 ? law.compression : law.rebound;
    return (-law.stiffness * p.x - law.cubic * p.x * p.x * p.x - law.friction * direction - damping * p.v -
            law.quadratic * p.v * std::abs(p.v)) /
           law.mass;
}

Point step(const Law& law, const Point& p, double direction, double h) {
    const auto rate = [&](const Point& at) { return Point{at.v, acceleration(law, at, direction)}; };
    const auto moved = [](const Point& from, const Point& by, double t) {
        return Point{from.x + by.x * t, from.v + by.v * t};
    };
    const Point a = rate(p), b = rate(moved(p, a, h / 2.0)), c = rate(moved(p, b, h / 2.0)),
                d = rate(moved(p, c, h));
    return {p.x + h / 6.0 * (a.x + 2.0 * b.x + 2.0 * c.x + d.x),
            p.v + h / 6.0 * (a.v + 2.0 * b.v + 2.0 * c.v + d.v)};
}

// One mass at rest or moving in one direction.
class Walker {
  public:
    explicit Walker(const Law& law) : law_(law), at_{law.release, 0.0} { set_off(); }

    void advance(double time) {
        while (time > 0.0 && direction_ != 0.0) {
            const Point next = step(law_, at_, direction_, time);
            if (next.v * direction_ >= 0.0) {
                at_ = next;
                return;
            }
            double low = 0.0, high = time;
            for (int i = 0; i < 60; ++i) {
                const double middle = 0.5 * (low + high);
                (step(law_, at_, direction_, middle).v * direction_ > 0.0 ? low : high) = middle;
            }
            at_ = step(law_, at_, direction_, high);
            at_.v = 0.0;
            time -= high;
            set_off();
        }
    }
    [[nodiscard]] const Point& at() const { return at_; }
    [[nodiscard]] double acceleration_now() const {
        return direction_ == 0.0 ? 0.0 : acceleration(law_, at_, direction_);
    }

  private:
    void set_off() {
        const double spring = law_.stiffness * at_.x + law_.cubic * at_.x * at_.x * at_.x;
        direction_ = std::abs(spring) <= law_.friction ? 0.0 : (spring > 0.0 ? -1.0 : 1.0);
    }
    Law law_;
    Point at_;
    double direction_ = 0.0;
};

const std::vector<double>& channel_of(const Motion& motion, ringwright::MeasuredQuantity quantity) {
    if (quantity == ringwright::MeasuredQuantity::velocity) return motion.velocity;
    return quantity == ringwright::MeasuredQuantity::acceleration ? motion.acceleration : motion.displacement;
}

// After the last sample that is further than `noise` from where the motion ends.
std::size_t end_of_swing(const std::vector<double>& values, double noise) {
    std::size_t end = values.size();
    while (end > 1 && std::abs(values[end - 1] - values.back()) < noise) --end;
    return end;
}

}  // namespace

double Law::angular_frequency() const {
    return std::sqrt(stiffness / mass);
}

Motion integrate(const Law& law, double rate_hz, std::size_t samples, int substeps) {
    Motion motion;
    Walker walker(law);
    for (std::size_t i = 0; i < samples; ++i) {
        motion.displacement.push_back(walker.at().x);
        motion.velocity.push_back(walker.at().v);
        motion.acceleration.push_back(walker.acceleration_now());
        for (int k = 0; k < substeps; ++k) walker.advance(1.0 / rate_hz / substeps);
    }
    return motion;
}

Sample draw(const Law& law, const Bench& bench, Deviates& deviates) {
    const auto held = static_cast<std::size_t>(std::lround(bench.held_s * bench.rate_hz));
    const auto decay = static_cast<std::size_t>(std::lround(bench.length_s * bench.rate_hz));
    const Motion motion = integrate(law, bench.rate_hz, decay);
    const std::vector<double>& values = channel_of(motion, bench.quantity);
    double largest = 0.0;
    for (const double v : values) largest = std::max(largest, std::abs(v));
    const double sigma = largest * std::pow(10.0, -bench.signal_to_noise_db / 20.0);
    const double phi = bench.noise_correlation;
    Sample sample;
    auto& recording = sample.recording;
    recording.clock.sample_rate_hz = bench.rate_hz;
    recording.quantity = bench.quantity;
    double noise = sigma * deviates.normal();
    for (std::size_t i = 0; i < held + decay; ++i) {
        const bool displaced = bench.quantity == ringwright::MeasuredQuantity::displacement;
        const double before = displaced ? law.release : 0.0;
        recording.samples.push_back((i < held ? before : values[i - held]) + bench.offset + noise);
        noise = phi * noise + std::sqrt(1.0 - phi * phi) * sigma * deviates.normal();
    }
    auto& event = sample.event;
    event.begin = held;
    event.rest_end = held + decay;
    event.end = std::min(event.rest_end, held + std::max<std::size_t>(40, end_of_swing(values, sigma)));
    event.frequency_guess_hz = law.angular_frequency() / (2.0 * std::numbers::pi);
    event.noise_level = sigma;
    event.start_amplitude = largest;
    return sample;
}

}  // namespace simulated
