#include "identify/spectrum.hpp"

#include <cmath>
#include <vector>

#include "ringwright/power_spectrum.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

PowerSpectrum power_spectrum(const VectorXd& signal, double padding) {
    const std::vector<double> power =
        padded_power_spectrum({signal.data(), static_cast<std::size_t>(signal.size())}, padding);
    const auto bins = static_cast<Index>(power.size());
    return {Eigen::Map<const VectorXd>(power.data(), bins), 1.0 / static_cast<double>(2 * (bins - 1))};
}

double refined_peak(const VectorXd& power, Index first, Index last) {
    Index peak = first;
    for (Index i = first; i <= last; ++i)
        if (power(i) > power(peak)) peak = i;
    if (peak <= 0 || peak + 1 >= power.size()) return static_cast<double>(peak);
    const double left = std::log(power(peak - 1) + 1e-300), middle = std::log(power(peak) + 1e-300),
                 right = std::log(power(peak + 1) + 1e-300);
    const double bend = left - 2.0 * middle + right;
    return static_cast<double>(peak) + (bend < 0.0 ? 0.5 * (left - right) / bend : 0.0);
}

}  // namespace ringwright::identify
