#include <algorithm>
#include <cmath>
#include <numeric>

#include "ringwright/distributions.hpp"
#include "ringwright/quality_statistics.hpp"

namespace ringwright {
namespace {

double mean_of(const std::vector<double>& values) {
    return std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
}

double two_sided_p(double t, double degrees_of_freedom) {
    return std::min(1.0, 2.0 * student_t_probability(-std::abs(t), degrees_of_freedom));
}

}  // namespace

std::optional<LinearTrend> linear_trend(const std::vector<double>& x, const std::vector<double>& y,
                                        double confidence_level) {
    if (x.size() < 3 || x.size() != y.size()) return std::nullopt;
    const double mean_x = mean_of(x), mean_y = mean_of(y);
    double sxx = 0.0, sxy = 0.0, residual = 0.0;
    for (std::size_t i = 0; i < x.size(); ++i) {
        sxx += (x[i] - mean_x) * (x[i] - mean_x);
        sxy += (x[i] - mean_x) * (y[i] - mean_y);
    }
    if (!(sxx > 0.0)) return std::nullopt;
    const double slope = sxy / sxx;
    for (std::size_t i = 0; i < x.size(); ++i)
        residual += std::pow(y[i] - mean_y - slope * (x[i] - mean_x), 2);
    const double freedom = static_cast<double>(x.size() - 2);
    const double uncertainty = std::sqrt(residual / freedom / sxx);
    const double half_width = student_t_factor(confidence_level, freedom) * uncertainty;
    LinearTrend trend;
    trend.slope = {slope, uncertainty, {slope - half_width, slope + half_width}, freedom};
    trend.value_at_first = mean_y + slope * (x.front() - mean_x);
    trend.p_value =
        uncertainty > 0.0 ? two_sided_p(slope / uncertainty, freedom) : (slope == 0.0 ? 1.0 : 0.0);
    return trend;
}

}  // namespace ringwright
