#pragma once
// The steps of the curve fit that look at its residuals.

#include "identify/curve_fit.hpp"

namespace ringwright::identify {

/// Estimates the noise of the residuals and the parameter map; false where the design has not full rank.
bool estimate_noise(CurveFit& fit, int draws, std::uint64_t seed);
/// Generalised least squares to convergence: noise, parameters, noise … until neither moves.
bool settle(CurveFit& fit);

/// Replaces isolated spikes (beyond 7 robust standard deviations of the residuals, at most 1 % of the
/// samples) in the window by the model plus the residual around them; true when there were any, with a
/// finding.
bool replace_spikes(CurveFit& fit);

/// Adds steady tones (hum) and further modes that the residuals show, each where the likelihood gains what
/// chance alone reaches in one recording in a thousand.
void add_components(CurveFit& fit, const CurveFitOptions& options);
/// Adds a straight-line drift or a slow exponential to the model where the likelihood gains what chance alone
/// reaches in one recording in a thousand.
void add_slow_term(CurveFit& fit);
/// A finding for what add_slow_term added.
void describe_slow_terms(CurveFit& fit);

/// A finding for each tone and each mode beside the one that comes first.
void describe_components(CurveFit& fit);

}  // namespace ringwright::identify
