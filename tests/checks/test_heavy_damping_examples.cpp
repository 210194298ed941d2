// Textbook motions at and beyond critical damping, through the decay model that the curve fit uses.
#include <catch2/catch.hpp>
#include <cmath>

#include "identify/decay_model.hpp"
#include "ringwright/damping_relations.hpp"

using namespace ringwright;
using namespace ringwright::identify;

namespace {

/// x(t) of the oscillator from its position and velocity at t = 0: A = x₀ and B = v₀ + ζω x₀.
double position(double damping_ratio, double omega, double start, double velocity, double time_s) {
    DecayModel model;
    model.oscillators = {Oscillator::from(damping_ratio, omega)};
    DecaySamples samples;
    samples.time = Eigen::VectorXd::Constant(1, time_s);
    samples.value = Eigen::VectorXd::Zero(1);
    const Eigen::RowVector3d columns = linear_columns(model, samples).row(0);  // 1, C, ωS
    return columns[1] * start + columns[2] * (velocity + damping_ratio * omega * start) / omega;
}

}  // namespace

TEST_CASE("E2 cannon at critical damping: recoil and return") {
    // Rao, gun barrel example: 500 kg, 10 kN/m, recoil 0.4 m; data seen on an exercise sheet; answers
    // computed (v₀ printed 4.8626, time on the return to 0.1 m printed 0.8258 from rounded figures, both from
    // memory).
    const double omega = std::sqrt(10e3 / 500.0), velocity = 4.86261036;
    CHECK(position(1.0, omega, 0.0, velocity, 1.0 / omega) == Approx(0.4).epsilon(3e-9));
    CHECK(position(1.0, omega, 0.0, velocity, 0.82569818) == Approx(0.1).epsilon(3e-8));
}

TEST_CASE("E3 over-damped: 2 kg, 67.882 N s/m, 400 N/m, from −1 with 40 a second") {
    // Seen on an answer page: x(0.015) printed −0.5141; exact −0.51425484, and −0.20424134 at 0.03.
    const double ratio = damping_ratio_of(67.882, 400.0, 2.0), omega = std::sqrt(400.0 / 2.0);
    CHECK(position(ratio, omega, -1.0, 40.0, 0.015) == Approx(-0.51425484).epsilon(2e-8));
    CHECK(position(ratio, omega, -1.0, 40.0, 0.015) == Approx(-0.5141).margin(3e-4));
    CHECK(position(ratio, omega, -1.0, 40.0, 0.030) == Approx(-0.20424134).epsilon(4e-8));
}
