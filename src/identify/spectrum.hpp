#pragma once
// Power spectrum of a short real signal, zero-padded, through FFTW.

#include <Eigen/Core>

namespace ringwright::identify {

struct PowerSpectrum {
    Eigen::VectorXd power;    ///< |DFT|² of the padded signal, bins 0 … n/2
    double bin_cycles = 0.0;  ///< cycles per sample between bins
};

/// Padded with zeros to the power of two that is at least `padding` times the length. Thread-safe.
[[nodiscard]] PowerSpectrum power_spectrum(const Eigen::VectorXd& signal, double padding = 4.0);

/// Position of the largest value in [first, last] refined by the parabola through it and its neighbours (in
/// bins).
[[nodiscard]] double refined_peak(const Eigen::VectorXd& power, Eigen::Index first, Eigen::Index last);

}  // namespace ringwright::identify
