#pragma once
// Whether spring and damper push on a mass that a free decay is said to describe.

#include <cstddef>
#include <optional>

#include "event/decay_shape.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::event_search {

/// How a recording shows a mass that fell onto its spring. `down` is +1 where a downward motion raises the
/// recorded value, else −1; `gravity` as the sensor shows it, in units of the recording's displacement,
/// velocity or acceleration and its steps (displacement: a step², velocity: a step).
struct Footing {
    MeasuredQuantity quantity = MeasuredQuantity::displacement;
    double down = 1.0;
    double gravity = 0.0;
};

/// The motion of a fitted decay about its rest position, downwards positive, all as e^(−st)[A·C + B·S].
class Swing {
  public:
    Swing(const DecayFit& fit, const Footing& footing);
    /// Whether spring and damper push at t: the mass lies at or below the level of first touch, the rest
    /// position less g/ω_n², and does not have to fall faster than gravity lets it. They push and cannot
    /// pull, so that the decay is no motion of the mass where this does not hold.
    [[nodiscard]] bool pushed(double t) const;
    /// The last t in [from, to] at which it is not pushed, to a hundredth of a step; nothing where it is
    /// pushed all along.
    [[nodiscard]] std::optional<double> last_free(double from, double to) const;

  private:
    [[nodiscard]] DecayAmplitudes integral_of(const DecayAmplitudes& amplitudes) const;
    DecayShape shape_;
    double gravity_ = 0.0;
    DecayAmplitudes way_, acceleration_;
};

}  // namespace ringwright::event_search
