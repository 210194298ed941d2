#pragma once
// How the articles of the demo move: Newton's law stepped finely, with a hand, a hammer or a fall.

#include <cstdint>
#include <vector>

namespace demo {

/// SplitMix64 (Steele, Lea & Flood 2014) with a Box–Muller normal: the same numbers with every compiler.
class Random {
  public:
    explicit Random(std::uint64_t seed) : state_(seed) {}
    double uniform();  ///< 0 < u < 1
    double normal();   ///< mean 0, variance 1

  private:
    std::uint64_t state_;
};

/// m ẍ + c ẋ + k x = force.
struct Oscillator {
    double mass = 1.0;       ///< kg
    double damping = 0.0;    ///< N·s/m
    double stiffness = 1.0;  ///< N/m
    [[nodiscard]] double natural_frequency_hz() const;
    [[nodiscard]] double damping_ratio() const;
};

struct State {
    double position = 0.0;  ///< m
    double velocity = 0.0;  ///< m/s
};

/// A hand draws the article aside, holds it with a tremor, and lets go.
struct HandPull {
    double start_s = 0.0;
    double draw_s = 0.6, hold_s = 1.0;  ///< how long it draws and holds
    double distance = 0.005;            ///< m
    double tremor = 15e-6;              ///< m
    double let_go_s = 0.003;            ///< fingers leave within this time
};

/// Position in m at sample/rate for `duration_s`. Four hundred Runge–Kutta steps and more a cycle.
std::vector<double> pulled_motion(const Oscillator& article, const std::vector<HandPull>& pulls,
                                  double rate_hz, double duration_s, Random& random);

/// Half-sine blow of a small hammer.
struct Blow {
    double start_s = 0.0, length_s = 0.002;
    double peak_force = 20.0;  ///< N
};
/// Acceleration in m/s² under the blow.
std::vector<double> struck_acceleration(const Oscillator& mode, const Blow& blow, double rate_hz,
                                        double duration_s);

/// Height in m above the undeformed cushion of a mass that falls on to it; the cushion pushes and never
/// pulls.
std::vector<double> dropped_height(const Oscillator& on_cushion, double height, double release_s,
                                   double rate_hz, double duration_s);

}  // namespace demo
