#include "identify/held_release.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "identify/curve_fit_steps.hpp"
#include "identify/law_window.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double least_damping = 0.15;
constexpr double worth_looking = 0.05;    // of a fit that a start on the plateau may have led astray
constexpr double sharp_release = 0.0005;  // of a period
constexpr double plateau_false_alarm = 1e-3;
constexpr double rows_in_fall = 40.0;  // a fall is over in a third of a period or more
constexpr int first_evaluations = 30;

bool can_be_held(const CurveFit& fit, const Recording& recording, const Event& event) {
    const DecayModel& model = fit.fit.model;
    const bool displaced =
        recording.quantity == MeasuredQuantity::displacement || recording.quantity == MeasuredQuantity::angle;
    return fit.valid && displaced && !event.by_hand && event.kind == TestKind::pluck &&
           event.flights.empty() && model.oscillators.size() == 1 && fit.spikes.empty() &&
           (fit.oscillator().damping_ratio() > worth_looking || model.drift || !model.real_poles.empty());
}

// Where the fitted curve leaves its start and reaches the rest: a tenth and nine tenths of the way, s after
// the start of its window.
struct Fall {
    double begin_s = 0.0, length_s = 0.0;
};

std::optional<Fall> fall_of(const CurveFit& fit) {
    VectorXd curve = fit.samples.value - fit.residual;
    curve.array() -= curve.tail(curve.size() / 4).mean();  // whatever the fit makes of the rest
    Index top = 0;
    const double height = curve.cwiseAbs().maxCoeff(&top);
    const double sign = curve(top) < 0.0 ? -1.0 : 1.0;
    Index begin = top, end = top;
    while (begin + 1 < curve.size() && sign * curve(begin) > 0.9 * height) ++begin;
    end = begin;
    while (end + 1 < curve.size() && sign * curve(end) > 0.1 * height) ++end;
    const double length = fit.samples.time(end) - fit.samples.time(begin);
    if (!(length > 0.0)) return std::nullopt;
    return Fall{fit.samples.time(begin), length};
}

// Plateau and decay from `before` falls ahead of the fall, or from as far as the recording goes back; nothing
// where that is too little and not all that there is.
std::optional<CurveFit> window_from(const CurveFit& fit, const Recording& recording, const Event& event,
                                    const Fall& fall, double before) {
    constexpr double least_before = 0.4;
    CurveFit held;
    const double rate = fit.window.rate_hz,
                 fall_begin = static_cast<double>(fit.window.begin) + fall.begin_s * rate;
    // Over a gap the samples say less than the time: then the fall seems to lie behind them.
    const std::size_t end = fit.window.begin + fit.window.size();
    if (!(fall_begin < static_cast<double>(end))) return std::nullopt;
    const double limit = event.quiet_end > event.quiet_begin ? 0.0 : static_cast<double>(event.quiet_end);
    const double begin = std::max(limit, fall_begin - before * fall.length_s * rate);
    const bool is_first_sample = begin == 0.0;
    if (!is_first_sample && begin > fall_begin - least_before * fall.length_s * rate) return std::nullopt;
    held.window = cut_window(recording, static_cast<std::size_t>(begin), end);
    const auto block = static_cast<Index>(std::max(1.0, fall.length_s * rate / rows_in_fall));
    held.samples = block_means(held.window, std::min(block, fit.samples.block * 4));
    DecaySamples& samples = held.samples;
    if (samples.stretches.size() != 1) return std::nullopt;
    if (samples.block > 1 && samples.fine_time.size() == 0) {
        samples.fine_time.resize(samples.size() * samples.block);
        for (Index i = 0; i < samples.fine_time.size(); ++i)
            samples.fine_time(i) = static_cast<double>(i) / rate;
        samples.uniform = false;
    }
    return held;
}

// From several damping ratios, each with the frequency and the release that the fall gives it: from rest the
// first tenth takes ωt = 0.45, the next eight about 1 + 1.1 ζ + 1.4 ζ².
ProjectedFit best_start(const DecaySamples& samples, const DecayModel& like, double fall_begin_s,
                        double fall_s) {
    constexpr std::array damping{0.25, 0.5, 0.8, 1.2, 2.0};
    std::optional<ProjectedFit> best;
    for (const double ratio : damping) {
        DecayModel start = like;
        const double omega = (1.0 + 1.1 * ratio + 1.4 * ratio * ratio) / fall_s;
        start.oscillators.front() = Oscillator::from(ratio, omega);
        start.release = std::max(0.3 * fall_begin_s, fall_begin_s - 0.45 / omega);
        ProjectedFit fit = fit_projected(start, samples, AutoregressiveNoise{}, first_evaluations);
        if (fit.model.parameters().allFinite() && (!best || fit.residual_sum < best->residual_sum))
            best = std::move(fit);
    }
    return *best;
}

bool rests_before_release(const CurveFit& held) {
    const double release = *held.fit.model.release;
    const Index rows = std::lower_bound(held.samples.time.begin(), held.samples.time.end(), release) -
                       held.samples.time.begin();
    // A recording that begins shortly before the release has no more of it, and one that begins behind it
    // none.
    const Index fewest = held.window.begin == 0 ? 1 : 6;
    if (rows < fewest) return false;
    return held.innovations.head(rows).squaredNorm() <
           chi_squared_quantile(1.0 - plateau_false_alarm, static_cast<double>(rows));
}

// Of the residuals, whitened by the noise model as it stands.
double whitened_sum(const CurveFit& held) {
    return held.innovations.squaredNorm() * held.noise.noise.innovation_variance;
}

// Whether the search for the best fit is over. One in which noise hides the fast pole runs along a valley
// towards ever more damping, until a further search gains nothing that counts beside the noise.
bool is_best(const CurveFit& held) {
    constexpr double nothing = 0.05;  // of the rise by which an interval's end is told, 4 and less
    if (held.fit.converged) return true;
    const ProjectedFit again = fit_projected(held.fit.model, held.samples, held.noise.noise);
    return whitened_sum(held) - again.residual_sum < nothing * held.noise.noise.innovation_variance;
}

bool settle_for_good(CurveFit& held) {
    constexpr int most = 6;
    for (int i = 0; i < most; ++i) {
        if (!settle(held)) return false;
        if (is_best(held)) return true;
    }
    return false;
}

std::optional<CurveFit> fit_from(const CurveFit& fit, const Recording& recording, const Event& event,
                                 const Fall& fall, double before) {
    auto held = window_from(fit, recording, event, fall, before);
    if (!held) return std::nullopt;
    DecayModel like = fit.fit.model;
    like.real_poles.clear();  // a start on the plateau asks for one
    like.drift = false;
    const double earlier_s =  // below zero where the fit began on the plateau long before the fall
        (static_cast<double>(fit.window.begin) - static_cast<double>(held->window.begin)) /
        fit.window.rate_hz;
    held->fit = best_start(held->samples, like, earlier_s + fall.begin_s, fall.length_s);
    if (!settle_for_good(*held) || !rests_before_release(*held)) return std::nullopt;
    return held;
}

// Whether the rows that a wider window adds before a narrower one show the same plateau in the same noise: an
// F test of what they add to the residual sum, whitened by the narrower one's noise. A hand that pulls the
// mass aside, or sets it down, adds more.
bool goes_on_before(const CurveFit& wider, const CurveFit& narrower) {
    const Index added = wider.samples.size() - narrower.samples.size();
    if (added <= 0) return true;
    VectorXd left = wider.residual * (wider.samples.scale / narrower.samples.scale);
    whiten(narrower.noise.noise, wider.samples.stretches, left);
    const double variance = narrower.noise.noise.innovation_variance;
    const double more = left.squaredNorm() / variance - narrower.innovations.squaredNorm();
    const double ratio = more / static_cast<double>(added);
    return std::isfinite(ratio) &&
           f_probability(std::max(0.0, ratio), static_cast<double>(added),
                         narrower.noise.degrees_of_freedom) < 1.0 - plateau_false_alarm;
}

// How much higher the decay begins than what is held, as a share of it.
struct Excess {
    double share = 0.0, uncertainty = 0.0;
};

Excess excess_of(const CurveFit& held) {
    const Index falling = held.fit.model.first_oscillator_column(), still = falling + 1;
    const double height = held.fit.coefficients(still);
    VectorXd gradient = VectorXd::Zero(held.map.rows());
    gradient(falling) = 1.0 / height, gradient(still) = -1.0 / height;
    return {held.fit.coefficients(falling) / height - 1.0, spread_of(held, gradient).scale};
}

// The same where the mass may have been let go within a tenth of a period and not at once, which adds 1.6 %
// to the displacement it seems to start from. The recording has to tell that by itself: where it cannot, and
// nothing speaks for it, so little does not matter and a release at once tells more.
std::optional<CurveFit> let_go_slowly(const CurveFit& at_once) {
    constexpr double matters = 0.02, clearly = 3.0;
    CurveFit slowly = at_once;
    DecayModel model = at_once.fit.model;
    model.let_go_slowly = true;
    slowly.fit = fit_projected(model, slowly.samples, at_once.noise.noise);
    if (!settle_for_good(slowly)) return std::nullopt;
    const Excess excess = excess_of(slowly);
    if (excess.uncertainty > matters && std::abs(excess.share) < clearly * excess.uncertainty)
        return std::nullopt;
    return slowly;
}

// Whether noise explains what the fit leaves from the plateau's end to a tenth of a period behind the
// release: a mass that is let go bit by bit leaves more.
bool explains_release(const CurveFit& held) {
    constexpr double before = 0.03, behind = 0.1, false_alarm = 0.01;  // of a period
    const double period = two_pi / held.oscillator().angular_frequency(), release = *held.fit.model.release;
    const auto row_at = [&](double time_s) {
        return std::lower_bound(held.samples.time.begin(), held.samples.time.end(), time_s) -
               held.samples.time.begin();
    };
    const Index first = row_at(release - before * period), rows = row_at(release + behind * period) - first;
    // None where that is shorter than a step.
    return rows > 0 && held.innovations.segment(first, rows).squaredNorm() <
                           chi_squared_quantile(1.0 - false_alarm, static_cast<double>(rows));
}

// Whether a decay that was running at the window's first sample explains the same samples as well, by their
// likelihood: nine is three standard deviations of what the instant of the release, the one parameter more,
// may gain.
bool may_have_been_running(const CurveFit& held) {
    constexpr double clearly = 9.0;
    DecayModel running = held.fit.model;
    running.release.reset();
    running.let_go_slowly = false;
    const ProjectedFit fit = fit_projected(running, held.samples, held.noise.noise);
    return fit.residual_sum - whitened_sum(held) < clearly * held.noise.noise.innovation_variance;
}

double release_uncertainty(const CurveFit& held) {
    VectorXd gradient = VectorXd::Zero(held.map.rows());
    gradient(gradient.size() - 1) = 1.0;
    return spread_of(held, gradient).scale;
}

}  // namespace

bool HeldRelease::sharp() const {
    return !explained || uncertainty_s < sharp_release * two_pi / curve.oscillator().angular_frequency();
}

Event HeldRelease::behind(const Event& event, const Recording& recording) const {
    constexpr double safely = 3.0, while_let_go = 0.1;  // of a period
    const SampleClock& clock = recording.clock;
    const double period = two_pi / curve.oscillator().angular_frequency();
    const double after = std::max(safely * uncertainty_s, explained ? 0.0 : while_let_go * period);
    Event later = event;
    later.begin = 0;
    while (later.begin < event.end && clock.time_of(later.begin) < release_s + after) ++later.begin;
    return later;
}

std::optional<HeldRelease> fit_held_release(const CurveFit& fit, const Recording& recording,
                                            const Event& event, const CurveFitOptions& options) {
    constexpr std::array falls_before{1.0, 1.8, 3.0, 5.0};
    if (!can_be_held(fit, recording, event)) return std::nullopt;
    const auto fall = fall_of(fit);
    if (!fall) return std::nullopt;
    std::optional<CurveFit> held;
    for (const double before : falls_before) {
        auto longer = fit_from(fit, recording, event, *fall, before);
        if (!longer || (held && !goes_on_before(*longer, *held))) break;
        const bool is_whole = longer->window.begin == 0;
        held = std::move(longer);
        if (is_whole) break;
    }
    constexpr double most_growth = 1.15;  // of the residual, by chance, over a wider window
    if (!held || held->oscillator().damping_ratio() < least_damping) return std::nullopt;
    // The round top of a swing can pass for a short plateau; what lies before the first sample nobody knows.
    const bool may_be_none = may_have_been_running(*held);
    if (may_be_none && held->window.begin != 0) return std::nullopt;
    const double finer = std::max(
        1.0, std::sqrt(static_cast<double>(fit.samples.block) / static_cast<double>(held->samples.block)));
    const bool as_good = residual_level(*held) <= most_growth * finer * residual_level(fit);
    if (auto slowly = let_go_slowly(*held)) held = std::move(slowly);
    if (!estimate_noise(*held, noise_with_draws(options))) return std::nullopt;
    held->valid = true;
    HeldRelease release;
    release.explained = as_good && explains_release(*held);
    release.may_be_none = may_be_none;
    release.uncertainty_s = release_uncertainty(*held);
    release.release_s = recording.clock.time_of(held->window.begin) + *held->fit.model.release;
    held->findings = fit.findings;
    std::erase_if(held->findings, [](const Finding& finding) {
        return finding.code == "drift" || finding.code == "slow_exponential";
    });
    held->findings.push_back(
        {"release_hidden", Severity::note,
         fmt::format(
             "The instant of release was read from the recording as well ({:.4g} s, standard uncertainty "
             "{:.2g} s): plateau, release and decay were fitted together, and the intervals contain its "
             "uncertainty{}. Less noise or a larger displacement narrows them{}.",
             release.release_s, release.uncertainty_s,
             release.may_be_none ? ", and that it may have been before the first sample" : "",
             release.may_be_none ? ", and so does a recording that begins earlier" : "")});
    release.curve = std::move(*held);
    return release;
}

}  // namespace ringwright::identify
