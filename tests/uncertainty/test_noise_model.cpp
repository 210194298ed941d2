// Autoregressive noise and its restricted likelihood.
#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <Eigen/QR>
#include <catch2/catch.hpp>
#include <cmath>
#include <random>

#include "ringwright/noise_model.hpp"

using namespace ringwright;
using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

AutoregressiveNoise noise_of(std::initializer_list<double> partial, double innovation_variance = 1.0) {
    AutoregressiveNoise noise;
    noise.partial_autocorrelation =
        Eigen::Map<const VectorXd>(partial.begin(), static_cast<Index>(partial.size()));
    noise.innovation_variance = innovation_variance;
    return noise;
}

// Covariance matrix of n samples from the autocovariances, found by filtering unit impulses (independent of
// `whiten`).
MatrixXd covariance_of(const AutoregressiveNoise& noise, Index n) {
    const VectorXd a = noise.coefficients();
    constexpr Index length = 4000;
    VectorXd impulse = VectorXd::Zero(length);
    for (Index t = 0; t < length; ++t) {
        impulse(t) = t == 0 ? 1.0 : 0.0;
        for (Index j = 0; j < std::min(t, a.size()); ++j) impulse(t) += a(j) * impulse(t - 1 - j);
    }
    MatrixXd covariance(n, n);
    for (Index lag = 0; lag < n; ++lag) {
        const double c =
            noise.innovation_variance * impulse.head(length - lag).dot(impulse.tail(length - lag));
        for (Index i = 0; i + lag < n; ++i) covariance(i, i + lag) = covariance(i + lag, i) = c;
    }
    return covariance;
}

}  // namespace

TEST_CASE("first-order noise by hand") {
    // x_t = 0.8 x_(t−1) + e: variance 1/(1 − 0.64) (standard theory, e.g. Box & Jenkins).
    const AutoregressiveNoise noise = noise_of({0.8});
    CHECK(noise.coefficients()(0) == Approx(0.8).epsilon(1e-15));
    CHECK(noise.variance() == Approx(1.0 / 0.36).epsilon(1e-14));
    // Spectral density at zero frequency: 1/(1 − 0.8)².
    CHECK(noise.spectral_density(0.0) == Approx(25.0).epsilon(1e-13));
}

TEST_CASE("Levinson–Durbin: second order by hand") {
    // κ = (0.5, −0.3): a_1 = κ_1(1 − κ_2) = 0.65, a_2 = κ_2 = −0.3 (Brockwell & Davis, Durbin–Levinson
    // recursion).
    const VectorXd a = noise_of({0.5, -0.3}).coefficients();
    CHECK(a(0) == Approx(0.65).epsilon(1e-15));
    CHECK(a(1) == Approx(-0.3).epsilon(1e-15));
}

TEST_CASE("whitening turns the covariance into the identity") {
    const AutoregressiveNoise noise = noise_of({0.7, -0.4, 0.2}, 2.5);
    constexpr Index n = 12;
    const MatrixXd covariance = covariance_of(noise, n);
    MatrixXd filter = MatrixXd::Identity(n, n);
    SECTION("one stretch") {
        whiten(noise, {{0, n}}, filter);
        const MatrixXd white = filter * covariance * filter.transpose();
        CHECK((white - 2.5 * MatrixXd::Identity(n, n)).cwiseAbs().maxCoeff() < 1e-12);  // rounding
    }
    SECTION("stretches do not know of each other") {
        whiten(noise, {{0, 2}, {2, n - 2}}, filter);
        CHECK(filter.bottomLeftCorner(n - 2, 2).cwiseAbs().maxCoeff() == 0.0);
        const MatrixXd tail = filter.bottomRightCorner(n - 2, n - 2);
        const MatrixXd white = tail * covariance.topLeftCorner(n - 2, n - 2) * tail.transpose();
        CHECK((white - 2.5 * MatrixXd::Identity(n - 2, n - 2)).cwiseAbs().maxCoeff() < 1e-12);
    }
}

TEST_CASE("colouring is the inverse of whitening") {
    const AutoregressiveNoise noise = noise_of({0.9, -0.2}, 0.25);
    const std::vector<Stretch> stretches{{0, 1}, {1, 30}};
    std::mt19937_64 engine(7);
    std::normal_distribution<double> normal;
    VectorXd deviates(31), coloured(31);
    for (double& d : deviates) d = normal(engine);
    colour(noise, stretches, deviates, coloured);
    whiten(noise, stretches, coloured);
    CHECK((coloured / 0.5 - deviates).cwiseAbs().maxCoeff() < 1e-12);  // rounding
}

TEST_CASE("restricted likelihood equals its definition") {
    // −2 log REML = (n − k) log RSS + log|V| + log|XᵀV⁻¹X| (Patterson & Thompson 1971), V of unit innovation
    // variance; here from the dense covariance matrix.
    constexpr Index n = 40, k = 3;
    std::mt19937_64 engine(11);
    std::normal_distribution<double> normal;
    MatrixXd design(n, k);
    VectorXd response(n);
    for (Index i = 0; i < n; ++i) {
        design.row(i) << 1.0, static_cast<double>(i) / n, normal(engine);
        response(i) = normal(engine);
    }
    for (const auto& noise : {noise_of({}), noise_of({0.6}), noise_of({0.8, -0.5, 0.3, 0.1})}) {
        for (const std::vector<Stretch>& stretches :
             {std::vector<Stretch>{{0, n}}, {{0, 3}, {3, 20}, {23, 17}}}) {
            MatrixXd covariance = MatrixXd::Zero(n, n);
            for (const Stretch& s : stretches)
                covariance.block(s.begin, s.begin, s.length, s.length) = covariance_of(noise, s.length);
            const Eigen::LLT<MatrixXd> factor(covariance);
            const MatrixXd information = design.transpose() * factor.solve(design);
            const VectorXd beta = information.llt().solve(design.transpose() * factor.solve(response));
            const VectorXd rest = response - design * beta;
            const double sum = rest.dot(factor.solve(rest));
            const double expected = (n - k) * std::log(sum) +
                                    2.0 * MatrixXd(factor.matrixL()).diagonal().array().log().sum() +
                                    std::log(information.determinant());
            const RestrictedLikelihood likelihood(design, response, stretches, 6);
            const WhitenedFit fit = likelihood.evaluate(noise.partial_autocorrelation);
            REQUIRE(fit.valid);
            CHECK(fit.residual_sum == Approx(sum).epsilon(1e-10));  // rounding
            CHECK(fit.criterion == Approx(expected).epsilon(1e-10));
            CHECK((fit.coefficients - beta).cwiseAbs().maxCoeff() < 1e-10);
        }
    }
}

TEST_CASE("noise is found again, and what the fit took from it is given back") {
    // 400 samples of φ = 0.8 under a cubic: mean of the estimates over 60 draws. Standard deviation of one
    // estimate is about √((1 − φ²)/n) = 0.03, of the mean 0.004; the band is five of these.
    constexpr Index n = 400;
    std::mt19937_64 engine(1234);
    std::normal_distribution<double> normal;
    MatrixXd design(n, 4);
    for (Index i = 0; i < n; ++i) {
        const double x = static_cast<double>(i) / n - 0.5;
        design.row(i) << 1.0, x, x * x, x * x * x;
    }
    const MatrixXd basis = Eigen::HouseholderQR<MatrixXd>(design).householderQ() * MatrixXd::Identity(n, 4);
    const AutoregressiveNoise truth = noise_of({0.8});
    double sum = 0.0, variance = 0.0;
    VectorXd deviates(n), response(n);
    for (int draw = 0; draw < 60; ++draw) {
        for (double& d : deviates) d = normal(engine);
        colour(truth, {{0, n}}, deviates, response);
        const NoiseFit fit = fit_noise(RestrictedLikelihood(basis, response, {{0, n}}, 10));
        sum += fit.noise.partial_autocorrelation(0) / 60.0;
        variance += fit.noise.innovation_variance / 60.0;
    }
    CHECK(sum == Approx(0.8).margin(0.02));
    CHECK(variance == Approx(1.0).margin(0.05));  // sd of the mean of 60 variances: √(2/400/60) = 0.009
}
