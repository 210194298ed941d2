// The least scatter of amplitude, decay rate, frequency and damping against values computed with numpy from
// the same definition (information matrix of A e^(−at) cos(ω_d t + φ) in white noise; bound after Yao &
// Pandit 1995 and Kay 1993, from memory). Tolerance: the nine digits of the table, less what a condition
// number of about 1e4 takes.
#include <catch2/catch.hpp>
#include <cmath>

#include "ringwright/cramer_rao.hpp"

using namespace ringwright;

namespace {

struct Case {
    DecayingSinusoid decay;
    SamplingPlan plan;
    DecayBound bound;
};
constexpr double digits = 1e-6;

void check(const Case& expected) {
    const DecayBound bound = cramer_rao_bound(expected.decay, expected.plan);
    CHECK(bound.amplitude == Approx(expected.bound.amplitude).epsilon(digits));
    CHECK(bound.decay_rate == Approx(expected.bound.decay_rate).epsilon(digits));
    CHECK(bound.damped_angular_frequency == Approx(expected.bound.damped_angular_frequency).epsilon(digits));
    CHECK(bound.phase_rad == Approx(expected.bound.phase_rad).epsilon(digits));
    CHECK(bound.natural_frequency_hz == Approx(expected.bound.natural_frequency_hz).epsilon(digits));
    CHECK(bound.damping_ratio == Approx(expected.bound.damping_ratio).epsilon(digits));
}

}  // namespace

TEST_CASE("bound C1: 10 Hz, 1 %, ten seconds") {
    check({{1.0, 10.0, 0.01, 0.0},
           {1000.0, 10000, 0.01},
           {7.08174700e-04, 6.29732179e-04, 6.30316208e-04, 7.09347840e-04, 1.00307945e-04, 1.00229981e-05}});
}
TEST_CASE("bound C2: the same cut after one second") {
    check({{1.0, 10.0, 0.01, 0.0},
           {1000.0, 1000, 0.01},
           {1.03307194e-03, 2.13192902e-03, 2.13672434e-03, 1.03722948e-03, 3.40036742e-04, 3.39323645e-05}});
}
TEST_CASE("bound C3: 10 Hz, 5 %, phase 0.7") {
    check({{1.0, 10.0, 0.05, 0.7},
           {1000.0, 3000, 0.02},
           {3.32304017e-03, 1.44235311e-02, 1.37691081e-02, 3.02308019e-03, 2.18953947e-03, 2.29449804e-04}});
}
TEST_CASE("bound C4: 100 Hz, 0.2 %") {
    check({{1.0, 100.0, 0.002, 0.3},
           {10000.0, 20000, 0.05},
           {1.64044041e-03, 3.10028619e-03, 3.09714563e-03, 1.63695010e-03, 4.92924335e-04, 4.93426585e-06}});
}
TEST_CASE("bound C5: 5 Hz, 20 %") {
    check({{1.0, 5.0, 0.2, 0.0},
           {500.0, 1000, 0.01},
           {3.09261850e-03, 2.73066664e-02, 3.09147124e-02, 3.67312678e-03, 4.76085198e-03, 8.85739435e-04}});
}

TEST_CASE("bound of an undamped sinusoid in a long record") {
    // Kay: sd(ω per sample) = √(24 s²/(A² N(N² − 1))) with the decay known to be none; decay and frequency
    // are independent there up to 1/N, so the bound with the decay unknown differs by less than 1e-3.
    const double bound = cramer_rao_bound({1.0, 0.1, 0.0, 0.0}, {1.0, 2000, 0.1}).damped_angular_frequency;
    CHECK(bound == Approx(5.4772e-6).epsilon(1e-3));
}

TEST_CASE("closed limit of a long, many-cycled decay") {
    // sd(a) = 4 (s/A)√(a³/rate): printed limit of C4 is not reached in 2 s, so 20 s here. The limit leaves
    // out terms of the order of ζ.
    const double rate = 0.002 * 2.0 * 3.14159265358979 * 100.0;
    const DecayBound bound = cramer_rao_bound({1.0, 100.0, 0.002, 0.3}, {10000.0, 200000, 0.05});
    CHECK(bound.decay_rate == Approx(4.0 * 0.05 * std::sqrt(rate * rate * rate / 10000.0)).epsilon(0.004));
}

TEST_CASE("an unknown offset cannot lower the bound") {
    SamplingPlan plan{500.0, 1000, 0.01};
    const DecayBound known = cramer_rao_bound({1.0, 5.0, 0.2, 0.0}, plan);
    plan.offset_known = false;
    const DecayBound unknown = cramer_rao_bound({1.0, 5.0, 0.2, 0.0}, plan);
    CHECK(unknown.decay_rate >= known.decay_rate);
    CHECK(unknown.damping_ratio >= known.damping_ratio);
    CHECK(unknown.damping_ratio < 1.1 * known.damping_ratio);
}
