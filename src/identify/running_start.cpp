#include "identify/running_start.hpp"

#include <algorithm>
#include <numbers>

#include "identify/law_window.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;

namespace {

constexpr double least_damping = 0.1, least_correlation = 0.3;  // of neighbouring noise
constexpr double false_alarm = 0.05;

bool near_first_sample(const CurveFit& fit) {
    constexpr double share = 0.25;
    const Oscillator& o = fit.oscillator();
    const double time =
        std::max(2.0 * std::numbers::pi / o.angular_frequency(), 2.0 / std::max(o.slowest_rate(), 1e-12));
    return static_cast<double>(fit.window.begin) / fit.window.rate_hz < share * time;
}

bool noise_is_slow(const CurveFit& fit) {
    const Eigen::VectorXd& partial = fit.noise.noise.partial_autocorrelation;
    return partial.size() > 0 && partial(0) > least_correlation;
}

bool explains_first(const CurveFit& fit, double until_s) {
    const Index rows = std::lower_bound(fit.samples.time.begin(), fit.samples.time.end(), until_s) -
                       fit.samples.time.begin();
    if (rows == 0) return false;
    return fit.innovations.head(rows).squaredNorm() <
           chi_squared_quantile(1.0 - false_alarm, static_cast<double>(rows));
}

}  // namespace

std::optional<RunningStart> fit_from_first_sample(const CurveFit& fit, const Recording& recording,
                                                  const Event& event, const CurveFitOptions& options) {
    constexpr double most_growth = 1.1;  // of the residual, by chance, over a wider window
    const bool may_run = fit.valid && !event.by_hand && event.flights.empty() && event.quiet_end == 0;
    if (!may_run || fit.window.begin == 0 || !near_first_sample(fit) || !noise_is_slow(fit) ||
        fit.oscillator().damping_ratio() < least_damping)
        return std::nullopt;
    RunningStart first{event, {}};
    first.event.begin = 0;
    first.fit = fit_decay(recording, first.event, options);
    const double earlier_s = static_cast<double>(fit.window.begin) / fit.window.rate_hz;
    // What asks for a further mode to explain what lies before the start is no decay that was running: a
    // plateau and a fall are such.
    if (first.fit.fit.model.oscillators.size() > fit.fit.model.oscillators.size()) return std::nullopt;
    if (!first.fit.valid || first.fit.window.begin != 0 || !explains_first(first.fit, earlier_s) ||
        residual_level(first.fit) > most_growth * residual_level(fit))
        return std::nullopt;
    return first;
}

}  // namespace ringwright::identify
