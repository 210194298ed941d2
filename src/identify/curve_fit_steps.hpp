#pragma once
// The steps of the curve fit that look at its residuals.

#include <optional>
#include <vector>

#include "identify/curve_fit.hpp"

namespace ringwright::identify {

/// How far behind the decay a fit reads on: the noise there is the same noise, and a short decay needs it.
[[nodiscard]] std::size_t end_of_fit(const Event& event);

/// Rows on either side without which `same_noise` tells nothing.
inline constexpr Eigen::Index fewest_to_tell_noise = 20;
/// Whether innovations have one mean square before row `split` and from there on: an F test, one false alarm
/// in a thousand.
[[nodiscard]] bool same_noise(const Eigen::VectorXd& innovations, Eigen::Index split);
/// Whether what is read behind the decay has the same noise as the decay, or is too little to tell. A mass
/// that sticks, or a coarse sensor at rest, is quieter; a hand on the bench is louder.
[[nodiscard]] bool same_noise_behind(const CurveFit& fit, const Event& event);

/// Estimates the noise of the residuals and the parameter map; false where the design has not full rank.
bool estimate_noise(CurveFit& fit, const NoiseOptions& options);
/// The same for a model with these columns (derivatives by all its parameters) and this residual.
bool estimate_noise(CurveFit& fit, const Eigen::MatrixXd& all_columns, const Eigen::VectorXd& residual,
                    const NoiseOptions& options);
/// The search of the noise's order with the draws that the answer's uncertainty is read from, or without.
[[nodiscard]] NoiseOptions noise_with_draws(const CurveFitOptions& options);
[[nodiscard]] NoiseOptions noise_alone();
/// The same for what differs from `fit` by terms that take up what its noise model had to: no higher order.
[[nodiscard]] NoiseOptions noise_no_higher(const CurveFit& fit);
/// From the noise as it is, whose order stays.
[[nodiscard]] NoiseOptions noise_from(const CurveFit& fit);
/// Generalised least squares to convergence: noise, parameters, noise … until neither moves.
bool settle(CurveFit& fit);

/// Whether the noise model has a resonance about this frequency (rad/s; 6 dB above what it has at half of
/// it): ringing that the model of the decay leaves, rather than noise.
[[nodiscard]] bool noise_rings_at(const CurveFit& fit, double angular_frequency);

/// Replaces isolated spikes (beyond 7 robust standard deviations of the residuals, at most 1 % of the
/// samples) in the window by the model plus the residual around them; true when there were any, with a
/// finding.
bool replace_spikes(CurveFit& fit);

/// Another window of the recording: its samples are as recorded, so what was replaced and said before is
/// forgotten.
void cut_again(CurveFit& fit, const Recording& recording, std::size_t begin, std::size_t end);

/// Adds steady tones (hum) and further modes that the residuals show, each where the likelihood gains what
/// chance alone reaches in one recording in a thousand.
void add_components(CurveFit& fit, const CurveFitOptions& options);
/// Short loud stretches in the midst of a decay, samples of the window.
struct Knocks {
    std::vector<SampleRange> ranges;
    [[nodiscard]] bool any() const { return !ranges.empty(); }
};
/// Takes loud stretches of the innovations (mean square of five blocks beyond nine robust variances; at most
/// three stretches, 12 % of the blocks, not at either end) out of the window's runs.
Knocks leave_out_knocks(CurveFit& fit);
/// Where the decay has to end because the knock moved the article: it goes on with another amplitude or phase
/// (one false alarm in 10,000). For a fit that leaves the knocks out.
std::optional<std::size_t> changed_behind(const CurveFit& fit, const Knocks& knocks);
Finding knock_finding(const CurveFit& fit, const Knocks& knocks, bool ends_the_decay);

/// Adds a straight-line drift or a slow exponential to the model where the likelihood gains what chance alone
/// reaches in one recording in a thousand.
void add_slow_term(CurveFit& fit);
/// A finding for what add_slow_term added.
void describe_slow_terms(CurveFit& fit);

/// Takes out modes that cover the one that comes first, more than twice as broad: they stand for damping or
/// stiffness that depends on amplitude.
void drop_covering_modes(CurveFit& fit);
/// A finding for each tone and each mode beside the one that comes first.
void describe_components(CurveFit& fit);

}  // namespace ringwright::identify
