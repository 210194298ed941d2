#include "identify/law_window.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "identify/curve_fit_steps.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double earlier_false_alarm = 1e-4;
constexpr double first_step = 0.25, last_step = 0.02;  // periods
constexpr double farthest_without_quiet = 2.0;         // periods
constexpr int evaluations = 20;

double period_samples(const LawFit& fit) {
    return two_pi / (fit.rate * fit.state.law.angular_frequency()) * fit.curve.window.rate_hz;
}

double unrest(const std::vector<double>& samples, std::size_t begin, std::size_t end) {
    const auto n = static_cast<double>(end - begin);
    double sum = 0.0, square = 0.0;
    for (std::size_t i = begin; i < end; ++i) sum += samples[i];
    for (std::size_t i = begin; i < end; ++i) square += (samples[i] - sum / n) * (samples[i] - sum / n);
    return std::sqrt(square / (n - 1.0));
}

std::size_t end_of(const LawFit& fit) {
    return fit.curve.window.begin + fit.curve.window.size();
}

// Where the motion was `seconds` before: the same equation with friction and damping that drive instead of
// brake, run forwards in mirrored time.
DampingLaw mirrored_in_time(const DampingLaw& law) {
    DampingLaw mirrored = law;
    mirrored[LawParameter::velocity] = -law[LawParameter::velocity];
    for (const LawParameter p : {LawParameter::damping, LawParameter::friction, LawParameter::quadratic})
        mirrored[p] = -law[p];
    return mirrored;
}

void turn_back(const LawModel& model, DampingLaw& law, double seconds) {
    const DampingLaw mirrored = mirrored_in_time(law);
    const LawMotion x = model.motion(mirrored, Measured::displacement, {seconds});
    const LawMotion v = model.motion(mirrored, Measured::velocity, {seconds});
    law[LawParameter::displacement] = x.value(0);
    law[LawParameter::velocity] = -v.value(0);
}

void go_on(const LawModel& model, DampingLaw& law, double seconds) {
    const DampingLaw now = law;
    law[LawParameter::displacement] = model.motion(now, Measured::displacement, {seconds}).value(0);
    law[LawParameter::velocity] = model.motion(now, Measured::velocity, {seconds}).value(0);
}

// The same law in another unit of length.
void rescale(LawState& state, double factor) {
    DampingLaw& law = state.law;
    for (const LawParameter p : {LawParameter::displacement, LawParameter::velocity, LawParameter::friction})
        law[p] /= factor;
    law[LawParameter::quadratic] *= factor;
    law[LawParameter::cubic] *= factor * factor;
    state.coefficients /= factor;
}

// Tones keep their phase on a clock that starts `seconds` earlier.
void turn_tones(LawState& state, double seconds) {
    Index column = state.others.first_oscillator_column();
    for (const double tone : state.others.tones) {
        const double angle = std::exp(tone) * seconds;
        const double a = state.coefficients(column), b = state.coefficients(column + 1);
        state.coefficients(column) = a * std::cos(angle) - b * std::sin(angle);
        state.coefficients(column + 1) = a * std::sin(angle) + b * std::cos(angle);
        column += 2;
    }
}

// The law on samples [begin, end) of the recording, fitted again under the noise as it is known.
std::optional<LawFit> on_window(const LawFit& fit, const Recording& recording, std::size_t begin,
                                std::size_t end) {
    LawFit moved = fit;
    moved.curve.window = cut_window(recording, begin, end);
    moved.curve.samples = block_means(moved.curve.window, fit.curve.samples.block);
    if (moved.curve.samples.size() <= fit.curve.samples.size() / 2) return std::nullopt;
    if (fit.curve.quiet.begin + fit.curve.quiet.size() > begin) moved.curve.quiet = {};
    const double earlier = recording.clock.time_of(fit.curve.window.begin) - recording.clock.time_of(begin);
    if (earlier > 0.0) turn_back(fit.model(), moved.state.law, earlier);
    if (earlier < 0.0) go_on(fit.model(), moved.state.law, -earlier);
    turn_tones(moved.state, earlier);
    const double factor = moved.curve.samples.scale / fit.curve.samples.scale;
    rescale(moved.state, factor);
    moved.curve.noise.noise.innovation_variance /= factor * factor;
    if (!moved.model().usable(moved.state) || !refit(moved, evaluations)) return std::nullopt;
    return moved;
}

// Whitened residuals over their standard deviation.
VectorXd innovations_of(const LawFit& fit) {
    VectorXd innovations = fit.curve.samples.value - fit.model().value(fit.state);
    whiten(fit.curve.noise.noise, fit.curve.samples.stretches, innovations);
    return innovations / std::sqrt(fit.curve.noise.noise.innovation_variance);
}

bool fits_before(const LawFit& fit, std::size_t former_begin) {
    const double former_s =
        static_cast<double>(former_begin - fit.curve.window.begin) / fit.curve.window.rate_hz;
    const VectorXd& time = fit.curve.samples.time;
    const Index rows = std::lower_bound(time.begin(), time.end(), former_s) - time.begin();
    if (rows == 0) return false;
    const double sum = innovations_of(fit).head(rows).squaredNorm();
    return sum < chi_squared_quantile(1.0 - earlier_false_alarm, static_cast<double>(rows));
}

std::size_t earliest(const LawFit& fit, const Event& event) {
    if (event.quiet_end > event.quiet_begin && event.quiet_end < fit.curve.window.begin)
        return event.quiet_begin;
    if (event.quiet_end > 0) return std::min(event.quiet_end, fit.curve.window.begin);
    const auto reach = static_cast<std::size_t>(farthest_without_quiet * period_samples(fit));
    return fit.curve.window.begin > reach ? fit.curve.window.begin - reach : 0;
}

// Samples from the fit's first to where the motion turns next to it; below zero before it. Nothing where it
// turns nowhere near.
std::optional<double> nearest_turn(const LawFit& fit) {
    constexpr double near = 0.2;  // periods
    const LawModel model = fit.model();
    const double reach_s = near * period_samples(fit) / fit.curve.window.rate_hz;
    const auto first = [&](const DampingLaw& law) {
        const auto turns = model.motion(law, Measured::displacement, {reach_s}).reversals;
        return turns.empty() ? 2.0 * reach_s : turns.front() / fit.rate;
    };
    const double before = first(mirrored_in_time(fit.state.law)), after = first(fit.state.law);
    if (std::min(before, after) > reach_s) return std::nullopt;
    return (before < after ? -before : after) * fit.curve.window.rate_hz;
}

// Whether the article lay still until a moment before this sample: no swing turned there, it was let go.
bool held_until(const LawFit& fit, const Recording& recording, double sample) {
    constexpr double apart = 0.03, looked_at = 0.5, fewest = 4.0;  // the first two in periods
    constexpr double loud = 3.0;
    const double period = period_samples(fit), end = sample - apart * period;
    const double begin = std::max(0.0, end - looked_at * period);
    if (end - begin < std::max(fewest, 0.1 * period)) return false;
    const double noise =
        std::sqrt(fit.curve.noise.noise.variance() * static_cast<double>(fit.curve.samples.block)) *
        fit.curve.samples.scale;
    return unrest(recording.samples, static_cast<std::size_t>(begin), static_cast<std::size_t>(end)) <
           loud * noise;
}

// Where an article that was held was let go, in samples of the recording.
std::optional<double> release_of(const LawFit& fit, const Recording& recording, const Event& event) {
    if (fit.measured != Measured::displacement || event.by_hand || !event.flights.empty())
        return std::nullopt;
    const auto turn = nearest_turn(fit);
    if (!turn) return std::nullopt;
    const double release = static_cast<double>(fit.curve.window.begin) + *turn;
    return held_until(fit, recording, release) ? std::optional(release) : std::nullopt;
}

// The samples between the release and where it rises above the noise belong to the plateau as well as to the
// swing; they are left out, as the viscous fit does.
double hidden_release(const LawFit& fit) {
    constexpr double largest_share = 0.03;  // of a period
    const double amplitude = std::max(
        std::hypot(fit.state.law[LawParameter::displacement], fit.state.law[LawParameter::velocity]), 1e-3);
    const double noise =
        std::sqrt(fit.curve.noise.noise.variance() * static_cast<double>(fit.curve.samples.block));
    const double hidden = std::sqrt(2.0 * std::min(noise / amplitude, 1.0)) / two_pi;
    return std::min(hidden, largest_share) * period_samples(fit);
}

// A few samples of the plateau are within the noise of a swing that turns there, and draw its turn towards
// them: taken off until the swing, fitted without them, turns before its first sample. True where some were.
bool leave_plateau(LawFit& fit, const Recording& recording, const Event& event) {
    constexpr int most_rounds = 6;
    bool left = false;
    for (int round = 0; round < most_rounds; ++round) {
        const auto release = release_of(fit, recording, event);
        if (!release) break;
        const auto begin = static_cast<std::size_t>(std::ceil(*release + hidden_release(fit)));
        if (begin <= fit.curve.window.begin) break;
        auto later = on_window(fit, recording, begin, end_of(fit));
        if (!later) break;
        fit = std::move(*later);
        left = true;
    }
    return left;
}

void widen_forwards(LawFit& fit, const Recording& recording, const Event& event) {
    const std::size_t wanted = end_of_fit(event), end = end_of(fit);
    const Index before = fit.curve.samples.size(), block = fit.curve.samples.block;
    if (wanted < end + static_cast<std::size_t>(fewest_to_tell_noise * block)) return;
    const auto longer = on_window(fit, recording, fit.curve.window.begin, wanted);
    if (!longer) return;
    const Index behind = longer->curve.samples.size() - before;
    if (std::min(before, behind) < fewest_to_tell_noise) return;
    if (same_noise(innovations_of(*longer), before)) fit = *longer;
}

bool starts_before_release(const LawFit& fit, const Recording& recording, const Event& event) {
    const auto release = release_of(fit, recording, event);
    return release && *release > static_cast<double>(fit.curve.window.begin);
}

void widen_backwards(LawFit& fit, const Recording& recording, const Event& event) {
    const std::size_t limit = earliest(fit, event);
    double step = first_step;
    while (step >= last_step && fit.curve.window.begin > limit) {
        const auto samples = std::max(static_cast<std::size_t>(step * period_samples(fit)),
                                      static_cast<std::size_t>(fit.curve.samples.block));
        const std::size_t begin = fit.curve.window.begin;
        const auto longer =
            begin >= limit + samples ? on_window(fit, recording, begin - samples, end_of(fit)) : std::nullopt;
        if (longer && fits_before(*longer, begin) && !starts_before_release(*longer, recording, event))
            fit = *longer;
        else
            step /= 2.0;
    }
}

}  // namespace

double residual_level(const CurveFit& fit) {
    return std::sqrt(fit.residual.squaredNorm() / static_cast<double>(fit.residual.size())) *
           fit.samples.scale;
}

void widen(LawFit& fit, const Recording& recording, const Event& event) {
    const DecayModel& others = fit.state.others;
    if (event.by_hand) return;
    const bool alone = !others.drift && others.oscillators.empty() && others.real_poles.empty();
    if (LawFit later = fit; leave_plateau(later, recording, event) && settle_law(later))
        fit = std::move(later);
    if (!alone) return;
    LawFit wider = fit;
    // Before the decay of a drop lie flights and bounces: another motion, however well a law may fit its end.
    if (event.flights.empty()) {
        widen_backwards(wider, recording, event);
        leave_plateau(wider, recording, event);
    }
    widen_forwards(wider, recording, event);
    const bool changed = wider.curve.window.begin != fit.curve.window.begin ||
                         wider.curve.window.size() != fit.curve.window.size();
    // What a wider window adds to the residual is no part of the law.
    constexpr double most_growth = 1.3;
    const double before = residual_level(fit.curve);
    if (changed && settle_law(wider) && residual_level(wider.curve) < most_growth * before)
        fit = std::move(wider);
}

namespace {

// End of the first quarter of a period in [begin, end) that swings at least half as much as any: the release
// lies in it or before it.
std::size_t after_release(const std::vector<double>& samples, std::size_t begin, std::size_t end,
                          std::size_t quarter) {
    std::vector<double> swing;
    for (std::size_t at = begin; at + quarter <= end; at += quarter / 2)
        swing.push_back(unrest(samples, at, at + quarter));
    if (swing.empty()) return end;
    const double enough = 0.5 * *std::ranges::max_element(swing);
    const auto first = std::ranges::find_if(swing, [&](double s) { return s >= enough; });
    return begin + static_cast<std::size_t>(first - swing.begin()) * (quarter / 2) + quarter;
}

}  // namespace

std::optional<Event> with_earlier_start(const CurveFit& fit, const Recording& recording, const Event& event) {
    constexpr double loud = 3.0;
    constexpr int farthest = 8;        // periods
    constexpr std::size_t fewest = 5;  // samples in a quarter of a period
    if (event.by_hand || !(event.noise_level > 0.0)) return std::nullopt;
    const double period = two_pi / fit.oscillator().angular_frequency() * recording.clock.sample_rate_hz;
    const auto window = static_cast<std::size_t>(period), quarter = window / 4;
    const std::size_t limit = event.quiet_end;
    if (quarter < fewest) return std::nullopt;
    std::size_t begin = event.begin;
    for (int i = 0; i < farthest && begin > limit + fewest; ++i) {
        const std::size_t before = std::max(limit, begin > window ? begin - window : 0);
        if (unrest(recording.samples, before, begin) < loud * event.noise_level) break;
        begin = before;
    }
    if (begin == event.begin) return std::nullopt;
    begin = after_release(recording.samples, begin, event.begin, quarter);
    if (begin + quarter > event.begin) return std::nullopt;
    Event earlier = event;
    earlier.begin = begin;
    return earlier;
}

}  // namespace ringwright::identify
