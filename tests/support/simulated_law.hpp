#pragma once
// Recordings of a mass under a damping law that is not viscous, integrated in small fixed steps: independent
// of the library's own integrator.

#include <vector>

#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"
#include "support/simulated_decay.hpp"

namespace simulated {

/// m a = −k x − k₃ x³ − F sgn(v) − c₊ max(v, 0) − c₋ min(v, 0) − c₂ v|v|, released from rest. SI units.
struct Law {
    double mass = 5.0, stiffness = 8000.0, compression = 10.0, rebound = 10.0;
    double friction = 0.0, quadratic = 0.0, cubic = 0.0;
    double release = 0.030;
    [[nodiscard]] double angular_frequency() const;
};

struct Motion {
    std::vector<double> displacement, velocity, acceleration;
};

/// At t = 0, 1/rate, … from the release; classical Runge–Kutta in `substeps` steps a sample (halved in the
/// swing's last step down to its reversal).
[[nodiscard]] Motion integrate(const Law& law, double rate_hz, std::size_t samples, int substeps = 20);

struct Bench {
    double rate_hz = 1000.0, held_s = 0.4, length_s = 3.0;
    double signal_to_noise_db = 40.0;  // of the largest value after the release over the rms of the noise
    double noise_correlation = 0.0;    // φ of AR(1) noise
    double offset = 0.002;
    ringwright::MeasuredQuantity quantity = ringwright::MeasuredQuantity::displacement;
};

/// A recording with the true event: from the release to where the swings meet the noise or stop.
[[nodiscard]] Sample draw(const Law& law, const Bench& bench, Deviates& deviates);

}  // namespace simulated
