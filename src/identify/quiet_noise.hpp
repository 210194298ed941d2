#pragma once
// The quiet stretch before a decay: it shows the noise without the decay.

#include <Eigen/Core>

#include "identify/curve_fit.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// Block means of the quiet stretch, as wide and scaled like those of the decay, and the columns that they
/// have to themselves: level, slope, and the steady tones of the decay's model.
struct QuietRows {
    Eigen::VectorXd value;
    Eigen::MatrixXd design;
};

[[nodiscard]] QuietRows quiet_rows(const CurveFit& fit);

/// The stretch before the decay whose noise is that of the decay: at rest before a tap, held still before a
/// release. Two tests on the innovations, each with one false alarm in a thousand, decide: their mean square
/// (F), and a slope or a bend that a moving hand would leave (F). Empty where there is none.
[[nodiscard]] DecayWindow find_quiet(const CurveFit& fit, const Recording& recording, const Event& event);

}  // namespace ringwright::identify
