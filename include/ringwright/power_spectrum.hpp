#pragma once
#include <span>
#include <vector>

namespace ringwright {

/// |Σ y_k e^(−2πijk/n)|² for j = 0 … n/2, of values padded with zeros to n, the power of two that is at least
/// `padding` times their number and at least 16. By FFTW, whose plan for each n is made once and kept;
/// threads may call it side by side.
[[nodiscard]] std::vector<double> padded_power_spectrum(std::span<const double> values, double padding);

}  // namespace ringwright
