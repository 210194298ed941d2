#include "identify/law_quantities.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <functional>
#include <numbers>

#include "identify/decay_quantities.hpp"
#include "ringwright/damping_relations.hpp"
#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double pi = std::numbers::pi;
constexpr double two_pi = 2.0 * pi;

// A figure of the law and its derivatives by the law's parameters, both in the law's own units.
struct Figure {
    double value = 0.0;
    std::array<double, law_parameter_count> gradient{};
    double& by(LawParameter p) { return gradient[static_cast<std::size_t>(p)]; }
};

enum class Scale { linear, logarithmic };

using FigureOf = std::function<Figure(const DampingLaw&)>;

// Where the branches of a fit that sticks are both likely: the quantile of their mixture.
double mixture_quantile(const std::vector<std::pair<double, double>>& values_and_weights,
                        const Spread& spread, double probability) {
    double low = values_and_weights.front().first, high = low;
    for (const auto& [value, weight] : values_and_weights) {
        low = std::min(low, value - 30.0 * spread.scale);
        high = std::max(high, value + 30.0 * spread.scale);
    }
    for (int i = 0; i < 60; ++i) {
        const double middle = 0.5 * (low + high);
        double below = 0.0;
        for (const auto& [value, weight] : values_and_weights)
            below +=
                weight * student_t_probability((middle - value) / spread.scale, spread.degrees_of_freedom);
        (below < probability ? low : high) = middle;
    }
    return 0.5 * (low + high);
}

void spread_over_branches(Estimate& estimate, const LawFit& fit, const FigureOf& figure_of,
                          const Spread& spread, double unit, double confidence_level) {
    double sum = 1.0, square = 0.0;
    for (const LawBranch& branch : fit.branches) sum += branch.weight;
    const double value = figure_of(fit.state.law).value;
    std::vector<std::pair<double, double>> mixture{{value, 1.0 / sum}};
    for (const LawBranch& branch : fit.branches) {
        mixture.emplace_back(figure_of(branch.state.law).value, branch.weight / sum);
        square += mixture.back().second * std::pow(mixture.back().first - value, 2.0);
    }
    estimate.standard_uncertainty = std::hypot(spread.scale, std::sqrt(square)) * unit;
    estimate.interval = {mixture_quantile(mixture, spread, 0.5 * (1.0 - confidence_level)) * unit,
                         mixture_quantile(mixture, spread, 0.5 * (1.0 + confidence_level)) * unit};
}

Estimate estimate_of_figure(const LawFit& fit, const FigureOf& figure_of, double unit,
                            double confidence_level, Scale scale) {
    Figure figure = figure_of(fit.state.law);
    VectorXd gradient = VectorXd::Zero(fit.curve.map.rows());
    for (std::size_t i = 0; i < law_parameter_count; ++i)
        if (const auto row = fit.row_of(static_cast<LawParameter>(i))) gradient(*row) = figure.gradient[i];
    const Spread spread = spread_of(fit.curve, gradient);
    const double reach = student_t_factor(confidence_level, spread.degrees_of_freedom) * spread.scale;
    Estimate estimate;
    estimate.value = figure.value * unit;
    estimate.standard_uncertainty = spread.scale * unit;
    estimate.degrees_of_freedom = spread.degrees_of_freedom;
    estimate.interval = {(figure.value - reach) * unit, (figure.value + reach) * unit};
    if (scale == Scale::logarithmic && figure.value > 0.0) {
        const double ratio = std::exp(reach / figure.value);
        estimate.interval = {figure.value / ratio * unit, figure.value * ratio * unit};
    }
    if (!fit.branches.empty()) spread_over_branches(estimate, fit, figure_of, spread, unit, confidence_level);
    return estimate;
}

FigureOf parameter(LawParameter p) {
    return [p](const DampingLaw& law) {
        Figure figure;
        figure.value = law[p];
        figure.by(p) = 1.0;
        return figure;
    };
}

// S + D or S − D.
FigureOf one_way(double sign) {
    return [sign](const DampingLaw& law) {
        Figure figure;
        figure.value = law[LawParameter::damping] + sign * law[LawParameter::asymmetry];
        figure.by(LawParameter::damping) = 1.0;
        figure.by(LawParameter::asymmetry) = sign;
        return figure;
    };
}

// ζ at amplitude x of the displacement, in the law's unit of length.
Figure equivalent_ratio(const DampingLaw& law, double x) {
    const double w = law.angular_frequency(), s = law[LawParameter::damping];
    const double f = law[LawParameter::friction], q = law[LawParameter::quadratic];
    Figure figure;
    figure.value = damping_ratio_of(
        2.0 * s + equivalent_viscous_of_friction(f, x, w) + equivalent_viscous_of_quadratic(q, x, w), w * w,
        1.0);
    figure.by(LawParameter::damping) = 1.0 / w;
    figure.by(LawParameter::friction) = 2.0 / (pi * w * w * x);
    figure.by(LawParameter::quadratic) = 4.0 * x / (3.0 * pi);
    figure.by(LawParameter::log_frequency) = -s / w - 4.0 * f / (pi * w * w * x);
    return figure;
}

// Displacement in the law's unit of length from an amplitude of what was measured.
double length_of_amplitude(const LawFit& fit, double amplitude) {
    return amplitude / fit.curve.samples.scale /
           std::pow(fit.state.law.angular_frequency(), static_cast<double>(fit.measured));
}

double to_two_digits(double value) {
    return std::strtod(fmt::format("{:.1e}", value).c_str(), nullptr);
}

double last_instant(const LawFit& fit) {
    return fit.curve.samples.time.maxCoeff();
}

// How many of the swings stand above the noise.
std::size_t above_noise(const LawFit& fit, const Swings& swings) {
    const double noise = std::sqrt(fit.curve.noise.noise.variance()) * fit.curve.samples.scale;
    std::size_t count = 0;
    while (count < swings.amplitude.size() && swings.amplitude[count] > noise) ++count;
    return count;
}

// ζ of a stretch at amplitude x: as the equivalent one, over the frequency that a cubic spring has there, to
// first order ω²(1 + ¾ k₃X²/k) (Lindstedt–Poincaré; standard theory).
Figure ratio_of_stretch(const DampingLaw& law, double x) {
    const double w = law.angular_frequency(), change = 0.75 * law[LawParameter::cubic] * x * x;
    const double square = std::max(w * w + change, 0.25 * w * w), here = std::sqrt(square);
    const double s = law[LawParameter::damping], f = law[LawParameter::friction];
    Figure figure;
    figure.by(LawParameter::damping) = 1.0 / here;
    figure.by(LawParameter::friction) = 2.0 / (pi * square * x);
    figure.by(LawParameter::quadratic) = 4.0 * x / (3.0 * pi);
    figure.value = s * figure.by(LawParameter::damping) + f * figure.by(LawParameter::friction) +
                   law[LawParameter::quadratic] * figure.by(LawParameter::quadratic);
    const double by_log_here = -s / here - 4.0 * f / (pi * square * x);
    figure.by(LawParameter::log_frequency) = by_log_here * w * w / square;
    figure.by(LawParameter::cubic) = by_log_here * 0.375 * x * x / square;
    return figure;
}

}  // namespace

Swings swings_of(const LawFit& fit) {
    const LawMotion motion = fit.model().motion(fit.state.law, Measured::displacement, {last_instant(fit)});
    std::vector<double> turns;
    for (const double t : motion.reversals)
        if (turns.empty() || t > turns.back()) turns.push_back(t);
    std::vector<double> times(turns);
    for (double& t : times) t /= fit.rate;
    Swings swings;
    if (times.empty()) return swings;
    const VectorXd x = fit.model().motion(fit.state.law, Measured::displacement, times).value;
    const double unit = fit.curve.samples.scale *
                        std::pow(fit.state.law.angular_frequency(), static_cast<double>(fit.measured));
    for (std::size_t i = 0; i + 1 < times.size(); ++i) {
        const auto row = static_cast<Index>(i);
        swings.time_s.push_back(0.5 * (times[i] + times[i + 1]));
        swings.amplitude.push_back(0.5 * std::abs(x(row) - x(row + 1)) * unit);
    }
    return swings;
}

double last_reversal_s(const LawFit& fit) {
    const auto reversals =
        fit.model().motion(fit.state.law, Measured::displacement, {last_instant(fit)}).reversals;
    return reversals.empty() ? 0.0 : reversals.back() / fit.rate;
}

double middle_amplitude(const LawFit& fit) {
    const Swings swings = swings_of(fit);
    const std::size_t count = above_noise(fit, swings);
    if (count == 0) return to_two_digits(0.5 * fit.curve.samples.scale);
    const double middle = 0.5 * (swings.time_s.front() + swings.time_s[count - 1]);
    const auto after = std::ranges::lower_bound(swings.time_s, middle);
    return to_two_digits(swings.amplitude[static_cast<std::size_t>(after - swings.time_s.begin())]);
}

double equivalent_damping_ratio(const LawFit& fit, double amplitude) {
    return equivalent_ratio(fit.state.law, length_of_amplitude(fit, amplitude)).value;
}

Quantities law_quantities(const LawFit& fit, double amplitude, double confidence_level) {
    const double x = length_of_amplitude(fit, amplitude);
    const FigureOf frequency = [](const DampingLaw& law) {
        Figure figure;
        figure.value = law.angular_frequency();
        figure.by(LawParameter::log_frequency) = figure.value;
        return figure;
    };
    const FigureOf ratio = [x](const DampingLaw& law) { return equivalent_ratio(law, x); };
    const FigureOf rate = [x](const DampingLaw& law) {
        Figure figure = equivalent_ratio(law, x);
        const double w = law.angular_frequency();
        figure.value *= w;
        for (double& g : figure.gradient) g *= w;
        figure.by(LawParameter::log_frequency) += figure.value;
        return figure;
    };
    Quantities quantities;
    quantities[Quantity::natural_frequency] =
        estimate_of_figure(fit, frequency, fit.rate / two_pi, confidence_level, Scale::logarithmic);
    quantities[Quantity::damping_ratio] =
        estimate_of_figure(fit, ratio, 1.0, confidence_level, Scale::linear);
    quantities[Quantity::decay_rate] =
        estimate_of_figure(fit, rate, fit.rate, confidence_level, Scale::linear);
    add_functions_of_damping(quantities);
    return quantities;
}

Quantities law_per_mass(const LawFit& fit, double confidence_level) {
    const double rate = fit.rate, length = fit.length();
    const auto stated = [&](const FigureOf& figure, double unit, Scale scale) {
        return estimate_of_figure(fit, figure, unit, confidence_level, scale);
    };
    Quantities quantities;
    quantities[Quantity::damping_coefficient] =
        stated(parameter(LawParameter::damping), 2.0 * rate, Scale::linear);
    if (fit.terms.friction)
        quantities[Quantity::friction_force] =
            stated(parameter(LawParameter::friction), length * rate * rate, Scale::linear);
    if (fit.terms.asymmetry) {
        quantities[Quantity::compression_damping] = stated(one_way(1.0), 2.0 * rate, Scale::linear);
        quantities[Quantity::rebound_damping] = stated(one_way(-1.0), 2.0 * rate, Scale::linear);
    }
    if (fit.terms.quadratic)
        quantities[Quantity::quadratic_damping] =
            stated(parameter(LawParameter::quadratic), 1.0 / length, Scale::linear);
    if (fit.terms.cubic)
        quantities[Quantity::cubic_stiffness] =
            stated(parameter(LawParameter::cubic), rate * rate / (length * length), Scale::linear);
    return quantities;
}

namespace {

std::string amplitude_text(double value, const Recording& recording) {
    const bool scaled = recording.scaled && recording.unit.si_factor > 0.0 && !recording.unit.symbol.empty();
    const double shown = scaled ? value / recording.unit.si_factor : value;
    return recording.unit.symbol.empty() ? fmt::format("{:.3g}", shown)
                                         : fmt::format("{:.3g} {}", shown, recording.unit.symbol);
}

// A displacement in the law's unit of length, as text.
std::string displacement_text(const LawFit& fit, double length, const Recording& recording) {
    const double value = length * fit.length();
    if (fit.measured == Measured::displacement) return amplitude_text(value, recording);
    if (!recording.scaled) return {};
    return is_torsional(recording.quantity) ? fmt::format("{:.3g} rad", value)
                                            : fmt::format("{:.3g} mm", 1e3 * value);
}

Finding friction_finding(const LawFit& fit, const Recording& recording) {
    const double w = fit.state.law.angular_frequency();
    const std::string band =
        displacement_text(fit, fit.state.law[LawParameter::friction] / (w * w), recording);
    std::string text = "Dry friction acts beside the other damping, so the decay quickens as it gets smaller";
    if (!band.empty())
        text += fmt::format(
            "; it takes four times {0} from the amplitude in a cycle and can hold the mass up to {0} off its "
            "rest position (friction force over stiffness)",
            band);
    return {"dry_friction", Severity::caution, text + "."};
}

Finding two_way_finding(const LawFit& fit) {
    const double s = fit.state.law[LawParameter::damping], d = fit.state.law[LawParameter::asymmetry];
    const double up = s + d, down = s - d;
    const std::string ratio = up > 0.0 && down > 0.0
                                  ? fmt::format("{:.3g} times", std::max(up, down) / std::min(up, down))
                                  : std::string("more");
    return {
        "two_way_damping", Severity::caution,
        fmt::format("The damper damps {} while the recorded displacement {} than while it {}. "
                    "Compression stands for rising displacement and rebound for falling; where the sensor "
                    "counts the other way round, read them exchanged.",
                    ratio == "more" ? ratio : ratio + " as strongly", up > down ? "rises" : "falls",
                    up > down ? "falls" : "rises")};
}

Finding quadratic_finding(const LawFit& fit, const Recording& recording, double amplitude) {
    const double x = length_of_amplitude(fit, amplitude);
    const double share = 4.0 * x * fit.state.law[LawParameter::quadratic] / (3.0 * pi) /
                         equivalent_ratio(fit.state.law, x).value;
    return {
        "quadratic_damping", Severity::caution,
        fmt::format("Part of the damping grows with the square of the velocity, as flow through an orifice "
                    "makes it: {:.0f} % of the damping at an amplitude of {}.",
                    100.0 * share, amplitude_text(amplitude, recording))};
}

Finding cubic_finding(const LawFit& fit, const Recording& recording, double amplitude) {
    const double x = length_of_amplitude(fit, amplitude), w = fit.state.law.angular_frequency();
    // Frequency of a cubic spring to first order: ω²(1 + ¾ k₃X²/k) (Lindstedt–Poincaré; standard theory).
    const double change = 0.375 * fit.state.law[LawParameter::cubic] * x * x / (w * w);
    return {
        "stiffness_depends_on_amplitude", Severity::caution,
        fmt::format("The spring {} as it is deflected: at an amplitude of {} the frequency is {:.2g} % {} "
                    "than that of small swings, which is the natural frequency stated.",
                    change > 0.0 ? "stiffens" : "softens", amplitude_text(amplitude, recording),
                    100.0 * std::abs(change), change > 0.0 ? "higher" : "lower")};
}

Finding equivalent_finding(const LawFit& fit, const Recording& recording, double amplitude) {
    const Swings swings = swings_of(fit);
    std::string course;
    if (swings.amplitude.size() > 1) {
        const double first = swings.amplitude.front(), last = swings.amplitude.back();
        if (last > 0.0 && last < first)
            course = fmt::format(" It goes from {:.3g} at {} to {:.3g} at {}.",
                                 equivalent_damping_ratio(fit, first), amplitude_text(first, recording),
                                 equivalent_damping_ratio(fit, last), amplitude_text(last, recording));
    }
    return {
        "equivalent_damping", Severity::note,
        fmt::format("The damping is not viscous alone ({}). The damping ratio and what follows from it are "
                    "those of the viscous damper that takes the same energy in a cycle at an amplitude of "
                    "{}; --at-amplitude chooses another.{}",
                    name_of(fit.terms, fit.state.law[LawParameter::cubic]),
                    amplitude_text(amplitude, recording), course)};
}

}  // namespace

Findings describe_law(const LawFit& fit, const Recording& recording, double amplitude) {
    Findings findings;
    if (fit.terms.friction) findings.push_back(friction_finding(fit, recording));
    if (fit.terms.asymmetry) findings.push_back(two_way_finding(fit));
    if (fit.terms.quadratic) findings.push_back(quadratic_finding(fit, recording, amplitude));
    if (fit.terms.cubic) findings.push_back(cubic_finding(fit, recording, amplitude));
    findings.push_back(equivalent_finding(fit, recording, amplitude));
    return findings;
}

namespace {

void draw_law_course(DecayPicture& picture, const LawFit& fit, const Swings& swings,
                     double confidence_level) {
    constexpr std::size_t points = 40;
    const std::size_t count = above_noise(fit, swings);
    if (count < 2) return;
    const double high = swings.amplitude.front(), low = swings.amplitude[count - 1];
    for (std::size_t i = 0; i < points; ++i) {
        const double share = static_cast<double>(i) / (points - 1),
                     amplitude = high * std::pow(low / high, share);
        const double x = length_of_amplitude(fit, amplitude);
        const Estimate ratio = estimate_of_figure(
            fit, [x](const DampingLaw& law) { return ratio_of_stretch(law, x); }, 1.0, confidence_level,
            Scale::linear);
        picture.model_amplitude.push_back(amplitude);
        picture.model_damping_ratio.push_back(ratio.value);
        picture.model_low.push_back(ratio.interval.low);
        picture.model_high.push_back(ratio.interval.high);
    }
}

}  // namespace

void draw_law(DecayPicture& picture, const LawFit& fit, double confidence_level) {
    const Swings swings = swings_of(fit);
    if (swings.time_s.size() < 2) return;
    draw_law_course(picture, fit, swings, confidence_level);
    picture.offset = fit.state.coefficients(0) * fit.curve.samples.scale;
    picture.envelope.clear();
    std::size_t at = 0;
    for (const double t : fit.curve.samples.time) {
        while (at + 2 < swings.time_s.size() && swings.time_s[at + 1] < t) ++at;
        const double share = (t - swings.time_s[at]) / (swings.time_s[at + 1] - swings.time_s[at]);
        const double low = swings.amplitude[at], high = swings.amplitude[at + 1];
        const double reach = std::max(0.0, t > swings.time_s.back() ? high : low + share * (high - low));
        picture.envelope.push_back(picture.offset + reach);
    }
}

}  // namespace ringwright::identify
