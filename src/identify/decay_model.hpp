#pragma once
// The smooth decay model and its derivatives: one form from undamped through critical to overdamped.

#include <Eigen/Core>
#include <optional>
#include <vector>

#include "ringwright/noise_model.hpp"

namespace ringwright::identify {

/// One decaying mode y = e^(−s t) [A C(p,t) + B ω S(p,t)], s = ζω, p = ω²(1 − ζ²), held by coordinates in
/// which the problem is well scaled everywhere: z = asinh ζ, w = ln ω. For ζ ≫ 1 only w − z = ln(k/c) is
/// determined, along a straight line in (z, w).
struct Oscillator {
    double asinh_damping = 0.0;
    double log_frequency = 0.0;  ///< natural logarithm of the undamped angular frequency in rad/s

    [[nodiscard]] static Oscillator from(double damping_ratio, double angular_frequency);
    [[nodiscard]] double damping_ratio() const;
    [[nodiscard]] double angular_frequency() const;  ///< undamped, rad/s
    [[nodiscard]] double decay_rate() const;         ///< ζω, 1/s
    /// √p/2π in Hz below critical damping, else 0.
    [[nodiscard]] double damped_frequency_hz() const;
    /// Modulus of the fastest pole, rad/s: what the sampling must resolve.
    [[nodiscard]] double fastest_rate() const;
    /// Decay rate of what is left last, 1/s: ζω below critical damping, ω(ζ − √(ζ² − 1)) beyond.
    [[nodiscard]] double slowest_rate() const;
};

/// Everything that a recorded decay is made of. Offset, drift and amplitudes are linear and never stored
/// here.
struct DecayModel {
    std::vector<Oscillator> oscillators;  ///< the mode meant first
    std::vector<double> tones;            ///< ln of angular frequencies of steady interference, rad/s
    std::vector<double> real_poles;       ///< ln of decay rates of nuisance exponentials (AC coupling), 1/s
    bool drift = false;                   ///< straight-line drift beside the offset
    /// The first oscillator is held still until this instant (s, on the samples' clock) and then released
    /// from rest: y = A until then and A e^(−s t) [C + s S] after it. It has one column instead of two.
    std::optional<double> release{};
    /// What is held has a height of its own, and the decay from the release on keeps both columns: a mass
    /// that is let go within τ starts as if it were let go at once from 1 + (ωτ)²/24 times its displacement.
    bool let_go_slowly = false;

    [[nodiscard]] Eigen::Index nonlinear_count() const;
    [[nodiscard]] Eigen::Index linear_count() const;
    [[nodiscard]] Eigen::Index first_oscillator_column() const { return drift ? 2 : 1; }
    /// Of the first oscillator: it is released at once.
    [[nodiscard]] bool has_one_column() const { return release && !let_go_slowly; }
    [[nodiscard]] Eigen::Index first_tone_column() const;
    [[nodiscard]] Eigen::VectorXd parameters() const;
    void set_parameters(const Eigen::VectorXd& parameters);
};

/// Samples of one decay as the fit sees them: block means of the recording. The mean of a decaying
/// exponential over a block of equal steps is the same exponential with another amplitude, so block means of
/// a uniform recording lose nothing but noise bandwidth. Where steps are unequal and blocks longer than one,
/// `fine_time` holds the time of every sample and the model is averaged over the same blocks.
struct DecaySamples {
    Eigen::VectorXd time;   ///< centre of each block, s after the start of the decay
    Eigen::VectorXd value;  ///< block means over `scale`
    std::vector<Stretch> stretches;
    Eigen::Index block = 1;
    double step_s = 0.0;  ///< between blocks
    bool uniform = true;  ///< steps within a stretch are equal
    double scale = 1.0;   ///< values times this are in units of the recording
    Eigen::VectorXd fine_time;
    [[nodiscard]] Eigen::Index size() const { return time.size(); }
};

/// Columns of the linear part: 1 [, t/T], then (C, ωS) of each oscillator (C + sS of one that is released
/// from rest; where it is let go slowly that and then what is held), (cos, sin) of each tone, each real pole.
[[nodiscard]] Eigen::MatrixXd linear_columns(const DecayModel& model, const DecaySamples& samples);
/// Derivative of columns · coefficients with respect to each nonlinear parameter: (z, w) of each oscillator,
/// tones, real poles, the release.
[[nodiscard]] Eigen::MatrixXd derivative_columns(const DecayModel& model, const DecaySamples& samples,
                                                 const Eigen::VectorXd& coefficients);

/// Modulus of the decaying term of oscillator `index` at t = 0, from its coefficients (A, B): √(A² + B²ω²/p)
/// below critical damping, |A| + |B| at or above.
[[nodiscard]] double start_amplitude(const DecayModel& model, const Eigen::VectorXd& coefficients,
                                     std::size_t index);

}  // namespace ringwright::identify
