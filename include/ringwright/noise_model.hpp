#pragma once
// Autoregressive noise of a fit's residuals, estimated together with what the fit takes away from them.

#include <Eigen/Core>
#include <cstddef>
#include <cstdint>
#include <optional>
#include <vector>

namespace ringwright {

/// Rows [begin, begin + length) of a design that follow one another in time without a gap.
struct Stretch {
    Eigen::Index begin = 0;
    Eigen::Index length = 0;
};

/// Stationary autoregressive noise x_t = Σ a_j x_(t−j) + e_t, held by its partial autocorrelations κ_1 … κ_p
/// (each in (−1, 1), so that every value is stationary) and the variance of e.
struct AutoregressiveNoise {
    Eigen::VectorXd partial_autocorrelation;
    double innovation_variance = 1.0;

    [[nodiscard]] Eigen::Index order() const { return partial_autocorrelation.size(); }
    /// a_1 … a_p by the Levinson–Durbin recursion.
    [[nodiscard]] Eigen::VectorXd coefficients() const;
    /// Variance of x.
    [[nodiscard]] double variance() const;
    /// Power spectral density at `cycles_per_sample` (0 … 0.5), two-sided, so that its mean over the band is
    /// the variance.
    [[nodiscard]] double spectral_density(double cycles_per_sample) const;
};

/// Turns each column of `columns` into innovations in units of √innovation_variance's numerator: after
/// whitening, noise of this model is white with variance `innovation_variance`. The first p rows of each
/// stretch use the predictors of lower order, so nothing is lost at the edges. Rows outside the stretches are
/// left as they are.
void whiten(const AutoregressiveNoise& noise, const std::vector<Stretch>& stretches,
            Eigen::Ref<Eigen::MatrixXd> columns);

/// Draws noise of this model into each stretch of `out` from unit normal deviates in `deviates` (same size).
void colour(const AutoregressiveNoise& noise, const std::vector<Stretch>& stretches,
            const Eigen::VectorXd& deviates, Eigen::Ref<Eigen::VectorXd> out);

/// Generalised least squares of `response` on `design` under one noise model: coefficients of the design,
/// their covariance for unit innovation variance, and the whitened residual sum of squares.
struct WhitenedFit {
    Eigen::VectorXd coefficients;
    Eigen::MatrixXd unit_covariance;
    double residual_sum = 0.0;
    double criterion = 0.0;  ///< −2 × restricted log-likelihood, constants dropped
    double likelihood_criterion =
        0.0;  ///< −2 × log-likelihood, constants dropped: comparable between designs
    bool valid = false;
};

/// Restricted likelihood (Patterson & Thompson 1971) of autoregressive noise for a linear model: the
/// coefficients are integrated out, so that what the fit takes from the residuals is not taken for less
/// noise. One pass over the rows gathers lagged products; each evaluation then costs O(p² k²), whatever the
/// number of rows. Preconditions: design has full column rank and well-scaled (preferably orthonormal)
/// columns.
class RestrictedLikelihood {
  public:
    RestrictedLikelihood(const Eigen::MatrixXd& design, const Eigen::VectorXd& response,
                         std::vector<Stretch> stretches, Eigen::Index highest_order);

    [[nodiscard]] WhitenedFit evaluate(const Eigen::VectorXd& partial_autocorrelation) const;
    /// The criterion of `evaluate` alone, at a fraction of its cost; infinite where that is not valid.
    [[nodiscard]] double criterion(const Eigen::VectorXd& partial_autocorrelation) const;
    [[nodiscard]] Eigen::Index rows() const { return rows_; }
    [[nodiscard]] Eigen::Index columns() const { return width_ - 1; }
    [[nodiscard]] Eigen::Index highest_order() const { return highest_order_; }

  private:
    [[nodiscard]] WhitenedFit evaluate(const Eigen::VectorXd& partial_autocorrelation,
                                       bool with_coefficients) const;
    [[nodiscard]] Eigen::MatrixXd gram(const Eigen::MatrixXd& predictors,
                                       const Eigen::VectorXd& variances) const;
    [[nodiscard]] const Eigen::MatrixXd& lag_products(Eigen::Index order) const;

    Eigen::Index rows_ = 0, width_ = 0, highest_order_ = 0;
    std::vector<Stretch> stretches_;
    std::vector<Eigen::MatrixXd> heads_, tails_;  // first and last rows of each stretch
    std::vector<Eigen::MatrixXd> full_products_;  // Σ z_t z_(t−j)ᵀ
    mutable std::vector<Eigen::MatrixXd> products_of_order_;
};

/// One plausible noise model with its weight, and the fit under it.
struct NoiseDraw {
    Eigen::VectorXd partial_autocorrelation;
    double weight = 1.0;
    WhitenedFit fit;
};

/// The noise model chosen, and draws from what else the residuals allow (the restricted likelihood with a
/// flat prior on each partial autocorrelation): what it cost to estimate the noise is read from their spread.
struct NoiseFit {
    AutoregressiveNoise noise;
    WhitenedFit fit;  ///< at the chosen model
    std::vector<NoiseDraw> draws;
    double degrees_of_freedom = 0.0;  ///< rows − columns
};

struct NoiseOptions {
    Eigen::Index highest_order = 10;
    /// Partial autocorrelations to start from: their order is kept, which costs a tenth of a search for it.
    std::optional<Eigen::VectorXd> start{};
    int draws = 40;  ///< 0: none
    std::uint64_t seed = 1;
};

/// Chooses the order by the Bayesian information criterion (Schwarz 1978) on the restricted likelihood and
/// estimates the partial autocorrelations. Precondition: rows − columns ≥ 3.
[[nodiscard]] NoiseFit fit_noise(const RestrictedLikelihood& likelihood, const NoiseOptions& options = {});

}  // namespace ringwright
