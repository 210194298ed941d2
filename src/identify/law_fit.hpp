#pragma once
// Choosing a damping law for one decay, and fitting it under the noise model of the curve fit.

#include <memory>
#include <optional>

#include "identify/curve_fit.hpp"
#include "identify/law_model.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// Another place where the fit has a minimum, with its likelihood over that of the best.
struct LawBranch {
    LawState state;
    double weight = 0.0;
};

/// A law fitted by generalised least squares. `curve` holds its noise, residual, innovations and the map of
/// its parameters (in the order of LawModel::pack), so that `spread_of` answers for them; its own model and
/// coefficients are still those of the viscous fit that the search started from.
struct LawFit {
    CurveFit curve;
    CurveFit viscous;  ///< the viscous fit that the search started from, with its own noise
    LawTerms terms;
    Measured measured = Measured::displacement;
    double rate = 1.0;  ///< the unit of time is 1/rate, s
    LawState state;
    /// With friction each number of half swings before the mass sticks is a minimum of its own, and the
    /// samples may not tell which is right.
    std::vector<LawBranch> branches;
    double criterion = 0.0;  ///< −2 log-likelihood and what its parameters and the noise's cost

    [[nodiscard]] LawModel model() const { return {curve.samples, measured, rate, terms}; }
    /// Unit of length in units of the samples' displacement: of displacement, or of displacement per 1/rate …
    [[nodiscard]] double length() const;
    /// Row of `curve.map` that belongs to a free parameter of the law; nothing when it is not free.
    [[nodiscard]] std::optional<Eigen::Index> row_of(LawParameter parameter) const;
};

[[nodiscard]] Measured measured_of(MeasuredQuantity quantity);

/// A chance that a viscous decay is given a richer law, about: what one more term must gain makes it so.
inline constexpr double richer_law_level = 0.01;

/// Laws are integrated cycle by cycle; what rings on longer (strings, forks, plates: seconds of computing) is
/// fitted as viscous.
constexpr double most_cycles_of_law = 200.0;
[[nodiscard]] bool rings_too_long(const CurveFit& fit);

/// The law that the samples ask for beside viscous damping; nothing where they ask for none, where the decay
/// rings too little to show one, or where none can be fitted. First one pass of the variational equations
/// along the viscous decay tells, to first order, how much better any law could fit (score test with the
/// noise estimated anew); only where that is more than chance are laws fitted, one term added at a time, each
/// where the Bayesian information criterion and a chi-squared test at `richer_law_level` over all terms both
/// ask for it. Further modes and tones near the mode or its multiples, which stand for a law that was not
/// there, are put aside and have to fit better than the law to stay. A decay that falls by less than a third
/// in the record (0.35 nepers) shows one amplitude only, at which every law is as good as viscous damping.
[[nodiscard]] std::optional<LawFit> choose_law(const CurveFit& viscous, const Recording& recording,
                                               const Event& event, const CurveFitOptions& options);

/// One search for the parameters under the noise as it is known; false where it finds none.
[[nodiscard]] bool refit(LawFit& fit, int evaluations);
/// Noise, parameters, noise … until neither moves.
[[nodiscard]] bool settle_law(LawFit& fit);

}  // namespace ringwright::identify
