#pragma once
// Bias, scatter and common errors of the three methods, from replicates of the fitted decay with noise drawn
// anew.

#include <array>
#include <cstdint>
#include <string>

#include "identify/curve_fit.hpp"
#include "identify/half_power.hpp"
#include "identify/logarithmic_decrement.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// The two simple methods on the event's samples and on every replicate.
struct MethodReadings {
    DecrementReading decrement;
    HalfPowerReading half_power;
    HalfPowerSettings half_power_settings;
};

/// (ln natural frequency, damping ratio) of one method over the replicates.
struct MethodErrors {
    bool usable = false;
    std::string reason;
    std::array<double, 2> bias{};
    std::array<double, 2> deviation{};
    double correlation = 0.0;
    std::vector<std::array<double, 2>> errors;  ///< replicate by replicate, curve fit's own error taken along
    std::vector<std::array<double, 2>> fit_errors;  ///< of the curve fit in the same replicates
};

struct MethodBootstrap {
    MethodReadings readings;
    MethodErrors decrement, half_power;
};

/// Runs both methods on the samples of a valid fit, then on `replicates` decays with the fitted parameters
/// and noise drawn from the noise model (its own uncertainty included). Preconditions: fit.valid.
/// The answer does not depend on the number of threads.
[[nodiscard]] MethodBootstrap bootstrap_methods(const CurveFit& fit, int replicates, std::uint64_t seed,
                                                unsigned threads = 1);

}  // namespace ringwright::identify
