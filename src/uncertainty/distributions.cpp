#include "ringwright/distributions.hpp"

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/distributions/students_t.hpp>
#include <cmath>
#include <limits>

namespace ringwright {
namespace {

const boost::math::normal standard_normal;
constexpr double infinite = std::numeric_limits<double>::infinity();

bool is_normal(double degrees_of_freedom) {
    return !std::isfinite(degrees_of_freedom) || degrees_of_freedom > 1e12;
}

}  // namespace

double student_t_factor(double confidence_level, double degrees_of_freedom) {
    const double tail = (1.0 - confidence_level) / 2.0;
    if (is_normal(degrees_of_freedom))
        return boost::math::quantile(boost::math::complement(standard_normal, tail));
    return boost::math::quantile(boost::math::complement(boost::math::students_t(degrees_of_freedom), tail));
}

double student_t_probability(double t, double degrees_of_freedom) {
    if (is_normal(degrees_of_freedom)) return normal_probability(t);
    return boost::math::cdf(boost::math::students_t(degrees_of_freedom), t);
}

double normal_probability(double z) {
    return boost::math::cdf(standard_normal, z);
}
double normal_quantile(double probability) {
    return boost::math::quantile(standard_normal, probability);
}

double chi_squared_probability(double x, double degrees_of_freedom) {
    if (x == infinite) return 1.0;
    return boost::math::cdf(boost::math::chi_squared(degrees_of_freedom), x);
}

double chi_squared_quantile(double probability, double degrees_of_freedom) {
    return boost::math::quantile(boost::math::chi_squared(degrees_of_freedom), probability);
}

double f_probability(double x, double numerator_df, double denominator_df) {
    if (x == infinite) return 1.0;
    return boost::math::cdf(boost::math::fisher_f(numerator_df, denominator_df), x);
}

double f_quantile(double probability, double numerator_df, double denominator_df) {
    return boost::math::quantile(boost::math::fisher_f(numerator_df, denominator_df), probability);
}

}  // namespace ringwright
