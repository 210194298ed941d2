#pragma once
// The whole motion of a drop: hold, fall, bounces and the swing in the last contact as one.

#include <cstddef>
#include <optional>
#include <span>
#include <vector>

#include "event/decay_shape.hpp"
#include "event/motion_fit.hpp"

namespace ringwright::event_search {

/// What determines a drop where gravity is known: height of the fall and static deflection follow.
struct DropNumbers {
    double hold = 0.0, rest = 0.0;  ///< unit of the recorded displacement
    double release = 0.0;           ///< steps
    DecayShape shape;               ///< per step, in contact
};

/// A mass that is held at rest, let go, falls, and swings on a spring and damper of one mode that push and
/// cannot pull. Displacement in the unit of `numbers`, time in steps.
class DropMotion {
  public:
    /// `gravity` > 0 in units a step².
    DropMotion(const DropNumbers& numbers, double gravity);
    [[nodiscard]] const DropNumbers& numbers() const { return numbers_; }
    /// +1 where the recorded value rises when the mass goes down, else −1.
    [[nodiscard]] double down() const { return down_; }
    /// From the hold to the level of first touch; not above zero where the mass is held in contact.
    [[nodiscard]] double height() const { return height_; }
    /// Free flights, the fall first, as moments; none where the height is not above zero.
    struct Free {
        double begin = 0.0, end = 0.0;
    };
    [[nodiscard]] std::vector<Free> flights() const;
    /// The moment from which on the mass stays in contact.
    [[nodiscard]] double contact_since() const { return phases_.back().begin; }
    [[nodiscard]] double value_at(double t) const;

  private:
    struct Phase {
        double begin = 0.0;
        bool free = false;
        double way = 0.0, speed = 0.0;  ///< about the rest position, downwards, at `begin`
    };
    [[nodiscard]] Phase contact_after(const Phase& flight) const;
    [[nodiscard]] std::optional<Phase> flight_after(const Phase& contact) const;
    [[nodiscard]] DecayAmplitudes swing_in(const Phase& contact) const;
    [[nodiscard]] double way_in(const Phase& phase, double t) const;
    [[nodiscard]] double speed_in(const Phase& phase, double t) const;
    /// Force of spring and damper a mass.
    [[nodiscard]] double push(double way, double speed) const;

    DropNumbers numbers_;
    double gravity_ = 0.0, down_ = 1.0, sag_ = 0.0, height_ = 0.0;
    std::vector<Phase> phases_;
};

using DropFit = MotionFit<DropMotion>;

/// Numbers about as they are expected, and the moments between which the release is looked for.
struct DropSearch {
    DropNumbers like;
    double earliest = 0.0, latest = 0.0;
};

/// By least squares, from the best of a grid of moments of release and of shapes about the expected one.
/// Nothing where no start on the grid falls freely.
[[nodiscard]] std::optional<DropFit> fit_drop(std::span<const double> points, const DropSearch& search,
                                              double gravity);

}  // namespace ringwright::event_search
