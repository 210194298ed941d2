#include "ringwright/damping_relations.hpp"

#include <cassert>
#include <cmath>
#include <numbers>

namespace ringwright {
namespace {

constexpr double pi = std::numbers::pi;

double square(double x) {
    return x * x;
}
double angular(double frequency_hz) {
    return 2.0 * pi * frequency_hz;
}
/// √(1 − ζ²) without loss of digits near one.
double damped_share(double damping_ratio) {
    assert(damping_ratio >= 0.0 && damping_ratio < 1.0);
    return std::sqrt((1.0 - damping_ratio) * (1.0 + damping_ratio));
}

}  // namespace

double logarithmic_decrement(double damping_ratio) {
    return 2.0 * pi * damping_ratio / damped_share(damping_ratio);
}

double damping_ratio_from_decrement(double decrement) {
    return decrement / std::hypot(2.0 * pi, decrement);
}

double decrement_between(double earlier, double later, double cycles) {
    assert(earlier > 0.0 && later > 0.0 && cycles > 0.0);
    return std::log(earlier / later) / cycles;
}

double cycles_to_fraction(double damping_ratio, double fraction) {
    assert(fraction > 0.0 && fraction <= 1.0 && damping_ratio > 0.0);
    return -std::log(fraction) / logarithmic_decrement(damping_ratio);
}

double damped_frequency(double natural_frequency, double damping_ratio) {
    return natural_frequency * damped_share(damping_ratio);
}

double undamped_frequency(double damped, double damping_ratio) {
    return damped / damped_share(damping_ratio);
}

double decay_rate(double natural_frequency_hz, double damping_ratio) {
    return damping_ratio * angular(natural_frequency_hz);
}

double energy_lost_per_cycle(double damping_ratio) {
    return -std::expm1(-2.0 * logarithmic_decrement(damping_ratio));
}

double quality_factor(double damping_ratio) {
    assert(damping_ratio > 0.0);
    return 0.5 / damping_ratio;
}

double loss_factor(double damping_ratio) {
    return 2.0 * damping_ratio;
}

double decay_time_60db(double natural_frequency_hz, double damping_ratio) {
    assert(natural_frequency_hz > 0.0 && damping_ratio > 0.0);
    return std::log(1000.0) / decay_rate(natural_frequency_hz, damping_ratio);
}

double critical_damping_coefficient(double stiffness, double mass) {
    assert(stiffness >= 0.0 && mass >= 0.0);
    return 2.0 * std::sqrt(stiffness * mass);
}

double two_extremes_relative_deviation(double u) {
    assert(u > 0.0);
    return std::sqrt(1.0 + std::exp(2.0 * u)) / u;
}

std::optional<HalfPowerPoints> half_power_points(FrequencyResponse response,
                                                 const FrequencyAndDamping& oscillator) {
    const double frequency = oscillator.natural_frequency_hz;
    const double ratio = oscillator.damping_ratio;
    if (!(ratio > 0.0) || !(frequency > 0.0)) return std::nullopt;
    if (response == FrequencyResponse::mobility) {
        const double factor = std::sqrt(1.0 + square(ratio)) + ratio;
        return HalfPowerPoints{frequency / factor, frequency * factor};
    }
    if (ratio >= half_power_damping_limit) return std::nullopt;
    const double angle = 2.0 * std::asin(ratio);
    const double low = std::sqrt(std::cos(angle) - std::sin(angle));
    const double high = std::sqrt(std::cos(angle) + std::sin(angle));
    if (response == FrequencyResponse::receptance) return HalfPowerPoints{frequency * low, frequency * high};
    return HalfPowerPoints{frequency / high, frequency / low};
}

FrequencyAndDamping from_half_power_points(FrequencyResponse response, const HalfPowerPoints& points) {
    assert(points.low_hz > 0.0 && points.high_hz > points.low_hz && std::isfinite(points.high_hz));
    const double low = points.low_hz, high = points.high_hz;
    if (response == FrequencyResponse::mobility) {
        const double frequency = std::sqrt(low) * std::sqrt(high);
        return {frequency, (high - low) / (2.0 * frequency)};
    }
    const double difference = (high - low) * (high + low);
    const double sum = square(low) + square(high);
    const double angle = std::atan2(difference, sum);  // 2θ
    const double cosine = std::cos(angle);
    const double squared = response == FrequencyResponse::receptance
                               ? sum / (2.0 * cosine)
                               : 2.0 * cosine * square(low) * (square(high) / sum);
    return {std::sqrt(squared), std::sin(0.5 * angle)};
}

std::optional<double> peak_frequency(FrequencyResponse response, const FrequencyAndDamping& oscillator) {
    if (response == FrequencyResponse::mobility) return oscillator.natural_frequency_hz;
    const double squared = 1.0 - 2.0 * square(oscillator.damping_ratio);
    if (!(squared > 0.0)) return std::nullopt;
    const double factor = std::sqrt(squared);
    return response == FrequencyResponse::receptance ? oscillator.natural_frequency_hz * factor
                                                     : oscillator.natural_frequency_hz / factor;
}

double half_power_width_from(double width, double decibels_below_peak) {
    assert(decibels_below_peak > 0.0);
    return width / std::sqrt(std::expm1(decibels_below_peak / 10.0 * std::numbers::ln10));
}

double equivalent_viscous_of_friction(double friction_force, double amplitude, double angular_frequency) {
    assert(amplitude > 0.0 && angular_frequency > 0.0);
    return 4.0 * friction_force / (pi * angular_frequency * amplitude);
}

double equivalent_viscous_of_quadratic(double quadratic_damping, double amplitude, double angular_frequency) {
    return 8.0 * quadratic_damping * angular_frequency * amplitude / (3.0 * pi);
}

double damping_ratio_of(double damping_coefficient, double stiffness, double mass) {
    assert(stiffness > 0.0 && mass > 0.0);
    return damping_coefficient / critical_damping_coefficient(stiffness, mass);
}

double friction_loss_per_cycle(double friction_force, double stiffness) {
    assert(stiffness > 0.0);
    return 4.0 * friction_force / stiffness;
}

double friction_force_from_loss(double first_amplitude, double last_amplitude, double cycles,
                                double stiffness) {
    assert(cycles > 0.0);
    return stiffness * (first_amplitude - last_amplitude) / (4.0 * cycles);
}

std::size_t half_cycles_to_rest(double start_amplitude, double friction_force, double stiffness) {
    assert(friction_force > 0.0 && stiffness > 0.0 && start_amplitude >= 0.0);
    const double held = friction_force / stiffness;
    const double half_cycles = std::ceil((start_amplitude - held) / (2.0 * held));
    return half_cycles > 0.0 ? static_cast<std::size_t>(half_cycles) : 0;
}

double stiffness_of(double mass, double natural_frequency_hz) {
    return mass * square(angular(natural_frequency_hz));
}

double natural_frequency_of(double stiffness, double mass) {
    assert(stiffness >= 0.0 && mass > 0.0);
    return std::sqrt(stiffness / mass) / (2.0 * pi);
}

double static_deflection(double natural_frequency_hz, double gravity) {
    assert(natural_frequency_hz > 0.0);
    return gravity / square(angular(natural_frequency_hz));
}

double natural_frequency_from_deflection(double deflection, double gravity) {
    assert(deflection > 0.0);
    return std::sqrt(gravity / deflection) / (2.0 * pi);
}

std::optional<MassAndStiffness> from_added_mass(double frequency_hz, double loaded_frequency_hz,
                                                double added_mass) {
    if (!(frequency_hz > loaded_frequency_hz && loaded_frequency_hz > 0.0 && added_mass > 0.0))
        return std::nullopt;
    const double difference = (frequency_hz - loaded_frequency_hz) * (frequency_hz + loaded_frequency_hz);
    const double mass = added_mass * square(loaded_frequency_hz) / difference;
    return MassAndStiffness{mass, stiffness_of(mass, frequency_hz)};
}

double moving_mass(double mass, double spring_mass) {
    return mass + spring_mass / 3.0;
}

}  // namespace ringwright
