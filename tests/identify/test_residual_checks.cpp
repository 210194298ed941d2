// The rates at which the checks of the residuals speak up on noise that is as the fit supposes.
#include <catch2/catch.hpp>
#include <cmath>

#include "identify/residual_checks.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;
using namespace ringwright::identify;

namespace {

CurveFit fit_with(const Eigen::VectorXd& innovations) {
    CurveFit fit;
    fit.innovations = innovations;
    fit.fit.model.oscillators = {Oscillator::from(0.05, 1.0)};
    fit.samples.time = Eigen::VectorXd::LinSpaced(innovations.size(), 0.0, 60.0);
    return fit;
}

bool has(const Findings& findings, const char* code) {
    return std::any_of(findings.begin(), findings.end(), [&](const Finding& f) { return f.code == code; });
}

}  // namespace

TEST_CASE("white residuals of a short decay are called coloured as often as stated") {
    // 4,000 series, one in a hundred: 40, standard deviation 6.3; limits at three. By the chi-squared limit
    // of the statistic it would be 88 (measured).
    simulated::Deviates deviates(8100);
    int coloured = 0, trending = 0;
    for (int i = 0; i < 4000; ++i) {
        Eigen::VectorXd x(100);
        for (double& value : x) value = deviates.normal();
        const Findings findings = check_residuals(fit_with(x));
        coloured += has(findings, "residuals_not_white");
        trending += has(findings, "residuals_follow_amplitude");
    }
    CHECK(coloured >= 21);
    CHECK(coloured <= 59);
    CHECK(trending >= 21);
    CHECK(trending <= 59);
}

TEST_CASE("residuals with a correlation of 0.5 are called coloured") {
    simulated::Deviates deviates(8101);
    Eigen::VectorXd x(100);
    double last = 0.0;
    for (double& value : x) value = last = 0.5 * last + deviates.normal();
    CHECK(has(check_residuals(fit_with(x)), "residuals_not_white"));
}
