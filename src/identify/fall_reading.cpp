#include "identify/fall_reading.hpp"

#include <fmt/format.h>

#include <cmath>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

double Support::motion(double x, double v, double t) const {
    const double s = damping_ratio * angular_frequency;
    const double p = angular_frequency * angular_frequency * (1.0 - damping_ratio * damping_ratio);
    const double root = std::sqrt(std::abs(p)), decay = std::exp(-s * t);
    if (root * t < 1e-6) return decay * (x + (v + s * x) * t);
    if (p > 0.0) return decay * (x * std::cos(root * t) + (v + s * x) * std::sin(root * t) / root);
    const double slow = std::exp(-(s - root) * t), fast = std::exp(-(s + root) * t);
    return 0.5 * (x * (slow + fast) + (v + s * x) * (slow - fast) / root);
}

Estimate estimate_of_reading(double value, double deviation, double degrees_of_freedom, double confidence) {
    const double reach = student_t_factor(confidence, degrees_of_freedom) * deviation;
    return {value, deviation, {value - reach, value + reach}, degrees_of_freedom};
}

bool disagrees(double ratio, double deviation, double degrees_of_freedom) {
    constexpr double material = 0.01, told = 0.999;
    const double off = std::abs(ratio - 1.0);
    return off > material && off > student_t_factor(told, degrees_of_freedom) * deviation;
}

std::string percent(double share) {
    return fmt::format("{:.1f} % {}", 100.0 * std::abs(share), share > 0.0 ? "more" : "less");
}

Finding fall_finding(double seen, double gravity, const char* what) {
    return {"fall_disagrees_with_gravity", Severity::caution,
            fmt::format("{} {:.4g} m/s², {} than gravity ({:.6g} m/s²). Check the sensor's scale and that it "
                        "points along the fall; a guide that rubs also holds the mass back.",
                        what, seen, percent(seen / gravity - 1.0), gravity)};
}

}  // namespace ringwright::identify
