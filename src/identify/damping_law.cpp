#include "identify/damping_law.hpp"

#include <algorithm>
#include <array>
#include <boost/numeric/odeint.hpp>
#include <cassert>
#include <cmath>
#include <numbers>

namespace ringwright::identify {

namespace {

// x, v, then (∂x, ∂v) by each of `parameters` parameters; of a size known to the compiler, so that it needs
// no allocation.
constexpr std::size_t state_size(std::size_t parameters) {
    return 2 + 2 * parameters;
}

constexpr double runaway = 100.0;  // lengths; the motions looked at are of the order of one
constexpr double first_step = 0.05;
/// Steps of the integrator: some fifty a cycle are usual; a law so stiff that it needs ten times as many is
/// none of a swing, and millions of them would be taken.
constexpr double most_steps_a_cycle = 500.0, most_steps_at_least = 2000.0;
constexpr double shortest_swing = 1e-9;  // a force this close to the friction holds, to rounding

// ∂a by each parameter at fixed (x, v).
double explicit_derivative(double stiffness, LawParameter p, double x, double v, double direction) {
    switch (p) {
        case LawParameter::displacement:
        case LawParameter::velocity:
            return 0.0;
        case LawParameter::log_frequency:
            return -2.0 * stiffness * x;
        case LawParameter::damping:
            return -2.0 * v;
        case LawParameter::friction:
            return -direction;
        case LawParameter::asymmetry:
            return -2.0 * direction * v;
        case LawParameter::quadratic:
            return -direction * v * v;
        case LawParameter::cubic:
            return -x * x * x;
    }
    return 0.0;
}

// The equation of motion while the velocity keeps its sign, with its variational equations.
class Swing {
  public:
    Swing(const DampingLaw& law, const std::vector<LawParameter>& by)
        : by_(by),
          stiffness_(law.angular_frequency() * law.angular_frequency()),
          cubic_(law[LawParameter::cubic]),
          friction_(law[LawParameter::friction]),
          damping_(law[LawParameter::damping]),
          asymmetry_(law[LawParameter::asymmetry]),
          quadratic_(law[LawParameter::quadratic]) {}

    template <std::size_t n>
    void operator()(const std::array<double, n>& z, std::array<double, n>& rate, double /*time*/) const {
        const double x = z[0], v = z[1];
        rate.fill(0.0);
        rate[0] = v;
        rate[1] = acceleration(x, v);
        if constexpr (n == state_size(0)) return;
        const double by_x = derivative_by_displacement(x), by_v = derivative_by_velocity(v);
        for (std::size_t i = 0; i < by_.size(); ++i) {
            const double dx = z[2 + 2 * i], dv = z[3 + 2 * i];
            rate[2 + 2 * i] = dv;
            rate[3 + 2 * i] =
                by_x * dx + by_v * dv + explicit_derivative(stiffness_, by_[i], x, v, direction);
        }
    }

    [[nodiscard]] double restoring(double x) const { return x * (stiffness_ + cubic_ * x * x); }
    [[nodiscard]] double acceleration(double x, double v) const {
        const double speed = direction * v;
        return -restoring(x) - friction_ * direction - 2.0 * damping_ * v - 2.0 * asymmetry_ * speed -
               quadratic_ * v * speed;
    }
    [[nodiscard]] double derivative_by_displacement(double x) const {
        return -stiffness_ - 3.0 * cubic_ * x * x;
    }
    [[nodiscard]] double derivative_by_velocity(double v) const {
        return -2.0 * damping_ - 2.0 * direction * (asymmetry_ + quadratic_ * v);
    }
    [[nodiscard]] double derivative_by(LawParameter p, double x, double v) const {
        return explicit_derivative(stiffness_, p, x, v, direction);
    }

    double direction = 1.0;

  private:
    const std::vector<LawParameter>& by_;
    double stiffness_, cubic_, friction_, damping_, asymmetry_, quadratic_;
};

template <std::size_t n>
class Motion {
    using State = std::array<double, n>;
    using Stepper = typename boost::numeric::odeint::result_of::make_dense_output<
        boost::numeric::odeint::runge_kutta_dopri5<State>>::type;

  public:
    Motion(const DampingLaw& law, Measured measured, const std::vector<double>& times,
           const std::vector<LawParameter>& by, double tolerance)
        : law_(law),
          measured_(measured),
          times_(times),
          by_(by),
          swing_(law, by),
          stepper_(boost::numeric::odeint::make_dense_output(
              tolerance, tolerance, boost::numeric::odeint::runge_kutta_dopri5<State>())),
          here_{} {
        const auto rows = static_cast<Eigen::Index>(times.size());
        out_.value.resize(rows);
        out_.derivative.resize(rows, static_cast<Eigen::Index>(by.size()));
    }

    LawMotion run() {
        start();
        if (!times_.empty() && !out_.sticks) integrate();
        if (out_.sticks) fill_at_rest();
        out_.valid = next_ == times_.size() && out_.value.allFinite() && out_.derivative.allFinite();
        return std::move(out_);
    }

  private:
    void start() {
        here_[0] = law_[LawParameter::displacement];
        here_[1] = law_[LawParameter::velocity];
        for (std::size_t i = 0; i < by_.size(); ++i) {
            if (by_[i] == LawParameter::displacement) here_[2 + 2 * i] = 1.0;
            if (by_[i] == LawParameter::velocity) here_[3 + 2 * i] = 1.0;
        }
        swing_.direction = here_[1] < 0.0 ? -1.0 : 1.0;
        if (here_[1] == 0.0) turn_or_stick(0.0);
    }

    // At v = 0: friction holds the mass, or it sets off towards its rest position.
    void turn_or_stick(double time) {
        here_[1] = 0.0;
        out_.stick_time = time;
        if (std::abs(swing_.restoring(here_[0])) <= law_[LawParameter::friction]) {
            out_.sticks = true;
            for (std::size_t i = 0; i < by_.size(); ++i) here_[3 + 2 * i] = 0.0;
            return;
        }
        swing_.direction = swing_.restoring(here_[0]) > 0.0 ? -1.0 : 1.0;
    }

    // The reversal moves by −∂v/a with the parameters, and the acceleration jumps there: ∂v after is ∂v
    // before times the ratio of the accelerations.
    void reverse(double time) {
        const double before = swing_.acceleration(here_[0], 0.0);
        const bool at_once = !out_.reversals.empty() && time - out_.reversals.back() < shortest_swing;
        turn_or_stick(time);
        out_.reversals.push_back(time);
        out_.sticks = out_.sticks || at_once;
        if (out_.sticks) return;
        const double after = swing_.acceleration(here_[0], 0.0);
        for (std::size_t i = 0; i < by_.size(); ++i) here_[3 + 2 * i] *= after / before;
    }

    void integrate() {
        double time = 0.0, step = first_step;
        double steps_left =
            most_steps_at_least + most_steps_a_cycle * times_.back() / (2.0 * std::numbers::pi);
        while (next_ < times_.size() && !out_.sticks) {
            stepper_.initialize(here_, time, step);
            for (;;) {
                if (steps_left-- <= 0.0) return;
                stepper_.do_step(swing_);
                const State& at = stepper_.current_state();
                if (!(std::abs(at[0]) < runaway) || !(std::abs(at[1]) < runaway)) return;
                step = stepper_.current_time_step();
                if (at[1] * swing_.direction < 0.0) {
                    time = reversal();
                    write_until(time);
                    stepper_.calc_state(time, here_);
                    reverse(time);
                    break;
                }
                write_until(stepper_.current_time());
                if (next_ == times_.size()) return;
            }
        }
    }

    // Where the velocity goes through zero in the last step, by the secant with halving (Illinois rule).
    double reversal() {
        double low = stepper_.previous_time(), high = stepper_.current_time();
        double low_v = stepper_.previous_state()[1], high_v = stepper_.current_state()[1];
        if (low_v * swing_.direction <= 0.0) return low;
        const double enough = 1e-13 * std::max(1.0, high);
        int side = 0;
        for (int i = 0; i < 60 && high - low > enough; ++i) {
            const double middle = (low * high_v - high * low_v) / (high_v - low_v);
            stepper_.calc_state(middle, scratch_);
            const double v = scratch_[1];
            if (std::abs(v) < 1e-15) return middle;
            if (v * swing_.direction > 0.0) {
                low = middle;
                low_v = v;
                if (side == 1) high_v /= 2.0;
                side = 1;
            } else {
                high = middle;
                high_v = v;
                if (side == -1) low_v /= 2.0;
                side = -1;
            }
        }
        return 0.5 * (low + high);
    }

    void write_until(double time) {
        for (; next_ < times_.size() && times_[next_] <= time; ++next_) {
            stepper_.calc_state(std::max(times_[next_], stepper_.previous_time()), scratch_);
            write(scratch_);
        }
    }

    void write(const State& z) {
        const auto row = static_cast<Eigen::Index>(next_);
        const double x = z[0], v = z[1];
        switch (measured_) {
            case Measured::displacement:
                out_.value(row) = x;
                break;
            case Measured::velocity:
                out_.value(row) = v;
                break;
            case Measured::acceleration:
                out_.value(row) = swing_.acceleration(x, v);
                break;
        }
        for (std::size_t i = 0; i < by_.size(); ++i)
            out_.derivative(row, static_cast<Eigen::Index>(i)) = measured_derivative(z, i);
    }

    [[nodiscard]] double measured_derivative(const State& z, std::size_t i) const {
        const double dx = z[2 + 2 * i], dv = z[3 + 2 * i];
        if (measured_ == Measured::displacement) return dx;
        if (measured_ == Measured::velocity) return dv;
        return swing_.derivative_by_displacement(z[0]) * dx + swing_.derivative_by_velocity(z[1]) * dv +
               swing_.derivative_by(by_[i], z[0], z[1]);
    }

    void fill_at_rest() {
        const bool displaced = measured_ == Measured::displacement;
        for (; next_ < times_.size(); ++next_) {
            const auto row = static_cast<Eigen::Index>(next_);
            out_.value(row) = displaced ? here_[0] : 0.0;
            for (std::size_t i = 0; i < by_.size(); ++i)
                out_.derivative(row, static_cast<Eigen::Index>(i)) = displaced ? here_[2 + 2 * i] : 0.0;
        }
    }

    const DampingLaw& law_;
    Measured measured_;
    const std::vector<double>& times_;
    const std::vector<LawParameter>& by_;
    Swing swing_;
    Stepper stepper_;
    State here_{}, scratch_{};
    std::size_t next_ = 0;
    LawMotion out_;
};

// The motion with as many derivatives as are asked for, `most` or fewer.
template <std::size_t most>
LawMotion move_by(const DampingLaw& law, Measured measured, const std::vector<double>& times,
                  const std::vector<LawParameter>& by, double tolerance) {
    if constexpr (most > 0)
        if (by.size() < most) return move_by<most - 1>(law, measured, times, by, tolerance);
    assert(by.size() == most);
    return Motion<state_size(most)>(law, measured, times, by, tolerance).run();
}

}  // namespace

bool LawTerms::has(LawParameter parameter) const {
    switch (parameter) {
        case LawParameter::friction:
            return friction;
        case LawParameter::asymmetry:
            return asymmetry;
        case LawParameter::quadratic:
            return quadratic;
        case LawParameter::cubic:
            return cubic;
        default:
            return true;
    }
}

LawTerms LawTerms::with(LawParameter parameter) const {
    LawTerms terms = *this;
    terms.friction = friction || parameter == LawParameter::friction;
    terms.asymmetry = asymmetry || parameter == LawParameter::asymmetry;
    terms.quadratic = quadratic || parameter == LawParameter::quadratic;
    terms.cubic = cubic || parameter == LawParameter::cubic;
    return terms;
}

std::string name_of(const LawTerms& terms, double cubic) {
    std::string name = terms.asymmetry ? "two-way" : "viscous";
    if (terms.friction) name += "+friction";
    if (terms.quadratic) name += "+quadratic";
    if (terms.cubic) name += cubic < 0.0 ? "+softening" : "+hardening";
    return name;
}

double DampingLaw::angular_frequency() const {
    return std::exp((*this)[LawParameter::log_frequency]);
}

LawMotion move(const DampingLaw& law, Measured measured, const std::vector<double>& times,
               const std::vector<LawParameter>& by, double tolerance) {
    return move_by<law_parameter_count>(law, measured, times, by, tolerance);
}

}  // namespace ringwright::identify
