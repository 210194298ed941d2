// Steady tones and further modes that the residuals of a decay fit show.

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "identify/curve_fit_steps.hpp"
#include "identify/spectrum.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr int most_components = 4;
constexpr int trial_evaluations = 25;
constexpr double least_fall = 0.3;                  // nepers over the recording; what falls less is a tone
constexpr double most_damping_of_added_mode = 0.2;  // a broader one stands for something else
constexpr double false_alarm = 1e-3;                // a recording, for each component looked for

Stretch longest_stretch(const DecaySamples& samples) {
    return *std::ranges::max_element(samples.stretches, {}, &Stretch::length);
}

struct Outstanding {
    double ratio = 0.0;
    Index bin = 0;
};

// The peak that stands highest above `level`, the median power about each bin.
template <typename Level>
Outstanding highest_above(const VectorXd& power, Level level) {
    Outstanding best;
    for (Index i = 2; i + 2 < power.size(); ++i) {
        if (power(i) < power(i - 1) || power(i) < power(i + 1)) continue;
        const double ratio = power(i) * std::numbers::ln2 / std::max(level(i), 1e-300);
        if (ratio > best.ratio) best = {ratio, i};
    }
    return best;
}

// Median of at most some hundreds of evenly spread bins of [begin, end).
double median_power(const VectorXd& power, Index begin, Index end, std::vector<double>& scratch) {
    constexpr Index most = 400;
    begin = std::max<Index>(1, begin);
    end = std::min(power.size(), end);
    const Index step = std::max<Index>(1, (end - begin) / most);
    scratch.clear();
    for (Index j = begin; j < end; j += step) scratch.push_back(power(j));
    const auto middle = scratch.begin() + static_cast<std::ptrdiff_t>(scratch.size() / 2);
    std::nth_element(scratch.begin(), middle, scratch.end());
    return *middle;
}

// The median power within a factor of 1.5 about each bin, the same for all bins of a sixteenth of an octave.
class OctaveLevel {
  public:
    OctaveLevel(const VectorXd& power, Index least) : power_(power), least_(least) {}
    double operator()(Index bin) {
        if (bin >= next_) {
            const Index reach = std::max(least_, bin / 3);
            level_ = median_power(power_, bin - reach, bin + reach + bin / 6 + 1, scratch_);
            next_ = bin + std::max<Index>(1, bin / 24);
        }
        return level_;
    }

  private:
    const VectorXd& power_;
    Index least_, next_ = 0;
    double level_ = 0.0;
    std::vector<double> scratch_;
};

// Angular frequencies at which the residual spectrum stands out: of its near surroundings as a steady tone
// does, or of an octave about it as a mode does that is itself some bins wide. Empty when nothing stands out.
std::vector<double> outstanding_frequencies(const CurveFit& fit) {
    const Stretch stretch = longest_stretch(fit.samples);
    const VectorXd residual = fit.residual.segment(stretch.begin, stretch.length);
    constexpr double padding = 2.0;
    const PowerSpectrum spectrum = power_spectrum(residual, padding);
    const auto near = static_cast<Index>(
        std::max(12.0, 12.0 / (spectrum.bin_cycles * static_cast<double>(stretch.length))));
    const double threshold = std::log(static_cast<double>(spectrum.power.size()) / 0.02);
    std::vector<double> found;
    const auto take = [&](const Outstanding& peak) {
        if (peak.bin == 0 || peak.ratio < threshold) return;
        const double omega = two_pi * refined_peak(spectrum.power, peak.bin, peak.bin) * spectrum.bin_cycles /
                             fit.samples.step_s;
        if (found.empty() || std::abs(omega / found.front() - 1.0) > 1e-3) found.push_back(omega);
    };
    std::vector<double> scratch;
    take(highest_above(spectrum.power, [&](Index i) {
        return median_power(spectrum.power, i - near, i + near + 1, scratch);
    }));
    take(highest_above(spectrum.power, OctaveLevel(spectrum.power, near)));
    return found;
}

// −2 log-likelihood, each order of the noise model paid for.
double criterion_of(const CurveFit& fit) {
    return fit.noise.fit.likelihood_criterion + 2.0 * static_cast<double>(fit.noise.noise.order());
}

// Gain that chance reaches at the best of all frequencies in one recording in a thousand. The frequency is
// searched on a grid about four times finer than the independent ones.
double needed_gain(const CurveFit& fit, double parameters) {
    const double searched = 2.0 * static_cast<double>(longest_stretch(fit.samples).length);
    return chi_squared_quantile(1.0 - false_alarm / searched, parameters);
}

// A tone is steady when its two amplitudes are the same in both halves of the samples; what a wrong damping
// law leaves over is not.
bool steady(const CurveFit& trial) {
    constexpr double largest_change = 0.5;  // of the mean amplitude
    const Eigen::MatrixXd columns = linear_columns(trial.fit.model, trial.samples);
    const Index column =
        trial.fit.model.first_oscillator_column() +
        static_cast<Index>(2 * (trial.fit.model.oscillators.size() + trial.fit.model.tones.size())) - 2;
    const Eigen::MatrixXd pair = columns.middleCols(column, 2);
    const VectorXd rest = trial.residual + pair * trial.fit.coefficients.segment(column, 2);
    const Index half = rest.size() / 2;
    const auto amplitudes = [&](Index begin, Index count) -> Eigen::Vector2d {
        const Eigen::MatrixXd part = pair.middleRows(begin, count);
        return (part.transpose() * part).ldlt().solve(part.transpose() * rest.segment(begin, count));
    };
    const Eigen::Vector2d first = amplitudes(0, half), second = amplitudes(half, rest.size() - half);
    return (first - second).norm() < largest_change * 0.5 * (first + second).norm();
}

std::optional<CurveFit> with_tone(const CurveFit& fit, double omega) {
    CurveFit trial = fit;
    trial.fit.model.tones.push_back(std::log(omega));
    trial.fit = fit_projected(trial.fit.model, trial.samples, trial.noise.noise, trial_evaluations);
    if (!trial.fit.model.parameters().allFinite() || !estimate_noise(trial, noise_no_higher(fit))) return std::nullopt;
    if (!steady(trial)) return std::nullopt;
    return trial;
}

std::optional<CurveFit> with_mode(const CurveFit& fit, double omega) {
    std::optional<CurveFit> best;
    for (const double damping : {0.003, 0.03}) {
        CurveFit trial = fit;
        trial.fit.model.oscillators.push_back(Oscillator::from(damping, omega));
        trial.fit = fit_projected(trial.fit.model, trial.samples, trial.noise.noise, trial_evaluations);
        if (!trial.fit.model.parameters().allFinite()) continue;
        const Oscillator& added = trial.fit.model.oscillators.back();
        if (added.damping_ratio() <= 0.0 || added.damping_ratio() > most_damping_of_added_mode) continue;
        const double falls = added.slowest_rate() * trial.samples.time.maxCoeff();
        if (falls < least_fall || !estimate_noise(trial, noise_no_higher(fit))) continue;
        if (!best || criterion_of(trial) < criterion_of(*best)) best = std::move(trial);
    }
    return best;
}

Finding tone_finding(double hertz) {
    return {
        "steady_tone", Severity::note,
        fmt::format("A steady tone of {:.4g} Hz lies under the decay; it was taken out as part of the fit.",
                    hertz)};
}

Finding mode_finding(const Oscillator& added) {
    return {
        "second_mode", Severity::note,
        fmt::format(
            "A further mode at {:.4g} Hz (damping ratio {:.2g}) rings along; it was fitted together with the "
            "mode reported. Use --near to choose another mode.",
            added.angular_frequency() / two_pi, added.damping_ratio())};
}

// Viscous damping with dry friction decays as (A + F) e^(−s t) − F: a viscous decay less a steady tone at its
// own frequency.
bool at_the_mode(const CurveFit& with_added_tone) {
    const Oscillator& o = with_added_tone.oscillator();
    const double away = std::abs(with_added_tone.fit.model.tones.back() - o.log_frequency);
    return away < std::max(0.03, 2.0 * o.damping_ratio());
}

Finding friction_finding() {
    return {"dry_friction", Severity::caution,
            "The decay quickens as it gets smaller, as dry friction makes it. A viscous damping ratio "
            "describes it only on "
            "average over this record and depends on the amplitude."};
}

}  // namespace

namespace {

// What is gained beyond what chance gains, and the fit that gains it.
struct Addition {
    double gain = 0.0;
    bool tone = false;
    std::optional<CurveFit> fit;
};

Addition best_addition(const CurveFit& fit, double omega, bool mode_allowed) {
    const double before = criterion_of(fit);
    const double tone_parameters = fit.quiet.size() > 0 ? 5.0 : 3.0;  // the quiet stretch has its own
    Addition best;
    const auto consider = [&](std::optional<CurveFit> trial, double parameters, bool tone) {
        if (!trial) return;
        const double gain = before - criterion_of(*trial) - needed_gain(fit, parameters);
        if (gain > best.gain) best = {gain, tone, std::move(trial)};
    };
    consider(with_tone(fit, omega), tone_parameters, true);
    if (mode_allowed) consider(with_mode(fit, omega), 4.0, false);
    return best;
}

}  // namespace

void add_components(CurveFit& fit, const CurveFitOptions& options) {
    for (int i = 0; i < most_components; ++i) {
        const bool mode_allowed =
            !options.modes || static_cast<int>(fit.fit.model.oscillators.size()) < *options.modes;
        Addition best;
        for (const double omega : outstanding_frequencies(fit)) {
            Addition addition = best_addition(fit, omega, mode_allowed);
            if (addition.gain > best.gain) best = std::move(addition);
        }
        if (!best.fit) return;
        if (best.tone && at_the_mode(*best.fit)) {
            fit.findings.push_back(friction_finding());
            return;
        }
        if (!settle(*best.fit)) return;
        fit = std::move(*best.fit);
    }
}

namespace {

// A broad mode that covers a much narrower one does not stand for a mode but for what the model of the narrow
// one lacks: damping or stiffness that depends on amplitude.
bool covers(const Oscillator& broad, const Oscillator& narrow) {
    const double away = std::abs(broad.log_frequency - narrow.log_frequency);
    return broad.damping_ratio() > 2.0 * narrow.damping_ratio() && away < 2.0 * broad.damping_ratio();
}

}  // namespace

void drop_covering_modes(CurveFit& fit) {
    for (int round = 0; round < most_components; ++round) {  // what is left moves when one is gone
        CurveFit without = fit;
        std::vector<Oscillator>& modes = without.fit.model.oscillators;
        const Oscillator first = modes.front();
        std::erase_if(modes, [&](const Oscillator& mode) { return covers(mode, first); });
        if (modes.size() == fit.fit.model.oscillators.size()) return;
        without.fit = fit_projected(without.fit.model, without.samples, without.noise.noise);
        if (!without.fit.converged || !settle(without)) return;
        fit = std::move(without);
    }
}

void describe_components(CurveFit& fit) {
    const std::vector<Oscillator>& modes = fit.fit.model.oscillators;
    for (std::size_t i = 1; i < modes.size(); ++i) fit.findings.push_back(mode_finding(modes[i]));
    for (const double tone : fit.fit.model.tones)
        fit.findings.push_back(tone_finding(std::exp(tone) / two_pi));
}

}  // namespace ringwright::identify
