// A sinusoid through 200 measured deflections of a beam (LEW.DAT, NIST/SEMATECH e-Handbook 1.4.2.5). The
// expected values are the least-squares answer, computed with 30 digits (mpmath); the handbook's own printed
// fit is not the minimum (its sum of squares is 35 % larger on these data), so it is not used.
#include <catch2/catch.hpp>
#include <cmath>
#include <fstream>
#include <numbers>
#include <string>
#include <vector>

#include "ringwright/least_squares.hpp"

using namespace ringwright;

namespace {

Eigen::VectorXd read_deflections() {
    std::ifstream file(RINGWRIGHT_TEST_DATA "/checks/data/LEW.DAT");
    std::vector<double> values;
    int line_number = 0;
    for (std::string line; std::getline(file, line);)
        if (++line_number > 25) values.push_back(std::stod(line));  // "SKIP 25", says its header
    return Eigen::Map<Eigen::VectorXd>(values.data(), static_cast<Eigen::Index>(values.size()));
}

/// C + A sin(2πFt + P), t = 1, 2, … in the order C, A, F, P.
LeastSquaresProblem sinusoid_through(const Eigen::VectorXd& deflections) {
    const Eigen::VectorXd turns =
        2.0 * std::numbers::pi *
        Eigen::VectorXd::LinSpaced(deflections.size(), 1.0, static_cast<double>(deflections.size()));
    LeastSquaresProblem problem;
    problem.residual_count = deflections.size();
    problem.residuals = [=](const Eigen::VectorXd& b, Eigen::VectorXd& r) {
        r = (b[0] + b[1] * (turns.array() * b[2] + b[3]).sin() - deflections.array()).matrix();
    };
    problem.jacobian = [=](const Eigen::VectorXd& b, Eigen::MatrixXd& j) {
        const Eigen::ArrayXd angle = turns.array() * b[2] + b[3];
        j.col(0).setOnes();
        j.col(1) = angle.sin().matrix();
        j.col(3) = (b[1] * angle.cos()).matrix();
        j.col(2) = (turns.array() * j.col(3).array()).matrix();
    };
    return problem;
}

}  // namespace

TEST_CASE("sinusoid through the beam deflections") {
    const Eigen::VectorXd deflections = read_deflections();
    REQUIRE(deflections.size() == 200);
    const LeastSquaresFit fit =
        fit_least_squares(sinusoid_through(deflections), Eigen::Vector4d(-178.0, -361.0, 0.3018, 1.5));
    REQUIRE(fit.converged);
    const double digits = 1e-6;
    CHECK(fit.parameters[0] == Approx(-178.76815751).epsilon(digits));
    CHECK(fit.parameters[1] == Approx(-343.28856542).epsilon(digits));
    CHECK(fit.parameters[2] == Approx(0.301807036139).epsilon(digits));
    CHECK(fit.parameters[3] == Approx(1.82767060262).epsilon(digits));
    CHECK(fit.standard_deviation(0) == Approx(9.48031291).epsilon(digits));
    CHECK(fit.standard_deviation(1) == Approx(13.40780334).epsilon(digits));
    CHECK(fit.standard_deviation(2) == Approx(1.0764042499e-4).epsilon(digits));
    CHECK(fit.standard_deviation(3) == Approx(0.07819085202).epsilon(digits));
    CHECK(fit.residual_standard_deviation == Approx(134.066400936).epsilon(1e-9));
    CHECK(fit.residual_sum_of_squares == Approx(3522864.77255).epsilon(1e-9));
}
