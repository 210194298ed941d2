#pragma once
#include "identify/method_bootstrap.hpp"
#include "ringwright/identify.hpp"

namespace ringwright::identify {

/// What the pictures of one event show, from the fit and the simple methods; times on the recording's clock.
[[nodiscard]] DecayPicture draw_decay(const Recording& recording, const CurveFit& fit,
                                      const MethodBootstrap& bootstrap);

}  // namespace ringwright::identify
