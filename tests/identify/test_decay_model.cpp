// The smooth decay model: its columns satisfy the equation of motion, its derivatives are right, it runs
// through critical.
#include <catch2/catch.hpp>
#include <cmath>

#include "identify/decay_model.hpp"
#include "identify/projected_fit.hpp"

using namespace ringwright;
using namespace ringwright::identify;
using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

DecaySamples clock_of(Index n, double step) {
    DecaySamples samples;
    samples.time = VectorXd::LinSpaced(n, 0.0, step * static_cast<double>(n - 1));
    samples.value = VectorXd::Zero(n);
    samples.stretches = {{0, n}};
    samples.step_s = step;
    return samples;
}

// Central differences with step 1e-6: truncation 1e-12, rounding 1e-10 of the column's size.
void check_derivatives(const DecayModel& model, const DecaySamples& samples) {
    const VectorXd coefficients = VectorXd::LinSpaced(model.linear_count(), -1.0, 2.0);
    const MatrixXd derivatives = derivative_columns(model, samples, coefficients);
    const VectorXd at = model.parameters();
    REQUIRE(derivatives.cols() == at.size());
    for (Index k = 0; k < at.size(); ++k) {
        DecayModel up = model, down = model;
        VectorXd moved = at;
        moved(k) += 1e-6;
        up.set_parameters(moved);
        moved(k) -= 2e-6;
        down.set_parameters(moved);
        const VectorXd numeric =
            (linear_columns(up, samples) - linear_columns(down, samples)) * coefficients / 2e-6;
        INFO("parameter " << k);
        CHECK((numeric - derivatives.col(k)).cwiseAbs().maxCoeff() < 1e-6);
    }
}

constexpr double ratios[] = {0.0, 0.0005, 0.05, 0.6, 0.999999, 1.0, 1.000001, 1.4, 5.0};

}  // namespace

TEST_CASE("the columns solve y'' + 2ζω y' + ω² y = 0 at every damping ratio") {
    // Central differences of order h²: relative error (ωh)²/12 × a few; h = 1e-3/ω gives about 1e-6 of ω².
    for (const double ratio : ratios) {
        const double omega = 7.0, h = 1e-3 / omega;
        DecayModel model;
        model.oscillators = {Oscillator::from(ratio, omega)};
        const DecaySamples samples = clock_of(2001, h);
        const MatrixXd columns = linear_columns(model, samples);
        for (const Index column : {Index{1}, Index{2}})
            for (Index i = 100; i < 2000; i += 300) {
                const double y = columns(i, column), left = columns(i - 1, column),
                             right = columns(i + 1, column);
                const double rest = (left - 2.0 * y + right) / (h * h) +
                                    2.0 * ratio * omega * (right - left) / (2.0 * h) + omega * omega * y;
                INFO("damping ratio " << ratio << " column " << column);
                CHECK(std::abs(rest) < 2e-4 * omega * omega);
            }
        CHECK(columns(0, 1) == 1.0);
        CHECK(columns(0, 2) == 0.0);
        // ωS starts with slope ω.
        CHECK((columns(1, 2) - columns(0, 2)) / h == Approx(omega).epsilon(2e-2));
    }
}

TEST_CASE("recurrence and direct evaluation agree") {
    for (const double ratio : ratios) {
        DecayModel model;
        model.oscillators = {Oscillator::from(ratio, 31.0)};
        DecaySamples samples = clock_of(700, 0.004);
        const MatrixXd fast = linear_columns(model, samples);
        samples.uniform = false;
        const MatrixXd direct = linear_columns(model, samples);
        CHECK((fast - direct).cwiseAbs().maxCoeff() < 1e-12);  // 32 multiplications of rounding
    }
}

TEST_CASE("derivative columns are the derivatives") {
    for (const double ratio : ratios) {
        DecayModel model;
        model.oscillators = {Oscillator::from(ratio, 3.0), Oscillator::from(0.02, 11.0)};
        model.tones = {std::log(40.0)};
        model.real_poles = {std::log(0.7)};
        model.drift = true;
        INFO("damping ratio " << ratio);
        check_derivatives(model, clock_of(300, 0.01));
    }
}

TEST_CASE("released from rest: still before, the pair of columns after, and the derivatives") {
    for (const double ratio : ratios) {
        DecayModel model;
        model.oscillators = {Oscillator::from(ratio, 3.0)};
        model.tones = {std::log(40.0)};
        DecayModel pair = model;
        model.release = 0.7512;
        const DecaySamples samples = clock_of(300, 0.01);
        const MatrixXd columns = linear_columns(model, samples);
        REQUIRE(columns.cols() == model.linear_count());
        CHECK(columns(75, 1) == 1.0);
        DecaySamples since = samples;
        since.time.array() -= 0.7512;
        since.uniform = false;
        const MatrixXd both = linear_columns(pair, since);
        for (const Index i : {76, 120, 299})  // from rest: B = ζ A
            CHECK(columns(i, 1) == Approx(both(i, 1) + ratio * both(i, 2)).epsilon(1e-12).margin(1e-12));
        INFO("damping ratio " << ratio);
        check_derivatives(model, samples);

        model.let_go_slowly = true;  // the same fall, and what is held in a column of its own
        const MatrixXd apart = linear_columns(model, samples);
        REQUIRE(apart.cols() == model.linear_count());
        CHECK((apart.col(1) + apart.col(2) - columns.col(1)).cwiseAbs().maxCoeff() < 1e-15);
        CHECK(apart(75, 1) == 0.0);
        CHECK(apart(76, 2) == 0.0);
        check_derivatives(model, samples);
    }
}

TEST_CASE("critical damping by hand") {
    // (1 + ωt) e^(−ωt): displacement released from rest at critical damping (textbook).
    DecayModel model;
    model.oscillators = {Oscillator::from(1.0, 2.0)};
    const DecaySamples samples = clock_of(5, 0.5);
    const MatrixXd columns = linear_columns(model, samples);
    for (Index i = 0; i < 5; ++i) {
        const double x = 2.0 * samples.time(i);
        CHECK(columns(i, 1) + columns(i, 2) == Approx((1.0 + x) * std::exp(-x)).epsilon(1e-14));
    }
}

TEST_CASE("a decay free of noise is found exactly from afar") {
    // No noise: what is left is rounding, through the condition of the problem.
    for (const double ratio : {0.001, 0.2, 0.9, 1.0, 1.3, 3.0}) {
        DecaySamples samples = clock_of(400, 0.02);
        DecayModel truth;
        truth.oscillators = {Oscillator::from(ratio, 5.0)};
        samples.value = linear_columns(truth, samples) * Eigen::Vector3d(0.3, 1.0, -0.4);
        DecayModel start;
        start.oscillators = {Oscillator::from(ratio * 1.2 + 0.005, 5.2)};
        const ProjectedFit fit = fit_projected(start, samples, AutoregressiveNoise{});
        INFO("damping ratio " << ratio);
        CHECK(fit.model.oscillators[0].angular_frequency() == Approx(5.0).epsilon(1e-6));
        CHECK(fit.model.oscillators[0].damping_ratio() == Approx(ratio).epsilon(1e-6));
    }
}

TEST_CASE("start amplitude") {
    DecayModel model;
    model.oscillators = {Oscillator::from(0.0, 4.0)};
    VectorXd coefficients(3);
    coefficients << 9.0, 3.0, 4.0;
    CHECK(start_amplitude(model, coefficients, 0) == Approx(5.0));  // 3-4-5
}
