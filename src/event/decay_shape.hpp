#pragma once
// The decay model on equally spaced points, as the search uses it: three linear amplitudes, two shape
// numbers.

#include <cstddef>
#include <optional>
#include <span>

namespace ringwright::event_search {

/// Undamped angular frequency in rad a step and damping ratio of e^(−st)[A·C(p,t) + B·S(p,t)],
/// s = ζ ω_n, p = ω_n² (1 − ζ²).
struct DecayShape {
    double undamped_angular_frequency = 0.0;
    double damping_ratio = 0.0;
    [[nodiscard]] double decay_rate() const { return damping_ratio * undamped_angular_frequency; }
    /// Rate of the slowest decaying term, 1/step: s below critical damping, s − √−p above.
    [[nodiscard]] double slow_rate() const;
    [[nodiscard]] bool rings() const { return damping_ratio < 0.999; }
    /// Damped angular frequency, rad a step; 0 at and beyond critical damping.
    [[nodiscard]] double damped_angular_frequency() const;
};

/// The shape per block of 2^to steps from that per block of 2^from steps.
[[nodiscard]] DecayShape at_level(const DecayShape& shape, std::size_t from, std::size_t to);

/// e^(−st) C(p,t) and e^(−st) S(p,t), t in steps; t may be negative.
struct DecayTerms {
    double cosine_like = 0.0;
    double sine_like = 0.0;
};
[[nodiscard]] DecayTerms decay_terms(const DecayShape& shape, double t);

/// e^(−st)[A·C + B·S].
struct DecayAmplitudes {
    double cosine_part = 0.0, sine_part = 0.0;
    [[nodiscard]] double at(const DecayTerms& terms) const {
        return cosine_part * terms.cosine_like + sine_part * terms.sine_like;
    }
};
/// Those of its rate, 1/step.
[[nodiscard]] DecayAmplitudes rate_of(const DecayShape& shape, const DecayAmplitudes& amplitudes);

/// A least-squares fit of offset + e^(−st)[A·C + B·S] to points at t = 0, 1, 2 …
struct DecayFit {
    DecayShape shape;
    double offset = 0.0, cosine_part = 0.0, sine_part = 0.0;
    double residual_sum = 0.0;  ///< of squares about the fit
    double total_sum = 0.0;     ///< of squares about the mean
    std::size_t points = 0;
    [[nodiscard]] double value_at(double t) const;
    /// Modulus of the decaying part at t in units of the points, free of the phase of the oscillation; from
    /// half of critical damping on, the largest excursion from t on.
    [[nodiscard]] double envelope_at(double t) const;
    [[nodiscard]] double residual_rms() const;
    /// (explained sum of squares)/(residual sum of squares).
    [[nodiscard]] double explained_ratio() const;
};

/// The fit with the shape held.
[[nodiscard]] DecayFit fit_amplitudes(std::span<const double> points, const DecayShape& shape);
/// (explained)/(residual sum of squares) of the best among a coarse grid of shapes: what a fit can hope for.
[[nodiscard]] double roughly_explained(std::span<const double> points);
/// Shape and amplitudes, by variable projection from `start`, or from the best of a grid of shapes when none
/// is given. Nothing with fewer than 8 points or for a constant.
[[nodiscard]] std::optional<DecayFit> fit_decay(std::span<const double> points,
                                                const std::optional<DecayShape>& start = {});

}  // namespace ringwright::event_search
