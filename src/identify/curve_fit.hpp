#pragma once
// Least-squares curve fit of one free decay under a noise model that is estimated with it.

#include <Eigen/Core>
#include <optional>
#include <string>
#include <vector>

#include "identify/decay_window.hpp"
#include "identify/projected_fit.hpp"
#include "ringwright/event.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/noise_model.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

struct CurveFitOptions {
    std::optional<double> near_hz;
    std::optional<int> modes;  ///< exactly so many; otherwise as many as the data show
    int noise_draws = 40;
    std::uint64_t seed = 1;
    unsigned threads = 1;  ///< of the search for a start; the answer does not depend on it
};

/// A decay fitted by generalised least squares. All parameters, linear ones first, are q-coordinates times
/// `map`; in q-coordinates the design is orthonormal.
struct CurveFit {
    DecayWindow window;
    DecayWindow quiet;  ///< before the decay, with the same noise; empty where there is none
    DecaySamples samples;
    ProjectedFit fit;
    NoiseFit noise;
    Eigen::MatrixXd basis;  ///< orthonormal columns: design · map
    Eigen::MatrixXd map;
    Eigen::VectorXd residual;     ///< value − model, scaled like samples.value
    Eigen::VectorXd innovations;  ///< whitened residuals over their standard deviation
    Findings findings;
    std::vector<std::size_t> spikes;  ///< samples of the window replaced so far, ascending
    bool valid = false;
    std::string reason;  ///< why it is not valid

    [[nodiscard]] const Oscillator& oscillator() const { return fit.model.oscillators.front(); }
    [[nodiscard]] Eigen::Index linear_count() const { return fit.model.linear_count(); }
};

/// Fits the event. Never throws for what is in the samples.
[[nodiscard]] CurveFit fit_decay(const Recording& recording, const Event& event,
                                 const CurveFitOptions& options);

/// Scale and degrees of freedom of Student's t that describe the error of a scalar with `gradient` in all
/// parameters: the noise parameters are integrated over their draws, so that both own up to what it cost to
/// estimate the noise.
struct Spread {
    double scale = 0.0;
    double degrees_of_freedom = 1.0;
};
[[nodiscard]] Spread spread_of(const CurveFit& fit, const Eigen::VectorXd& gradient);

}  // namespace ringwright::identify
