#pragma once
// A heavily damped article that was held still and let go: the plateau, the instant of the release and the
// decay in one model.

#include <optional>

#include "identify/curve_fit.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// Noise hides when a displaced mass is let go for about √(2σ/x₀)/ω. In a light decay that is a small part of
/// many cycles; in one that is over within a cycle, a start on the plateau takes it for a slower decay, by
/// more than any interval for a known start allows. Here the instant of the release is a parameter of the fit
/// and its uncertainty goes into every interval. A hand or a clamp lets go within a tenth of a period: where
/// the recording can tell, the decay begins at a height of its own (`DecayModel::let_go_slowly`).
struct HeldRelease {
    CurveFit curve;              ///< of plateau and decay, `fit.model.release` set
    double release_s = 0.0;      ///< on the recording's clock
    double uncertainty_s = 0.0;  ///< of the release
    bool explained = true;       ///< noise explains what is left about the release (one false alarm in 100)

    bool may_be_none = false;  ///< a decay that was running at the recording's first sample explains it too

    /// Seen within 0.05 % of a period, or let go in a way that the model does not know: then a decay that is
    /// taken from safely behind the release says as much and supposes nothing of how the article was let go.
    [[nodiscard]] bool sharp() const;
    /// The event with its start three uncertainties behind the release, or a tenth of a period where the
    /// model does not explain it.
    [[nodiscard]] Event behind(const Event& event, const Recording& recording) const;
};

/// The decay that `fit` found, with what was held before it. Nothing where the damping ratio is too small for
/// the start to matter (0.15), the recording shows no displacement, other components were fitted, it was hit
/// or dropped, or no plateau of the same noise is recorded before the decay (chi-squared, one false alarm in
/// a thousand), or where a decay that was running at the first sample looked at explains a hold in the midst
/// of the recording as well. Of a recording that begins shortly before the decay a single row of plateau will
/// do.
[[nodiscard]] std::optional<HeldRelease> fit_held_release(const CurveFit& fit, const Recording& recording,
                                                          const Event& event, const CurveFitOptions& options);

}  // namespace ringwright::identify
