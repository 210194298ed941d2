#include "identify/spectrum.hpp"

#include <fftw3.h>

#include <cmath>
#include <memory>
#include <mutex>

#include "ringwright/transform_planner.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

struct FreeFftw {
    void operator()(void* p) const { fftw_free(p); }
};

}  // namespace

PowerSpectrum power_spectrum(const VectorXd& signal, double padding) {
    Index length = 16;
    while (static_cast<double>(length) < padding * static_cast<double>(signal.size())) length *= 2;
    const Index bins = length / 2 + 1;
    const std::unique_ptr<double, FreeFftw> in(fftw_alloc_real(static_cast<std::size_t>(length)));
    const std::unique_ptr<fftw_complex, FreeFftw> out(fftw_alloc_complex(static_cast<std::size_t>(bins)));
    fftw_plan plan = nullptr;
    {
        const std::scoped_lock lock(transform_planner());
        plan = fftw_plan_dft_r2c_1d(static_cast<int>(length), in.get(), out.get(), FFTW_ESTIMATE);
    }
    Eigen::Map<VectorXd> padded(in.get(), length);
    padded.setZero();
    padded.head(signal.size()) = signal;
    fftw_execute(plan);
    PowerSpectrum spectrum;
    spectrum.bin_cycles = 1.0 / static_cast<double>(length);
    spectrum.power.resize(bins);
    for (Index i = 0; i < bins; ++i) {
        const auto& bin = out.get()[i];
        spectrum.power(i) = bin[0] * bin[0] + bin[1] * bin[1];
    }
    const std::scoped_lock lock(transform_planner());
    fftw_destroy_plan(plan);
    return spectrum;
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
