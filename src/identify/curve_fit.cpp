#include "identify/curve_fit.hpp"

#include <fmt/format.h>

#include <Eigen/QR>
#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "identify/curve_fit_steps.hpp"
#include "identify/quiet_noise.hpp"
#include "identify/start_values.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

std::size_t end_of_fit(const Event& event) {
    const std::size_t decay = event.end - event.begin;
    const std::size_t wanted = event.end + std::max<std::size_t>(decay / 2, 400);
    return std::max(event.end, std::min(event.rest_end, wanted));
}

namespace {

constexpr Index fewest_rows = 12;
constexpr std::size_t fewest_decay_samples = 16;
constexpr int noise_rounds = 4;
constexpr int most_attempts = 5;  // at the window: spikes, start and end each ask for another fit
constexpr double settled = 0.02;  // change of the parameters between rounds, in standard uncertainties

MatrixXd full_design(const ProjectedFit& fit, const DecaySamples& samples) {
    MatrixXd design(samples.size(), fit.model.linear_count() + fit.model.nonlinear_count());
    design << linear_columns(fit.model, samples), derivative_columns(fit.model, samples, fit.coefficients);
    return design;
}

struct Orthonormal {
    MatrixXd basis, map;  // design · map = basis
    bool full_rank = false;
};

Orthonormal orthonormalise(const MatrixXd& design) {
    const Index k = design.cols();
    const VectorXd norms = design.colwise().norm().cwiseMax(1e-300);
    const Eigen::HouseholderQR<MatrixXd> factor(design * norms.cwiseInverse().asDiagonal());
    const MatrixXd upper = factor.matrixQR().topRows(k).triangularView<Eigen::Upper>();
    Orthonormal result;
    const VectorXd diagonal = upper.diagonal().cwiseAbs();
    result.full_rank = diagonal.minCoeff() > 1e-9 * diagonal.maxCoeff();
    if (!result.full_rank) return result;
    result.basis = factor.householderQ() * MatrixXd::Identity(design.rows(), k);
    result.map = norms.cwiseInverse().asDiagonal() *
                 upper.triangularView<Eigen::Upper>().solve(MatrixXd::Identity(k, k));
    return result;
}

// The decay's rows, and below them those of the quiet stretch, which share nothing with them but the noise.
RestrictedLikelihood likelihood_of(const CurveFit& fit, Index highest_order) {
    const QuietRows quiet = quiet_rows(fit);
    const Index rows = fit.basis.rows(), columns = fit.basis.cols(), more = quiet.value.size();
    if (more == 0) return {fit.basis, fit.residual, fit.samples.stretches, highest_order};
    const Orthonormal own = orthonormalise(quiet.design);
    if (!own.full_rank) return {fit.basis, fit.residual, fit.samples.stretches, highest_order};
    MatrixXd design = MatrixXd::Zero(rows + more, columns + own.basis.cols());
    design.topLeftCorner(rows, columns) = fit.basis;
    design.bottomRightCorner(more, own.basis.cols()) = own.basis;
    VectorXd response(rows + more);
    response << fit.residual, quiet.value;
    std::vector<Stretch> stretches = fit.samples.stretches;
    stretches.push_back({rows, more});
    return {design, response, stretches, highest_order};
}

void keep_decay_part(WhitenedFit& fit, Index columns) {
    fit.coefficients.conservativeResize(columns);
    fit.unit_covariance.conservativeResize(columns, columns);
}

}  // namespace

NoiseOptions noise_with_draws(const CurveFitOptions& options) {
    NoiseOptions noise;
    noise.draws = options.noise_draws;
    noise.seed = options.seed;
    return noise;
}

NoiseOptions noise_alone() {
    NoiseOptions options;
    options.draws = 0;
    return options;
}

NoiseOptions noise_no_higher(const CurveFit& fit) {
    NoiseOptions options = noise_alone();
    options.highest_order = fit.noise.noise.order();
    return options;
}

NoiseOptions noise_from(const CurveFit& fit) {
    NoiseOptions options = noise_alone();
    options.start = fit.noise.noise.partial_autocorrelation;
    return options;
}

bool estimate_noise(CurveFit& fit, const MatrixXd& all_columns, const VectorXd& residual,
                    const NoiseOptions& options) {
    const Orthonormal design = orthonormalise(all_columns);
    if (!design.full_rank) return false;
    fit.residual = residual;
    fit.map = design.map;
    fit.basis = design.basis;
    const RestrictedLikelihood likelihood =
        likelihood_of(fit, options.start ? options.start->size() : options.highest_order);
    if (likelihood.rows() - likelihood.columns() < 4) return false;
    fit.noise = fit_noise(likelihood, options);
    if (!fit.noise.fit.valid) return false;
    keep_decay_part(fit.noise.fit, fit.basis.cols());
    for (NoiseDraw& draw : fit.noise.draws) keep_decay_part(draw.fit, fit.basis.cols());
    fit.innovations = fit.residual;
    whiten(fit.noise.noise, fit.samples.stretches, fit.innovations);
    fit.innovations /= std::sqrt(fit.noise.noise.innovation_variance);
    return fit.noise.fit.valid;
}

bool estimate_noise(CurveFit& fit, const NoiseOptions& options) {
    const VectorXd residual =
        fit.samples.value - linear_columns(fit.fit.model, fit.samples) * fit.fit.coefficients;
    return estimate_noise(fit, full_design(fit.fit, fit.samples), residual, options);
}

namespace {

double largest_move(const CurveFit& fit, const VectorXd& before) {
    const Index linear = fit.linear_count();
    const VectorXd move = fit.fit.model.parameters() - before;
    double largest = 0.0;
    for (Index i = 0; i < move.size(); ++i) {
        const VectorXd row = fit.map.row(linear + i);
        const double variance =
            fit.noise.noise.innovation_variance * row.dot(fit.noise.fit.unit_covariance * row);
        largest = std::max(largest, std::abs(move(i)) / std::sqrt(std::max(variance, 1e-300)));
    }
    return largest;
}

}  // namespace

bool settle(CurveFit& fit) {
    if (!estimate_noise(fit, noise_alone())) return false;
    Index order = fit.noise.noise.order();
    for (int round = 0; round < noise_rounds; ++round) {
        const VectorXd before = fit.fit.model.parameters();
        fit.fit = fit_projected(fit.fit.model, fit.samples, fit.noise.noise);
        if (!fit.fit.model.parameters().allFinite()) return false;
        const bool still = largest_move(fit, before) < settled || round + 1 == noise_rounds;
        if (!estimate_noise(fit, still ? noise_alone() : noise_from(fit))) return false;
        if (still && fit.noise.noise.order() == order) break;
        order = fit.noise.noise.order();
    }
    return true;
}

namespace {

// The same, unless the noise model has taken up the ringing: samples before the decay, or a second hit, which
// no decay explains, can lead it there, and what is fitted is then the rest. The fit for white noise and a
// noise model that cannot ring are kept in its place, so that those samples show.
bool settle_on_decay(CurveFit& fit) {
    constexpr double most_left = 100.0, explained = 0.01;  // of the sums of squares
    constexpr double most = 0.5, little = 0.2;
    const DecayModel before = fit.fit.model;
    if (!settle(fit)) return false;
    const VectorXd& value = fit.samples.value;
    const double total = (value.array() - value.mean()).square().sum(), left = fit.residual.squaredNorm();
    if (left < explained * total) return true;
    ProjectedFit white = fit_projected(before, fit.samples, AutoregressiveNoise{});
    const bool far = white.residual_sum < explained * total && left > most_left * white.residual_sum;
    // Close modes also give the noise a resonance before they are fitted; but then the decay explains most.
    const bool rings = left > most * total && white.residual_sum < little * total &&
                       noise_rings_at(fit, white.model.oscillators.front().angular_frequency());
    if (!far && !rings) return true;
    fit.fit = std::move(white);
    NoiseOptions options = noise_alone();
    options.highest_order = 1;
    return estimate_noise(fit, options);
}

// First blocks that do not belong to the decay (the release or the contact still going on) show as
// innovations far beyond the rest; each test has a false-alarm rate of 1e-5.
Index misfitting_start(const CurveFit& fit) {
    constexpr double false_alarm = 1e-5;
    double sum = 0.0;
    Index drop = 0;
    const Index most = std::min<Index>(12, fit.innovations.size() / 10);
    for (Index m = 1; m <= most; ++m) {
        sum += fit.innovations(m - 1) * fit.innovations(m - 1);
        if (sum > chi_squared_quantile(1.0 - false_alarm, static_cast<double>(m))) drop = m;
    }
    return drop;
}

// Acceleration jumps when an article is let go or hit. A sample that still lies in the noise of the rest,
// beside a next one that stands far out of it, is before the jump; the fast pole of a heavily damped decay
// would take it up.
std::size_t behind_jump(const Recording& recording, const Event& event) {
    constexpr std::size_t rest = 40, fewest = 10, most = 2;
    constexpr double in_noise = 4.0, out_of_noise = 12.0;
    const std::vector<double>& x = recording.samples;
    std::size_t begin = event.begin;
    if (recording.quantity != MeasuredQuantity::acceleration || event.by_hand || begin < fewest) return begin;
    const std::size_t first = begin > rest ? begin - rest : 0;
    const Eigen::Map<const VectorXd> before(x.data() + first, static_cast<Index>(begin - first));
    const double level = before.mean();
    const double noise =
        std::sqrt((before.array() - level).square().sum() / static_cast<double>(before.size() - 1));
    while (begin < event.begin + most && begin + fewest_decay_samples < event.end &&
           std::abs(x[begin] - level) < in_noise * noise &&
           std::abs(x[begin + 1] - level) > out_of_noise * noise)
        ++begin;
    return begin;
}

// A plucked displacement leaves its plateau as x₀ω²t²/2, so the noise hides the release for a while of about
// √(2σ/x₀)/ω. Samples of the plateau would pull the fit; that stretch, at most 3 % of a period, is left out
// where the recording goes back before the release.
std::size_t hidden_release(const CurveFit& fit, const Recording& recording, const Event& event) {
    constexpr double largest_share = 0.03;
    const bool displaced =
        recording.quantity == MeasuredQuantity::displacement || recording.quantity == MeasuredQuantity::angle;
    if (event.begin == 0 || event.by_hand || !displaced) return 0;
    const double omega = fit.oscillator().angular_frequency();
    const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, 0);
    const double rows = std::max<double>(1.0, static_cast<double>(fit.samples.size()));
    const double noise = std::sqrt(fit.fit.residual_sum / rows * static_cast<double>(fit.samples.block));
    const double hidden = std::sqrt(2.0 * noise / std::max(amplitude, noise)) / omega;
    const double period = 2.0 * std::numbers::pi / omega;
    return static_cast<std::size_t>(std::ceil(std::min(hidden, largest_share * period) * fit.window.rate_hz));
}

// What the search saw beside the decay is in the model from the first: else a strong tone or mode would be
// taken for the decay, or the noise model would take it up.
void add_what_was_seen(CurveFit& fit, const Event& event, const CurveFitOptions& options) {
    constexpr double most_damping = 0.3, worthwhile = 0.8, highest = 0.45;
    const AutoregressiveNoise white;
    const double highest_hz = highest / fit.samples.step_s;
    DecayModel with_tones = fit.fit.model;
    for (const double hertz : event.hum_hz)
        if (hertz < highest_hz) with_tones.tones.push_back(std::log(2.0 * std::numbers::pi * hertz));
    const auto take = [&](const DecayModel& model) {
        ProjectedFit tried = fit_projected(model, fit.samples, white);
        if (!tried.model.parameters().allFinite() || tried.residual_sum > worthwhile * fit.fit.residual_sum)
            return;
        const double damping = tried.model.oscillators.back().damping_ratio();
        if (model.oscillators.size() > 1 && (damping <= 0.0 || damping > most_damping)) return;
        fit.fit = std::move(tried);
    };
    if (!with_tones.tones.empty()) take(with_tones);
    // Beside a mode that the user means the search may have seen any other of many.
    if (event.companion_hz <= 0.0 || event.companion_hz > highest_hz || options.near_hz ||
        options.modes.value_or(2) < 2)
        return;
    DecayModel with_mode = fit.fit.model;
    with_mode.oscillators.push_back(
        Oscillator::from(event.companion_damping_ratio, 2.0 * std::numbers::pi * event.companion_hz));
    take(with_mode);
}

bool start_fit(CurveFit& fit, const Event& event, const CurveFitOptions& options) {
    const double guess = options.near_hz.value_or(event.frequency_guess_hz);
    const double span = static_cast<double>(event.end - event.begin) / fit.window.rate_hz;
    const double fastest = std::max(1.5 * guess, event.companion_hz);
    const double first_rate = 2.0 * std::numbers::pi * (guess > 0.0 ? fastest : 30.0 / span);
    fit.samples = block_means(fit.window, block_for(fit.window, first_rate, 300.0));
    if (fit.samples.size() < fewest_rows) {
        fit.reason = fmt::format("the decay has only {} usable samples", fit.samples.size());
        return false;
    }
    if (fit.samples.value.maxCoeff() == fit.samples.value.minCoeff()) {
        fit.reason = "every sample of the decay has the same value";
        return false;
    }
    const bool hum = !event.hum_hz.empty() && guess > 0.0;
    const std::optional<double> near = hum ? std::optional(guess) : options.near_hz;
    const std::optional<ProjectedFit> start = find_start(fit.samples, guess, near, options.threads);
    if (!start) {
        fit.reason = "no decaying oscillation fits the recording";
        return false;
    }
    fit.fit = find_ring_on_tail(*start, fit.samples, guess).value_or(*start);
    add_what_was_seen(fit, event, options);
    return true;
}

void reblock(CurveFit& fit) {
    double fastest = 0.0;
    for (const Oscillator& o : fit.fit.model.oscillators) fastest = std::max(fastest, o.fastest_rate());
    fit.samples = block_means(fit.window, block_for(fit.window, fastest));
    fit.fit = fit_projected(fit.fit.model, fit.samples, fit.noise.noise);
}

// What hardly falls in the window, while something at least as large does, is a steady tone that the start
// values took for a mode: it is fitted as one. (A light mode keeps its place beside a small one that noise
// feigns.)
bool steady_modes_to_tones(CurveFit& fit) {
    constexpr double steady_fall = 0.2, falling = 1.0;  // nepers over the window
    const std::vector<Oscillator> modes = fit.fit.model.oscillators;
    const double span = fit.samples.time.maxCoeff();
    const auto fall = [&](std::size_t i) { return std::abs(modes[i].slowest_rate()) * span; };
    const auto amplitude = [&](std::size_t i) {
        return start_amplitude(fit.fit.model, fit.fit.coefficients, i);
    };
    double largest_falling = 0.0;
    for (std::size_t i = 0; i < modes.size(); ++i)
        if (fall(i) > falling) largest_falling = std::max(largest_falling, amplitude(i));
    DecayModel model = fit.fit.model;
    model.oscillators.clear();
    for (std::size_t i = 0; i < modes.size(); ++i) {
        if (fall(i) < steady_fall && amplitude(i) < largest_falling)
            model.tones.push_back(modes[i].log_frequency);
        else
            model.oscillators.push_back(modes[i]);
    }
    if (model.oscillators.size() == modes.size()) return true;
    fit.fit = fit_projected(model, fit.samples, fit.noise.noise);
    return settle(fit);
}

// The mode meant comes first: the one nearest `near_hz`, else the one with the most energy within the window,
// A²(1 − e^(−2sT))/4s (a tone taken for a mode rings on for ever, and would have the most of it there).
bool put_mode_first(CurveFit& fit, std::optional<double> near_hz) {
    std::vector<Oscillator>& modes = fit.fit.model.oscillators;
    const auto rank = [&](std::size_t i) {
        if (near_hz)
            return std::abs(std::log(modes[i].angular_frequency() / (2.0 * std::numbers::pi * *near_hz)));
        const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, i);
        const double rate = std::max(modes[i].slowest_rate(), 1e-12 * modes[i].angular_frequency());
        return amplitude * amplitude * std::expm1(-2.0 * rate * fit.samples.time.maxCoeff()) / rate;
    };
    std::size_t first = 0;
    for (std::size_t i = 1; i < modes.size(); ++i)
        if (rank(i) < rank(first)) first = i;
    constexpr double near_enough = 0.22;  // of the logarithm: 25 %
    if (near_hz && rank(first) > near_enough) {
        fit.reason = fmt::format("no mode was found near {:g} Hz; the nearest rings at {:.4g} Hz", *near_hz,
                                 modes[first].angular_frequency() / (2.0 * std::numbers::pi));
        return false;
    }
    if (first != 0) {
        std::swap(modes[0], modes[first]);
        fit.fit = solve_linear(fit.fit.model, fit.samples, fit.noise.noise);
    }
    return true;
}

// Leaves out what a knock spoils; where it moved the article as well, the decay ends there. False where
// nothing is left to fit.
bool mind_knocks(CurveFit& fit, const Recording& recording) {
    const CurveFit before = fit;
    const Knocks knocks = leave_out_knocks(fit);
    if (!knocks.any()) return true;
    reblock(fit);
    if (fit.samples.size() < fewest_rows || !settle(fit)) {
        fit = before;
        return true;
    }
    const std::optional<std::size_t> end = changed_behind(fit, knocks);
    fit.findings.push_back(knock_finding(fit, knocks, end.has_value()));
    if (!end) return true;
    cut_again(fit, recording, fit.window.begin, fit.window.begin + *end);
    reblock(fit);
    if (fit.samples.size() < fewest_rows || !settle(fit)) return false;
    if (!replace_spikes(fit)) return true;
    reblock(fit);
    return settle(fit);
}

}  // namespace

bool same_noise(const VectorXd& innovations, Index split) {
    constexpr double false_alarm = 1e-3;
    const Index behind = innovations.size() - split;
    const double ratio = innovations.tail(behind).squaredNorm() / static_cast<double>(behind) /
                         (innovations.head(split).squaredNorm() / static_cast<double>(split));
    if (!std::isfinite(ratio))
        return false;  // numbers at the end of their range, or nothing but equal values
    const double below = f_probability(ratio, static_cast<double>(behind), static_cast<double>(split));
    return below > false_alarm / 2.0 && below < 1.0 - false_alarm / 2.0;
}

bool same_noise_behind(const CurveFit& fit, const Event& event) {
    const double end_s = static_cast<double>(event.end - fit.window.begin) / fit.window.rate_hz;
    const Index split =
        std::upper_bound(fit.samples.time.begin(), fit.samples.time.end(), end_s) - fit.samples.time.begin();
    const bool too_few = std::min(split, fit.samples.size() - split) < fewest_to_tell_noise;
    return too_few || same_noise(fit.innovations, split);
}

bool noise_rings_at(const CurveFit& fit, double angular_frequency) {
    constexpr double lowest = 0.7, highest = 1.4, step = 0.05, beside = 0.5;  // of the frequency
    constexpr double clearly = 4.0;                                           // 6 dB
    const double cycles = angular_frequency * fit.samples.step_s / (2.0 * std::numbers::pi);
    const AutoregressiveNoise& noise = fit.noise.noise;
    const double enough = clearly * noise.spectral_density(beside * cycles);
    for (double at = lowest; at < highest && at * cycles < 0.5; at += step)
        if (noise.spectral_density(at * cycles) > enough) return true;
    return false;
}

CurveFit fit_decay(const Recording& recording, const Event& event, const CurveFitOptions& options) {
    CurveFit fit;
    if (event.end - event.begin < fewest_decay_samples) {
        fit.reason = fmt::format("the decay is over after {} samples; at least {} are needed. Sample faster",
                                 event.end - event.begin, fewest_decay_samples);
        return fit;
    }
    std::size_t end = end_of_fit(event);
    const std::size_t begin = behind_jump(recording, event);
    fit.window = cut_window(recording, begin, end);
    if (!start_fit(fit, event, options)) return fit;
    const std::size_t hidden = hidden_release(fit, recording, event);
    if (hidden > 0 && event.begin + hidden + fewest_decay_samples < event.end)
        fit.window = cut_window(recording, event.begin + hidden, end);
    reblock(fit);
    fit.reason = "the samples do not determine a decay (too few, or too much noise)";
    for (int attempt = 0; attempt < most_attempts; ++attempt) {
        if (fit.samples.size() < fewest_rows || !settle_on_decay(fit)) return fit;
        if (replace_spikes(fit)) {
            reblock(fit);
            continue;
        }
        if (end > event.end && !same_noise_behind(fit, event)) {
            end = event.end;
            cut_again(fit, recording, fit.window.begin, end);
            reblock(fit);
            continue;
        }
        const Index drop = misfitting_start(fit);
        if (drop == 0 || attempt == most_attempts - 1) break;
        const auto samples = static_cast<std::size_t>(drop * fit.samples.block);
        cut_again(fit, recording, fit.window.begin + samples, end);
        reblock(fit);
    }
    if (!mind_knocks(fit, recording)) return fit;
    fit.quiet = find_quiet(fit, recording, event);
    if (fit.quiet.size() > 0 && !settle(fit)) return fit;
    add_slow_term(fit);
    add_components(fit, options);
    if (!steady_modes_to_tones(fit)) return fit;
    if (!put_mode_first(fit, options.near_hz)) return fit;
    drop_covering_modes(fit);
    describe_components(fit);
    describe_slow_terms(fit);
    fit.valid = estimate_noise(fit, noise_with_draws(options));
    if (fit.valid) fit.reason.clear();
    return fit;
}

Spread spread_of(const CurveFit& fit, const VectorXd& gradient) {
    const VectorXd row = fit.map.transpose() * gradient;
    const double spare = fit.noise.degrees_of_freedom;
    double mean_variance = 0.0, mean_square = 0.0, mean_centre = 0.0, mean_centre_square = 0.0;
    for (const NoiseDraw& draw : fit.noise.draws) {
        const WhitenedFit& at = draw.fit;
        const double variance = at.residual_sum / spare * row.dot(at.unit_covariance * row);
        const double centre = row.dot(at.coefficients);
        mean_variance += draw.weight * variance;
        mean_square += draw.weight * variance * variance;
        mean_centre += draw.weight * centre;
        mean_centre_square += draw.weight * centre * centre;
    }
    const double centre_variance = std::max(0.0, mean_centre_square - mean_centre * mean_centre);
    const double relative_square =
        std::max(0.0, mean_square / (mean_variance * mean_variance) - 1.0) + 2.0 / std::max(1.0, spare - 4.0);
    Spread spread;
    spread.degrees_of_freedom = 4.0 + 2.0 / relative_square;
    const double inflated = mean_variance * spare / std::max(1.0, spare - 2.0) + centre_variance;
    spread.scale = std::sqrt(inflated * (spread.degrees_of_freedom - 2.0) / spread.degrees_of_freedom);
    return spread;
}

}  // namespace ringwright::identify
