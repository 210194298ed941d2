#include "identify/amplitude_course.hpp"

#include <fmt/format.h>

#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>

#include "ringwright/distributions.hpp"
#include "ringwright/least_squares.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::Matrix2d;
using Eigen::MatrixXd;
using Eigen::Vector2d;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr std::size_t fewest_stretches = 3, most_stretches = 8;
constexpr double coarsest = 0.3;  // relative standard uncertainty of the damping ratio of a stretch
constexpr Index fewest_rows = 12;

struct Rows {
    Index begin = 0, count = 0;
};

// What the split needs to know of the decay.
struct Outline {
    double omega = 1.0, rate = 0.0, damping = 0.0;
    double amplitude = 1.0;  // at the start
    double noise = 0.0;      // standard deviation of a row of white noise as strong as this one at the mode
};

Outline outline_of(const CurveFit& fit, const NoiseFit& noise) {
    const Oscillator& o = fit.oscillator();
    Outline outline;
    outline.omega = o.angular_frequency();
    outline.rate = o.slowest_rate();
    outline.damping = o.damping_ratio();
    outline.amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, 0);
    const double cycles = std::min(0.5, outline.omega / two_pi * fit.samples.step_s);
    outline.noise = std::sqrt(noise.noise.spectral_density(cycles));
    return outline;
}

// Standard uncertainty of the damping ratio from rows of a swing of this amplitude: the slope of its
// logarithm, each row of which has the variance 2(noise/amplitude)².
double expected_uncertainty(const Outline& outline, double begin_s, double span_s, double rows) {
    const double amplitude = outline.amplitude * std::exp(-outline.rate * (begin_s + 0.5 * span_s));
    return outline.noise / amplitude * std::sqrt(24.0 / rows) / (span_s * outline.omega);
}

// Successive stretches, each as short as this uncertainty allows.
std::vector<Rows> split(const DecaySamples& samples, const Outline& outline, const CourseLimits& limits,
                        double uncertainty) {
    std::vector<Rows> parts;
    const double shortest = limits.shortest_periods * two_pi / outline.omega;
    Index begin = 0;
    for (Index end = 1; end < samples.size() && samples.time(end) <= limits.end_s; ++end) {
        const double span = samples.time(end) - samples.time(begin);
        const Index rows = end - begin;
        if (span < shortest || rows < fewest_rows) continue;
        if (expected_uncertainty(outline, samples.time(begin), span, static_cast<double>(rows)) > uncertainty)
            continue;
        parts.push_back({begin, rows});
        begin = end;
        if (parts.size() > most_stretches) break;
    }
    return parts;
}

// As many stretches as tell enough, eight at most: a coarser uncertainty gives more of them.
std::vector<Rows> best_split(const DecaySamples& samples, const Outline& outline,
                             const CourseLimits& limits) {
    double high = coarsest * outline.damping, low = 1e-4 * high;
    std::vector<Rows> parts = split(samples, outline, limits, high);
    if (parts.size() <= most_stretches) return parts;
    for (int i = 0; i < 24; ++i) {
        const double middle = std::sqrt(low * high);
        std::vector<Rows> finer = split(samples, outline, limits, middle);
        if (finer.size() > most_stretches) {
            high = middle;
        } else {
            low = middle;
            parts = std::move(finer);
        }
    }
    return parts;
}

// The decay of the first mode with its offset; everything else that the fit found is taken off.
VectorXd bare_decay(const CurveFit& fit) {
    VectorXd others = fit.fit.coefficients;
    others(0) = 0.0;
    others.segment(fit.fit.model.first_oscillator_column(), 2).setZero();
    return fit.samples.value - linear_columns(fit.fit.model, fit.samples) * others;
}

DecaySamples cut(const DecaySamples& samples, const VectorXd& value, const Rows& rows) {
    DecaySamples part = samples;
    part.time = samples.time.segment(rows.begin, rows.count).array() - samples.time(rows.begin);
    part.value = value.segment(rows.begin, rows.count);
    if (samples.fine_time.size() > 0)
        part.fine_time =
            samples.fine_time.segment(rows.begin * samples.block, rows.count * samples.block).array() -
            samples.time(rows.begin);
    part.stretches.clear();
    for (const Stretch& s : samples.stretches) {
        const Index begin = std::max(s.begin, rows.begin),
                    end = std::min(s.begin + s.length, rows.begin + rows.count);
        if (end > begin) part.stretches.push_back({begin - rows.begin, end - begin});
    }
    return part;
}

struct Local {
    Vector2d at = Vector2d::Zero();  // asinh ζ, ln ω
    Matrix2d covariance = Matrix2d::Zero();
    double amplitude = 0.0;  // in the middle of the stretch
};

std::optional<Local> fit_part(const DecaySamples& part, const Oscillator& start,
                              const AutoregressiveNoise& noise) {
    DecayModel model;
    model.oscillators.push_back(start);
    const ProjectedFit fit = fit_projected(model, part, noise);
    if (!fit.converged) return std::nullopt;
    MatrixXd design(part.size(), fit.model.linear_count() + 2);
    design << linear_columns(fit.model, part), derivative_columns(fit.model, part, fit.coefficients);
    whiten(noise, part.stretches, design);
    const MatrixXd covariance = covariance_from_jacobian(design, noise.innovation_variance);
    if (covariance.rows() == 0) return std::nullopt;
    const Oscillator& o = fit.model.oscillators.front();
    if (std::abs(o.log_frequency - start.log_frequency) > 0.3) return std::nullopt;
    Local local;
    local.at = {o.asinh_damping, o.log_frequency};
    local.covariance = covariance.bottomRightCorner(2, 2);
    local.amplitude = start_amplitude(fit.model, fit.coefficients, 0) *
                      std::exp(-o.slowest_rate() * 0.5 * part.time.maxCoeff());
    return local;
}

AmplitudePoint point_of(const Local& local, double scale, double degrees_of_freedom,
                        double confidence_level) {
    const double t = student_t_factor(confidence_level, degrees_of_freedom);
    const Oscillator o{local.at(0), local.at(1)};
    AmplitudePoint point;
    point.amplitude = local.amplitude * scale;
    const double slope = std::cosh(o.asinh_damping), hertz = o.angular_frequency() / two_pi;
    const double ratio_deviation = slope * std::sqrt(local.covariance(0, 0));
    const double frequency_deviation = hertz * std::sqrt(local.covariance(1, 1));
    const auto estimate = [&](double value, double deviation) {
        return Estimate{value, deviation, {value - t * deviation, value + t * deviation}, degrees_of_freedom};
    };
    point.damping_ratio = estimate(o.damping_ratio(), ratio_deviation);
    point.natural_frequency = estimate(hertz, frequency_deviation);
    return point;
}

// Whether all stretches may have the same damping and frequency: Wald's test, with F for the noise variance
// that was estimated.
double level_p_value(const std::vector<Local>& locals, double degrees_of_freedom) {
    Matrix2d information = Matrix2d::Zero();
    Vector2d weighted = Vector2d::Zero();
    for (const Local& local : locals) {
        const Matrix2d weight = local.covariance.inverse();
        information += weight;
        weighted += weight * local.at;
    }
    const Vector2d mean = information.ldlt().solve(weighted);
    double sum = 0.0;
    for (const Local& local : locals)
        sum += (local.at - mean).dot(local.covariance.ldlt().solve(local.at - mean));
    const double freedom = 2.0 * static_cast<double>(locals.size() - 1);
    return 1.0 - f_probability(sum / freedom, freedom, degrees_of_freedom);
}

}  // namespace

AmplitudeCourse amplitude_course(const CurveFit& fit, const NoiseFit& noise, double confidence_level,
                                 const CourseLimits& limits) {
    AmplitudeCourse course;
    const Outline outline = outline_of(fit, noise);
    if (!(outline.damping > 0.0) || outline.damping > 0.7) return course;
    const std::vector<Rows> parts = best_split(fit.samples, outline, limits);
    if (parts.size() < fewest_stretches) return course;
    const VectorXd decay = bare_decay(fit);
    std::vector<Local> locals;
    for (const Rows& rows : parts)
        if (const auto local = fit_part(cut(fit.samples, decay, rows), fit.oscillator(), noise.noise))
            locals.push_back(*local);
    if (locals.size() < fewest_stretches) return course;
    for (const Local& local : locals)
        course.points.push_back(
            point_of(local, fit.samples.scale, noise.degrees_of_freedom, confidence_level));
    course.tested = true;
    course.p_value = level_p_value(locals, noise.degrees_of_freedom);
    course.depends_on_amplitude = course.p_value < amplitude_dependence_level;
    return course;
}

void draw_course(DecayPicture& picture, const AmplitudeCourse& course, const MethodResult& fitted) {
    for (const AmplitudePoint& point : course.points) {
        picture.course_amplitude.push_back(point.amplitude);
        picture.course_damping_ratio.push_back(point.damping_ratio.value);
        picture.course_low.push_back(point.damping_ratio.interval.low);
        picture.course_high.push_back(point.damping_ratio.interval.high);
    }
    const auto ratio = fitted.quantities.find(Quantity::damping_ratio);
    if (course.points.empty() || !picture.model_amplitude.empty() || ratio == fitted.quantities.end()) return;
    const auto [low, high] = std::ranges::minmax(picture.course_amplitude);
    picture.model_amplitude = {high, low};
    picture.model_damping_ratio.assign(2, ratio->second.value);
    picture.model_low.assign(2, ratio->second.interval.low);
    picture.model_high.assign(2, ratio->second.interval.high);
}

Findings describe_course(const AmplitudeCourse& course) {
    if (!course.depends_on_amplitude) return {};
    const AmplitudePoint &first = course.points.front(), &last = course.points.back();
    return {{"damping_depends_on_amplitude", Severity::caution,
             fmt::format(
                 "Damping or frequency change as the decay gets smaller (p = {:.1g}): from the first to the "
                 "last of {} stretches the damping ratio goes from {:.3g} to {:.3g} and the frequency from "
                 "{:.5g} to {:.5g} Hz. One number holds for the average over this record only.",
                 course.p_value, course.points.size(), first.damping_ratio.value, last.damping_ratio.value,
                 first.natural_frequency.value, last.natural_frequency.value)}};
}

}  // namespace ringwright::identify
