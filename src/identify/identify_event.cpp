#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>

#include "identify/agreement.hpp"
#include "identify/amplitude_course.hpp"
#include "identify/curve_fit.hpp"
#include "identify/decay_picture.hpp"
#include "identify/decay_quantities.hpp"
#include "identify/drop_reading.hpp"
#include "identify/held_release.hpp"
#include "identify/law_fit.hpp"
#include "identify/law_quantities.hpp"
#include "identify/law_window.hpp"
#include "identify/method_bootstrap.hpp"
#include "identify/residual_checks.hpp"
#include "identify/running_start.hpp"
#include "ringwright/distributions.hpp"
#include "ringwright/identify.hpp"

namespace ringwright {

using namespace identify;

namespace {

constexpr double far_beyond_critical = 2.0;

MethodResult curve_fit_result(const CurveFit& fit, double confidence_level) {
    MethodResult result;
    if (!fit.valid) {
        result.reason = fit.reason;
        return result;
    }
    result.model = "viscous";
    for (std::size_t i = 0; i < fit.fit.model.oscillators.size(); ++i) {
        Mode mode;
        mode.quantities = decay_quantities(fit, i, confidence_level);
        mode.amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, i) * fit.samples.scale;
        result.modes.push_back(std::move(mode));
    }
    result.quantities = result.modes.front().quantities;
    if (result.quantities.empty()) {
        result.reason = "the noise leaves the decay undetermined";
        result.modes.clear();
        return result;
    }
    const auto ratio = result.quantities.find(Quantity::damping_ratio);
    if (ratio != result.quantities.end() && ratio->second.interval.high < 0.0) {
        result.reason = "the oscillation grows instead of dying away; something drives it";
        result.quantities.clear();
        result.modes.clear();
        return result;
    }
    result.status = MethodStatus::ok;
    return result;
}

// Two explanations between which the recording does not decide: each interval holds those of both.
void contain_also(Quantities& quantities, const Quantities& others) {
    for (auto& [quantity, estimate] : quantities) {
        const auto other = others.find(quantity);
        if (other == others.end()) continue;
        const Estimate& o = other->second;
        estimate.interval = {std::min(estimate.interval.low, o.interval.low),
                             std::max(estimate.interval.high, o.interval.high)};
        const double apart = estimate.value - o.value;
        const auto square = [](double x) { return x * x; };
        // Standard deviation of either with the same probability.
        estimate.standard_uncertainty =
            std::sqrt(0.5 * (square(estimate.standard_uncertainty) + square(o.standard_uncertainty)) +
                      0.25 * square(apart));
    }
}

// The amplitude asked for as one of what was measured, which follows from another by the natural frequency.
double amplitude_for(const LawFit& law, const Recording& recording, const IdentifyOptions& options) {
    if (!options.at_amplitude) return middle_amplitude(law);
    const double omega = law.rate * law.state.law.angular_frequency();
    const auto order = [](MeasuredQuantity quantity) { return static_cast<double>(measured_of(quantity)); };
    const MeasuredQuantity given = options.amplitude_of.value_or(recording.quantity);
    return *options.at_amplitude * std::pow(omega, order(recording.quantity) - order(given));
}

MethodResult law_result(const LawFit& law, const Recording& recording, const IdentifyOptions& options) {
    MethodResult result;
    result.status = MethodStatus::ok;
    result.model = name_of(law.terms, law.state.law[LawParameter::cubic]);
    result.at_amplitude = amplitude_for(law, recording, options);
    result.quantities = law_quantities(law, *result.at_amplitude, options.confidence_level);
    if (recording.scaled) result.per_mass = law_per_mass(law, options.confidence_level);
    const Swings swings = swings_of(law);
    const double amplitude = swings.amplitude.empty() ? law.curve.samples.scale : swings.amplitude.front();
    result.modes.push_back({result.quantities, amplitude});
    return result;
}

Estimate estimate_from(double value, double deviation, double degrees_of_freedom, double confidence_level,
                       bool logarithmic) {
    Estimate estimate;
    const double reach = student_t_factor(confidence_level, degrees_of_freedom) * deviation;
    estimate.value = value;
    estimate.degrees_of_freedom = degrees_of_freedom;
    if (logarithmic) {
        estimate.standard_uncertainty = value * deviation;
        estimate.interval = {value * std::exp(-reach), value * std::exp(reach)};
    } else {
        estimate.standard_uncertainty = deviation;
        estimate.interval = {value - reach, value + reach};
    }
    return estimate;
}

// Degrees of freedom of the curve fit's damping ratio: what the noise model cost holds for all methods.
double damping_freedom(const CurveFit& fit) {
    Eigen::VectorXd gradient = Eigen::VectorXd::Zero(fit.map.rows());
    gradient(fit.linear_count()) = 1.0;
    return spread_of(fit, gradient).degrees_of_freedom;
}

// Bias removed, scatter from the replicates; their number limits the degrees of freedom.
template <typename Reading>
MethodResult simple_method_result(const Reading& reading, const MethodErrors& errors, const CurveFit& fit,
                                  double confidence_level) {
    MethodResult result;
    if (!reading.valid || !errors.usable) {
        result.reason = reading.valid ? errors.reason : reading.reason;
        return result;
    }
    const double frequency = reading.natural_frequency_hz * std::exp(-errors.bias[0]);
    const double ratio = reading.damping_ratio - errors.bias[1];
    const double freedom =
        1.0 / (1.0 / damping_freedom(fit) + 1.0 / static_cast<double>(errors.errors.size() - 1));
    result.quantities =
        quantities_from(estimate_from(frequency, errors.deviation[0], freedom, confidence_level, true),
                        estimate_from(ratio, errors.deviation[1], freedom, confidence_level, false),
                        errors.correlation, confidence_level);
    result.status = MethodStatus::ok;
    return result;
}

// Long decays need fewer replicates' worth of time; the degrees of freedom own up to their number.
int affordable_replicates(int wanted, Eigen::Index samples) {
    constexpr int fewest = 80;
    constexpr double sample_budget = 1e6;
    return std::min(wanted, std::max(fewest, static_cast<int>(sample_budget / static_cast<double>(samples))));
}

// Where slow noise passes for part of a decay that is soon over, the intervals were measured to hold the
// truth less often than they say (docs/methods/coverage.md).
void warn_of_slow_noise(const CurveFit& fit, Findings& findings) {
    constexpr double slow = 0.6, soon_over = 0.2, badly_told = 0.025;
    const auto& partial = fit.noise.noise.partial_autocorrelation;
    const double of_size = relative_uncertainty_of_size(fit, 0);
    if (partial.size() == 0 || partial(0) < slow || fit.oscillator().damping_ratio() < soon_over ||
        !(of_size > badly_told))
        return;
    findings.push_back(
        {"slow_noise", Severity::caution,
         fmt::format(
             "The noise is as slow as the decay and tells its size to {:.2g} % only. Of such recordings "
             "the intervals given for 95 % were found to hold the truth in 90 to 95 %. Reduce the noise "
             "(drift, a draught, a bench that sways), use a larger displacement, or take the result of "
             "several releases.",
             100.0 * of_size)});
}

void describe_limits(const CurveFit& fit, const MethodResult& result, Findings& findings) {
    if (result.status != MethodStatus::ok) return;
    warn_of_slow_noise(fit, findings);
    const auto ratio = result.quantities.find(Quantity::damping_ratio);
    const bool told = ratio != result.quantities.end();
    const bool open = told && ratio->second.interval.high >= largest_damping_ratio;
    if (open)
        findings.push_back(
            {"beyond_critical", Severity::caution,
             fmt::format(
                 "The recording does not limit the damping ratio upwards: the intervals of damping ratio "
                 "and frequency end at {:g}, the largest ratio that is looked at. What it does tell is the "
                 "slow decay rate k/c. Sample faster and lower the noise in the first moments of the decay.",
                 largest_damping_ratio)});
    else if (fit.oscillator().damping_ratio() > far_beyond_critical || !told)
        findings.push_back(
            {"beyond_critical", Severity::caution,
             "The decay is far beyond critical damping: mostly the slow decay rate k/c can be told from it; "
             "frequency and damping ratio each depend on the first moments of the decay."});
}

// Height, speed and static deflection of a drop, beside what the curve fit says of its decay.
void add_drop(const Recording& recording, const CurveFit& fit, const IdentifyOptions& options,
              EventIdentification& result) {
    Quantities& quantities = result.curve_fit.quantities;
    if (result.event.flights.empty() || !quantities.contains(Quantity::natural_frequency) ||
        !quantities.contains(Quantity::damping_ratio))
        return;
    const DropReading reading = read_drop(recording, result.event, resting_decay(fit, quantities),
                                          options.gravity, options.confidence_level);
    quantities.insert(reading.quantities.begin(), reading.quantities.end());
    result.findings.insert(result.findings.end(), reading.findings.begin(), reading.findings.end());
}

}  // namespace

namespace {

void append(Findings& findings, const Findings& more) {
    findings.insert(findings.end(), more.begin(), more.end());
}

void run_simple_methods(EventIdentification& result, const CurveFit& fit, const MethodBootstrap& bootstrap,
                        double confidence_level) {
    result.logarithmic_decrement =
        simple_method_result(bootstrap.readings.decrement, bootstrap.decrement, fit, confidence_level);
    result.half_power_bandwidth =
        simple_method_result(bootstrap.readings.half_power, bootstrap.half_power, fit, confidence_level);
}

bool hit_twice(const Event& event) {
    return std::any_of(event.findings.begin(), event.findings.end(),
                       [](const Finding& finding) { return finding.code == "double_hit"; });
}

// A law that needs the swings before the event's start, and leaves no more there than noise as the search saw
// it.
std::optional<LawFit> law_from_earlier_start(const CurveFit& viscous, const Recording& recording,
                                             const Event& event, const CurveFitOptions& options) {
    constexpr double most_noise = 2.0, as_noisy = 1.1;
    if (!viscous.valid || rings_too_long(viscous) || !event.flights.empty()) return std::nullopt;
    const auto earlier = with_earlier_start(viscous, recording, event);
    if (!earlier) return std::nullopt;
    auto law = choose_law(fit_decay(recording, *earlier, options), recording, *earlier, options);
    if (!law) return std::nullopt;
    const double left = residual_level(law->curve);
    const double noise = event.noise_level / std::sqrt(static_cast<double>(law->curve.samples.block));
    if (left > most_noise * noise && left > residual_level(viscous)) return std::nullopt;
    // Two hits are no law, though one may come near to them.
    if (hit_twice(event) && left > as_noisy * std::max(residual_level(viscous), noise)) return std::nullopt;
    return law;
}

// Whether a law holds for the motion before the event's start as well, a quarter of a period and more: then
// that was no second hit.
bool holds_before(const LawFit& law, const Event& event) {
    const double period_s = 2.0 * std::numbers::pi / law.viscous.oscillator().angular_frequency();
    const auto quarter = static_cast<std::size_t>(0.25 * period_s * law.curve.window.rate_hz);
    return law.curve.window.begin + quarter <= event.begin;
}

// The two simple methods know viscous damping only.
void explain_by_law(Agreement& agreement, const std::string& model) {
    if (!agreement.tested || agreement.consistent) return;
    agreement.reading = fmt::format(
        "The methods disagree by more than their uncertainties allow: the damping is not viscous "
        "alone ({}), and each method averages over the amplitudes in its own way. Take the curve fit.",
        model);
}

// Where a law is known to be there, one cycle tells enough of it, and a mass that sticks tells nothing.
AmplitudeCourse course_beside(const LawFit& law, const Recording& recording, double confidence_level) {
    const double later =
        recording.clock.time_of(law.viscous.window.begin) - recording.clock.time_of(law.curve.window.begin);
    return amplitude_course(law.viscous, law.curve.noise, confidence_level,
                            {1.0, last_reversal_s(law) - later});
}

}  // namespace

namespace {

// The decay of an event as viscous damping explains it, and the law that explains it better where there is
// one.
struct Explanation {
    Event event;
    CurveFit viscous;
    /// Where the article is seen held and the release is not sharp: the fit of plateau, release and decay,
    /// which then is the answer. `viscous` begins safely behind the release.
    std::optional<CurveFit> held;
    /// Beside `held`, where the recording began too late to tell: a decay that was running at its first
    /// sample.
    std::optional<CurveFit> running;
    std::optional<LawFit> law;

    [[nodiscard]] const CurveFit& fit() const { return law ? law->viscous : viscous; }
    /// Whose residuals are those of the answer.
    [[nodiscard]] const CurveFit& answer() const { return law ? law->curve : held ? *held : viscous; }
};

// The viscous fit made again from behind the release, and plateau, release and decay as the answer unless the
// release is sharp.
void take_held(Explanation& explanation, HeldRelease held, const Recording& recording,
               const CurveFitOptions& options) {
    CurveFit& viscous = explanation.viscous;
    explanation.event = held.behind(explanation.event, recording);
    const bool too_early = viscous.window.begin < explanation.event.begin;
    CurveFit later = fit_decay(recording, explanation.event, options);
    if (held.may_be_none && viscous.valid && viscous.window.begin == 0) explanation.running = viscous;
    if (!held.sharp()) explanation.held = std::move(held.curve);
    if (explanation.held || (too_early && later.valid)) viscous = std::move(later);
}

Explanation explain(const Recording& recording, const Event& event, const CurveFitOptions& options) {
    Explanation explanation{event, fit_decay(recording, event, options), {}, {}, {}};
    CurveFit& viscous = explanation.viscous;
    if (auto first = fit_from_first_sample(viscous, recording, event, options)) {
        explanation.event = first->event;
        viscous = std::move(first->fit);
    }
    auto held = fit_held_release(viscous, recording, explanation.event, options);
    explanation.law = law_from_earlier_start(viscous, recording, explanation.event, options);
    if (held && !explanation.law) {
        const double start_s = recording.clock.time_of(viscous.window.begin);
        if (start_s > held->release_s + held->uncertainty_s)
            explanation.law = choose_law(viscous, recording, explanation.event, options);
        take_held(explanation, std::move(*held), recording, options);
    }
    if (!explanation.law) explanation.law = choose_law(viscous, recording, explanation.event, options);
    if (explanation.law) explanation.held.reset();
    return explanation;
}

EventIdentification unanswered(EventIdentification result) {
    result.logarithmic_decrement.reason = result.half_power_bandwidth.reason = result.curve_fit.reason;
    return result;
}

}  // namespace

EventIdentification identify_event(const Recording& recording, const Event& event,
                                   const IdentifyOptions& options) {
    EventIdentification result;
    CurveFitOptions fit_options;
    fit_options.near_hz = options.near_hz;
    fit_options.modes = options.modes;
    fit_options.seed = options.seed;
    fit_options.threads = options.threads;
    const Explanation explanation = explain(recording, event, fit_options);
    const std::optional<LawFit>& law = explanation.law;
    const CurveFit& fit = explanation.fit();
    result.event = explanation.event;
    // A law may have been fitted from earlier on than the search for viscous decays saw.
    result.start_s = recording.clock.time_of(law ? std::min(result.event.begin, law->curve.window.begin)
                                                 : result.event.begin);
    result.end_s = recording.clock.time_of(event.end > event.begin ? event.end - 1 : event.begin);
    result.curve_fit = law ? law_result(*law, recording, options)
                           : curve_fit_result(explanation.answer(), options.confidence_level);
    if (explanation.held && explanation.running && result.curve_fit.status == MethodStatus::ok) {
        const Quantities running = decay_quantities(*explanation.running, 0, options.confidence_level);
        contain_also(result.curve_fit.quantities, running);
        contain_also(result.curve_fit.modes.front().quantities, running);
    }
    if (law && holds_before(*law, result.event))
        std::erase_if(result.event.findings,
                      [](const Finding& finding) { return finding.code == "double_hit"; });
    result.findings = explanation.answer().findings;
    if (result.curve_fit.status != MethodStatus::ok) return unanswered(std::move(result));
    if (!fit.valid) {  // behind a release that noise hides is too little left for the simple methods
        describe_limits(explanation.answer(), result.curve_fit, result.findings);
        result.logarithmic_decrement.reason = result.half_power_bandwidth.reason = fit.reason;
        if (options.pictures) result.picture = draw_decay(recording, explanation.answer(), {});
        return result;
    }
    MethodBootstrap bootstrap;
    if (options.replicates > 0)
        bootstrap = bootstrap_methods(fit, affordable_replicates(options.replicates, fit.samples.size()),
                                      options.seed, options.threads);
    run_simple_methods(result, fit, bootstrap, options.confidence_level);
    append(result.findings, check_residuals(explanation.answer()));
    if (law)
        append(result.findings, describe_law(*law, recording, *result.curve_fit.at_amplitude));
    else
        describe_limits(explanation.answer(), result.curve_fit, result.findings);
    result.course = law ? course_beside(*law, recording, options.confidence_level)
                        : amplitude_course(fit, fit.noise, options.confidence_level);
    if (!law) append(result.findings, describe_course(result.course));
    add_drop(recording, fit, options, result);
    Findings known = result.findings;
    append(known, event.findings);
    append(known, recording.findings);
    result.agreement = test_agreement(fit, bootstrap, known);
    if (law) explain_by_law(result.agreement, result.curve_fit.model);
    if (options.pictures) {
        result.picture = draw_decay(recording, explanation.answer(), bootstrap);
        if (law) draw_law(result.picture, *law, options.confidence_level);
        draw_course(result.picture, result.course, result.curve_fit);
    }
    return result;
}

}  // namespace ringwright
