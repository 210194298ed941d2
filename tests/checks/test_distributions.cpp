// Quantiles and probabilities against SciPy 1.10.1 (Debian 12), 14 digits; Student factors also against table
// B.1 of NIST Technical Note 1297 = table G.2 of JCGM 100 (seen at nist.gov).
#include <catch2/catch.hpp>
#include <cmath>
#include <limits>

#include "ringwright/distributions.hpp"

using namespace ringwright;

namespace {
constexpr double digits = 1e-10;
constexpr double endless = std::numeric_limits<double>::infinity();
}  // namespace

TEST_CASE("normal quantiles and probabilities") {
    CHECK(normal_quantile(0.95) == Approx(1.6448536269515).epsilon(digits));
    CHECK(normal_quantile(0.975) == Approx(1.9599639845401).epsilon(digits));
    CHECK(normal_quantile(0.995) == Approx(2.5758293035489).epsilon(digits));
    CHECK(normal_probability(1.96) == Approx(0.97500210485178).epsilon(digits));
    CHECK(normal_probability(-6.0) == Approx(9.8658764503769e-10).epsilon(digits));
}

TEST_CASE("Student quantiles") {
    CHECK(student_t_factor(0.95, 1.0) == Approx(12.706204736432).epsilon(digits));
    // SciPy 1.10.1 gives 2.5705818366147 here, wrong in the tenth digit; this one is mpmath with 30 digits.
    CHECK(student_t_factor(0.95, 5.0) == Approx(2.5705818356363).epsilon(digits));
    CHECK(student_t_factor(0.95, 10.0) == Approx(2.2281388519649).epsilon(digits));
    CHECK(student_t_factor(0.95, 16.5) == Approx(2.1146963410177).epsilon(digits));
    CHECK(student_t_factor(0.95, 30.0) == Approx(2.0422724563012).epsilon(digits));
    CHECK(student_t_factor(0.95, endless) == Approx(1.9599639845401).epsilon(digits));
    CHECK(student_t_probability(2.0, 7.0) == Approx(0.95719033571851).epsilon(digits));
    CHECK(student_t_probability(-6.0, 3.0) == Approx(0.0046363574461423).epsilon(digits));
}

TEST_CASE("Student factors of table B.1 of NIST TN 1297") {
    struct Row {
        double degrees_of_freedom;
        double factors[6];
        double rounding;
    };
    const double levels[] = {0.6827, 0.90, 0.95, 0.9545, 0.99, 0.9973};
    const Row rows[] = {{1.0, {1.84, 6.31, 12.71, 13.97, 63.66, 235.80}, 0.00501},
                        {5.0, {1.11, 2.02, 2.57, 2.65, 4.03, 5.51}, 0.00501},
                        {16.0, {1.03, 1.75, 2.12, 2.17, 2.92, 3.54}, 0.00501},
                        {100.0, {1.005, 1.660, 1.984, 2.025, 2.626, 3.077}, 0.000501}};
    for (const Row& row : rows)
        for (int i = 0; i < 6; ++i) {
            INFO(row.degrees_of_freedom << " degrees of freedom, level " << levels[i]);
            // The table's 68.27, 95.45 and 99.73 % stand for whole sigmas: 1 degree of freedom at 99.73 %
            // shows it.
            const double level = i == 0   ? std::erf(1.0 / std::sqrt(2.0))
                                 : i == 3 ? std::erf(2.0 / std::sqrt(2.0))
                                 : i == 5 ? std::erf(3.0 / std::sqrt(2.0))
                                          : levels[i];
            CHECK(student_t_factor(level, row.degrees_of_freedom) ==
                  Approx(row.factors[i]).margin(row.rounding).epsilon(0));
        }
}

TEST_CASE("chi-squared quantiles and probability") {
    CHECK(chi_squared_quantile(0.025, 9.0) == Approx(2.7003894999804).epsilon(digits));
    CHECK(chi_squared_quantile(0.975, 9.0) == Approx(19.022767798642).epsilon(digits));
    CHECK(chi_squared_quantile(0.95, 1.0) == Approx(3.8414588206941).epsilon(digits));
    CHECK(chi_squared_quantile(0.025, 100.0) == Approx(74.221927474924).epsilon(digits));
    CHECK(chi_squared_probability(12.5, 8.0) == Approx(0.86974964527207).epsilon(digits));
}

TEST_CASE("F quantiles and probability") {
    CHECK(f_quantile(0.95, 3.0, 10.0) == Approx(3.7082648190468).epsilon(digits));
    CHECK(f_quantile(0.95, 18.0, 60.0) == Approx(1.7784460853277).epsilon(digits));
    CHECK(f_quantile(0.975, 5.0, 7.0) == Approx(5.2852368515043).epsilon(digits));
    CHECK(f_quantile(0.99, 2.0, 18.0) == Approx(6.0129048348005).epsilon(digits));
    // By definition; a ratio to a variance of zero is infinite.
    CHECK(f_probability(std::numeric_limits<double>::infinity(), 4.0, 12.0) == 1.0);
    CHECK(chi_squared_probability(std::numeric_limits<double>::infinity(), 8.0) == 1.0);
    CHECK(f_probability(3.5, 4.0, 12.0) == Approx(0.95910532833788).epsilon(digits));
}
