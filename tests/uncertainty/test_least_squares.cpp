#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "ringwright/least_squares.hpp"

using namespace ringwright;

namespace {

/// y = b0 + b1 t through the points (t_i, y_i).
LeastSquaresProblem line_through(const Eigen::VectorXd& t, const Eigen::VectorXd& y) {
    LeastSquaresProblem problem;
    problem.residual_count = t.size();
    problem.residuals = [=](const Eigen::VectorXd& b, Eigen::VectorXd& r) {
        r = (b[0] + b[1] * t.array() - y.array()).matrix();
    };
    problem.jacobian = [=](const Eigen::VectorXd&, Eigen::MatrixXd& j) {
        j.col(0).setOnes();
        j.col(1) = t;
    };
    return problem;
}

/// y = b0 exp(−b1 t).
LeastSquaresProblem decay_through(const Eigen::VectorXd& t, const Eigen::VectorXd& y) {
    LeastSquaresProblem problem;
    problem.residual_count = t.size();
    problem.residuals = [=](const Eigen::VectorXd& b, Eigen::VectorXd& r) {
        r = (b[0] * (-b[1] * t.array()).exp() - y.array()).matrix();
    };
    problem.jacobian = [=](const Eigen::VectorXd& b, Eigen::MatrixXd& j) {
        j.col(0) = (-b[1] * t.array()).exp().matrix();
        j.col(1) = (-b[0] * t.array() * (-b[1] * t.array()).exp()).matrix();
    };
    return problem;
}

}  // namespace

TEST_CASE("a straight line worked by hand") {
    // t = 0 1 2 3, y = 1 3 4 6: slope 8/5, intercept 11/10, sum of squares 1/5, s² = 1/10,
    // var slope = s²/Σ(t−t̄)² = 1/50, var intercept = s² (1/4 + t̄²/5) = 7/100, covariance −s² t̄/5 = −3/100.
    const Eigen::Vector4d t(0.0, 1.0, 2.0, 3.0), y(1.0, 3.0, 4.0, 6.0);
    const LeastSquaresFit fit = fit_least_squares(line_through(t, y), Eigen::Vector2d(1.0, 1.0));
    REQUIRE(fit.converged);
    CHECK(fit.parameters[0] == Approx(1.1).epsilon(1e-12));
    CHECK(fit.parameters[1] == Approx(1.6).epsilon(1e-12));
    CHECK(fit.residual_sum_of_squares == Approx(0.2).epsilon(1e-12));
    CHECK(fit.degrees_of_freedom == 2.0);
    CHECK(fit.residual_standard_deviation == Approx(std::sqrt(0.1)).epsilon(1e-12));
    CHECK(fit.covariance(0, 0) == Approx(0.07).epsilon(1e-12));
    CHECK(fit.covariance(1, 1) == Approx(0.02).epsilon(1e-12));
    CHECK(fit.covariance(0, 1) == Approx(-0.03).epsilon(1e-12));
}

TEST_CASE("units of a parameter change its deviation in proportion and nothing else") {
    const Eigen::VectorXd t = Eigen::VectorXd::LinSpaced(20, 0.0, 2.0);
    Eigen::VectorXd y = (2.0 * (-1.5 * t.array()).exp()).matrix();
    for (Eigen::Index i = 0; i < y.size(); ++i) y[i] += 0.01 * std::sin(7.0 * static_cast<double>(i));
    const LeastSquaresFit fit = fit_least_squares(decay_through(t, y), Eigen::Vector2d(1.0, 1.0));
    const LeastSquaresFit milli =  // the same data on a clock that counts milliseconds
        fit_least_squares(decay_through(1e3 * t, y), Eigen::Vector2d(1.0, 1e-3));
    REQUIRE(fit.converged);
    REQUIRE(milli.converged);
    // Rounding: the minimum of a sum of squares is flat, so parameters agree to about the root of 1e-16.
    CHECK(milli.parameters[1] == Approx(1e-3 * fit.parameters[1]).epsilon(1e-8));
    CHECK(milli.standard_deviation(1) == Approx(1e-3 * fit.standard_deviation(1)).epsilon(1e-7));
    CHECK(milli.standard_deviation(0) == Approx(fit.standard_deviation(0)).epsilon(1e-7));
}

TEST_CASE("each failure of the fit is said") {
    const Eigen::VectorXd t = Eigen::VectorXd::LinSpaced(10, 0.0, 1.0);
    const Eigen::VectorXd y = (-t.array()).exp().matrix();
    const Eigen::Vector2d start(0.5, 3.0);

    SECTION("fewer data than parameters") {
        const auto fit = fit_least_squares(decay_through(t.head(1), y.head(1)), start);
        CHECK_FALSE(fit.converged);
        CHECK_FALSE(fit.reason.empty());
    }
    SECTION("as many data as parameters: an answer, but no covariance") {
        const auto fit = fit_least_squares(decay_through(t.head(2), y.head(2)), start);
        CHECK_FALSE(fit.converged);
        CHECK(fit.covariance.rows() == 0);
        CHECK(fit.parameters[1] == Approx(1.0).epsilon(1e-6));
    }
    SECTION("no finite value at the start") {
        const auto fit = fit_least_squares(decay_through(t, y),
                                           Eigen::Vector2d(std::numeric_limits<double>::quiet_NaN(), 1.0));
        CHECK_FALSE(fit.converged);
        CHECK(fit.iterations == 0);
    }
    SECTION("evaluations run out") {
        LeastSquaresOptions options;
        options.max_evaluations = 2;
        const auto fit = fit_least_squares(decay_through(t, y), start, options);
        CHECK_FALSE(fit.converged);
        CHECK_FALSE(fit.reason.empty());
    }
    SECTION("parameters that cannot be told apart") {
        const auto fit = fit_least_squares(line_through(Eigen::VectorXd::Ones(10), y), start);
        CHECK_FALSE(fit.converged);
        CHECK(fit.covariance.rows() == 0);
    }
}

TEST_CASE("covariance of a Jacobian with columns of very different length") {
    // Columns at 60 degrees, lengths 1 and 1e-90: JᵀJ would lose the second beside the first. With unit
    // columns (JᵀJ)⁻¹ = [4/3 −2/3; −2/3 4/3], then divided by the lengths.
    Eigen::MatrixXd jacobian(2, 2);
    jacobian << 1.0, 0.5e-90, 0.0, std::sqrt(0.75) * 1e-90;
    const Eigen::MatrixXd covariance = covariance_from_jacobian(jacobian, 3.0);
    REQUIRE(covariance.rows() == 2);
    CHECK(covariance(0, 0) == Approx(4.0).epsilon(1e-12));
    CHECK(covariance(0, 1) == Approx(-2e90).epsilon(1e-12));
    CHECK(covariance(1, 1) == Approx(4e180).epsilon(1e-12));
}

TEST_CASE("a Jacobian that tells nothing of a parameter has no covariance") {
    Eigen::MatrixXd jacobian = Eigen::MatrixXd::Ones(3, 2);
    CHECK(covariance_from_jacobian(jacobian, 1.0).rows() == 0);  // equal columns
    jacobian.col(1).setZero();
    CHECK(covariance_from_jacobian(jacobian, 1.0).rows() == 0);
    jacobian(0, 1) = std::numeric_limits<double>::quiet_NaN();
    CHECK(covariance_from_jacobian(jacobian, 1.0).rows() == 0);
}
