#pragma once
// A pluck whose hold does not let go at once.

#include <optional>
#include <span>

#include "event/decay_shape.hpp"
#include "event/motion_fit.hpp"

namespace ringwright::event_search {

struct RampNumbers {
    double hold = 0.0, rest = 0.0;  ///< unit of the recorded displacement
    double release = 0.0;           ///< steps: from when the force that holds the mass falls
    double ramp = 0.0;              ///< steps in which it falls evenly to nothing
    DecayShape shape;               ///< per step
};

/// A mass on a spring and damper, held at rest by a force that falls evenly to nothing. Displacement in the
/// unit of the numbers, time in steps. The even fall of the force makes of the motion after a sudden release
/// its mean over the time of the ramp.
class RampedRelease {
  public:
    explicit RampedRelease(const RampNumbers& numbers) : numbers_(numbers) {}
    [[nodiscard]] const RampNumbers& numbers() const { return numbers_; }
    [[nodiscard]] double value_at(double t) const;

  private:
    /// Integral of the motion after a sudden release, 1 before it, from then to t.
    [[nodiscard]] double integral_to(double t) const;
    RampNumbers numbers_;
};

/// By least squares, from the best of a grid of moments of release in [earliest, latest] and of ramps up to
/// half a cycle. Nothing where the grid is empty.
[[nodiscard]] std::optional<MotionFit<RampedRelease>> fit_ramped_release(std::span<const double> points,
                                                                         const RampNumbers& like,
                                                                         double earliest, double latest);

}  // namespace ringwright::event_search
