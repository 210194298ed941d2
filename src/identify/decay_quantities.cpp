#include "identify/decay_quantities.hpp"

#include <Eigen/Cholesky>
#include <Eigen/QR>
#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <numbers>

#include "ringwright/distributions.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::Matrix2d;
using Eigen::MatrixXd;
using Eigen::Vector2d;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;

// A quantity as a function of (z, w), in the scale in which its error is most nearly symmetrical.
struct Derived {
    Quantity quantity;
    double (*value)(const Oscillator&);
    bool logarithmic;
};

double damping_ratio(const Oscillator& o) {
    return o.damping_ratio();
}
double natural_frequency(const Oscillator& o) {
    return o.angular_frequency() / two_pi;
}
double damped_frequency(const Oscillator& o) {
    return o.damped_frequency_hz();
}
double decay_rate(const Oscillator& o) {
    return o.decay_rate();
}
double slow_decay_rate(const Oscillator& o) {
    return o.angular_frequency() / (2.0 * o.damping_ratio());
}

constexpr double critical = 1.0;  // beyond it the slow decay rate is a quantity of its own

constexpr std::array basic{
    Derived{Quantity::natural_frequency, natural_frequency, true},
    Derived{Quantity::damping_ratio, damping_ratio, false},
    Derived{Quantity::decay_rate, decay_rate, false},
    Derived{Quantity::damped_frequency, damped_frequency, false},
    Derived{Quantity::slow_decay_rate, slow_decay_rate, true},
};

Oscillator moved(const Oscillator& o, const Vector2d& by) {
    return {o.asinh_damping + by(0), o.log_frequency + by(1)};
}

Vector2d gradient_of(const Derived& derived, const Oscillator& at) {
    constexpr double step = 1e-6;
    Vector2d gradient;
    for (Index i = 0; i < 2; ++i) {
        Vector2d by = Vector2d::Zero();
        by(i) = step;
        gradient(i) = (derived.value(moved(at, by)) - derived.value(moved(at, -by))) / (2.0 * step);
    }
    return gradient;
}

Spread spread_of_oscillator(const CurveFit& fit, std::size_t index, const Vector2d& gradient) {
    VectorXd full = VectorXd::Zero(fit.map.rows());
    full.segment(fit.linear_count() + 2 * static_cast<Index>(index), 2) = gradient;
    return spread_of(fit, full);
}

// What neither a straight line nor the profile knows of the error: how the fit shapes the noise that is seen
// and, where the instant of a release is fitted as well, how noise moves it from one bend to another.
// Measured over recordings of known truth (docs/methods/coverage.md), not derived: intervals were too narrow
// by about this factor, in proportion to how badly the size and, behind a hold, the frequency of the decay
// are told.
double higher_order_factor(const CurveFit& fit, std::size_t index) {
    constexpr double largest_size = 0.5, largest_frequency = 0.15;
    const auto limited = [](double value, double most) { return value < most ? value : most; };  // NaN: most
    const double of_size = limited(relative_uncertainty_of_size(fit, index), largest_size);
    if (!fit.fit.model.release) return 1.0 + of_size;
    return 1.0 + of_size + limited(spread_of_oscillator(fit, index, {0.0, 1.0}).scale, largest_frequency);
}

// Whitened residual sum with the oscillator held at one place and everything else at its best: nuisance
// nonlinear parameters enter by their derivative columns.
class Profile {
  public:
    Profile(const CurveFit& fit, std::size_t index) : fit_(fit), index_(index) {
        response_ = fit.samples.value;
        whiten(fit.noise.noise, fit.samples.stretches, response_);
        const MatrixXd derivatives = derivative_columns(fit.fit.model, fit.samples, fit.fit.coefficients);
        nuisance_.resize(derivatives.rows(), derivatives.cols() - 2);
        for (Index c = 0, at = 0; c < derivatives.cols(); ++c)
            if (c / 2 != static_cast<Index>(index) ||
                c >= 2 * static_cast<Index>(fit.fit.model.oscillators.size()))
                nuisance_.col(at++) = derivatives.col(c);
        unit_ = fit.noise.noise.innovation_variance;
        least_ = residual_sum(fit.fit.model.oscillators[index]);
    }

    /// Rise of the residual sum in units of the innovation variance.
    [[nodiscard]] double rise(const Vector2d& by) const {
        return (residual_sum(moved(fit_.fit.model.oscillators[index_], by)) - least_) / unit_;
    }

  private:
    [[nodiscard]] double residual_sum(const Oscillator& oscillator) const {
        DecayModel model = fit_.fit.model;
        model.oscillators[index_] = oscillator;
        if (model.release) follow_release(model);
        const MatrixXd linear = linear_columns(model, fit_.samples);
        MatrixXd design(linear.rows(), linear.cols() + nuisance_.cols());
        design << linear, nuisance_;
        whiten(fit_.noise.noise, fit_.samples.stretches, design);
        const Eigen::HouseholderQR<MatrixXd> factor(design);
        VectorXd rotated = response_;
        rotated.applyOnTheLeft(factor.householderQ().adjoint());
        return rotated.tail(rotated.size() - design.cols()).squaredNorm();
    }

    // The instant of a release moves with the oscillator, and not along a straight line.
    void follow_release(DecayModel& model) const {
        constexpr int steps = 3;
        VectorXd coefficients = fit_.fit.coefficients;
        const Index linear_count = coefficients.size();
        for (int i = 0; i < steps; ++i) {
            MatrixXd design(fit_.samples.size(), linear_count + 1);
            const MatrixXd derivatives = derivative_columns(model, fit_.samples, coefficients);
            design << linear_columns(model, fit_.samples), derivatives.rightCols(1);
            whiten(fit_.noise.noise, fit_.samples.stretches, design);
            const VectorXd best = design.householderQr().solve(response_);
            if (!best.allFinite()) return;
            coefficients = best.head(linear_count);
            const double last = fit_.samples.time(fit_.samples.size() - 1);
            model.release = std::clamp(*model.release + best(linear_count), 1e-3 * last, last);
        }
    }

    const CurveFit& fit_;
    std::size_t index_;
    VectorXd response_;
    MatrixXd nuisance_;
    double unit_ = 1.0, least_ = 0.0;
};

constexpr double straight_enough =
    0.04;  // relative departure of the rise from a parabola at the interval's ends

// The profile along the damping coordinate z: at each slice the best frequency coordinate w, the rise there,
// and how steeply the rise grows on either side of it. Below and near critical damping the valley of good
// fits is bent, beyond it runs on to infinite damping: slices follow it where rays from the best fit would
// leave it.
struct Slice {
    double z = 0.0, w = 0.0;  // moves from the best fit
    double root_of_rise = 0.0;
    double bend = 0.0;  // ½ ∂²rise/∂w²
};

struct Region {
    std::vector<Slice> slices;  // by rising z
    double factor = 0.0;        // the t factor it was traced for; slices go a little farther
    bool curved = false;
    bool open_above = false;  // the rise stays below factor² to the largest damping looked at
};

// Best w at this z by parabolas through three points, from `guess`.
Slice slice_at(const Profile& profile, double z, double guess, double step) {
    Slice slice{z, guess, 0.0, 0.0};
    double rise = 0.0;
    for (int i = 0; i < 6; ++i) {
        const double left = profile.rise({z, slice.w - step}), right = profile.rise({z, slice.w + step});
        rise = profile.rise({z, slice.w});
        slice.bend = 0.5 * (left - 2.0 * rise + right) / (step * step);
        if (!(slice.bend > 0.0)) {
            slice.w += left < right ? -2.0 * step : 2.0 * step;
            continue;
        }
        const double move = std::clamp(0.25 * (left - right) / (step * slice.bend), -4.0 * step, 4.0 * step);
        slice.w += move;
        rise -= slice.bend * move * move;
        if (std::abs(move) < step) break;
    }
    slice.root_of_rise = std::sqrt(std::max(0.0, rise));
    return slice;
}

// Slices from the best fit in one direction until the rise is beyond `target`²; false where it never is.
bool trace_slices(const Profile& profile, const Matrix2d& covariance, double direction, double target,
                  double most, std::vector<Slice>& slices) {
    constexpr double finest = 0.1, coarsest = 0.35;  // change of the root of the rise from slice to slice
    const double deviation = std::sqrt(covariance(0, 0));
    const double width =
        0.3 * std::sqrt(std::max(1e-300,
                                 covariance(1, 1) - covariance(0, 1) * covariance(0, 1) / covariance(0, 0)));
    double step = 0.25 * deviation, slope = covariance(0, 1) / covariance(0, 0);
    Slice last{0.0, 0.0, 0.0, 0.0};
    for (int i = 0; i < 150; ++i) {
        const double z = direction * std::min(direction * last.z + step, most);
        const Slice next = slice_at(profile, z, last.w + slope * (z - last.z), width);
        const double change = std::abs(next.root_of_rise - last.root_of_rise);
        if (change > coarsest * target && step > 0.01 * deviation) {
            step *= 0.5;
            continue;
        }
        slices.push_back(next);
        if (next.root_of_rise > target) return true;
        if (direction * z >= most) return false;
        slope = (next.w - last.w) / (next.z - last.z);
        last = next;
        if (change < finest * target) step *= 1.6;
    }
    return false;
}

// Calls `visit` with the edges of the region in which the rise is below `target`².
template <typename Visit>
void visit_edges(const Region& region, double target, Visit visit) {
    constexpr int between = 8;
    for (std::size_t i = 0; i + 1 < region.slices.size(); ++i) {
        const Slice &from = region.slices[i], &to = region.slices[i + 1];
        for (int k = 0; k <= between; ++k) {
            const double share = static_cast<double>(k) / between;
            const auto blend = [&](double a, double b) { return a + share * (b - a); };
            const double root = blend(from.root_of_rise, to.root_of_rise);
            if (std::abs(root) > target) continue;
            const double reach = std::sqrt((target * target - root * root) / blend(from.bend, to.bend));
            const Vector2d middle(blend(from.z, to.z), blend(from.w, to.w));
            visit(Vector2d(middle - Vector2d(0.0, reach)));
            visit(Vector2d(middle + Vector2d(0.0, reach)));
        }
    }
}

// Where the root of the rise crosses ±target, by straight lines between slices.
void visit_ends(const Region& region, double target, const std::function<void(const Vector2d&)>& visit) {
    for (std::size_t i = 0; i + 1 < region.slices.size(); ++i) {
        const Slice &from = region.slices[i], &to = region.slices[i + 1];
        for (const double level : {-target, target}) {
            if ((from.root_of_rise - level) * (to.root_of_rise - level) >= 0.0) continue;
            const double share = (level - from.root_of_rise) / (to.root_of_rise - from.root_of_rise);
            visit({from.z + share * (to.z - from.z), from.w + share * (to.w - from.w)});
        }
    }
}

Matrix2d joint_covariance(const CurveFit& fit, std::size_t index) {
    const MatrixXd rows = fit.map.middleRows(fit.linear_count() + 2 * static_cast<Index>(index), 2);
    return fit.noise.noise.innovation_variance * rows * fit.noise.fit.unit_covariance * rows.transpose();
}

Region trace_region(const CurveFit& fit, std::size_t index, double factor) {
    constexpr double farther = 1.3;  // what it cost to estimate the noise differs between quantities
    Region region;
    region.factor = factor;
    const Matrix2d covariance = joint_covariance(fit, index);
    const Eigen::LLT<Matrix2d> root(covariance);
    if (root.info() != Eigen::Success) return region;
    const Profile profile(fit, index);
    const Matrix2d lower = root.matrixL();
    for (const Vector2d& axis :
         {Vector2d(1.0, 0.0), Vector2d(0.0, 1.0), Vector2d(0.7071, 0.7071), Vector2d(0.7071, -0.7071)})
        for (const double sign : {1.0, -1.0}) {
            const double rise = profile.rise(sign * factor * (lower * axis));
            region.curved = region.curved || !(std::abs(rise / (factor * factor) - 1.0) < straight_enough);
        }
    if (!region.curved) return region;
    const double z = fit.fit.model.oscillators[index].asinh_damping;
    std::vector<Slice> below;
    trace_slices(profile, covariance, -1.0, farther * factor, z + 0.4, below);
    for (Slice& slice : below) slice.root_of_rise = -slice.root_of_rise;
    region.slices.assign(below.rbegin(), below.rend());
    region.slices.push_back(slice_at(profile, 0.0, 0.0, 0.1 * lower(1, 1)));
    region.slices.back().root_of_rise = 0.0;
    const double most = std::max(0.1, std::asinh(largest_damping_ratio) - z);
    region.open_above = !trace_slices(profile, covariance, 1.0, farther * factor, most, region.slices);
    return region;
}

Estimate straight_estimate(const Derived& derived, const Oscillator& at, const Spread& spread,
                           double confidence_level) {
    Estimate estimate;
    estimate.value = derived.value(at);
    estimate.standard_uncertainty = spread.scale;
    estimate.degrees_of_freedom = spread.degrees_of_freedom;
    const double reach = student_t_factor(confidence_level, spread.degrees_of_freedom) * spread.scale;
    if (derived.logarithmic && estimate.value > 0.0) {
        const double ratio = std::exp(reach / estimate.value);
        estimate.interval = {estimate.value / ratio, estimate.value * ratio};
    } else {
        estimate.interval = {estimate.value - reach, estimate.value + reach};
    }
    return estimate;
}

bool grows_with_damping(Quantity quantity) {
    return quantity == Quantity::damping_ratio || quantity == Quantity::natural_frequency ||
           quantity == Quantity::decay_rate;
}

// The region is read for the noise as estimated and for what it cost to estimate it.
void bend_interval(Estimate& estimate, const Derived& derived, const CurveFit& fit, std::size_t index,
                   const Region& region, double plain_scale, double confidence_level) {
    const Oscillator& at = fit.fit.model.oscillators[index];
    const double wanted = student_t_factor(confidence_level, estimate.degrees_of_freedom) *
                          estimate.standard_uncertainty / plain_scale;
    const double target = std::min(wanted, 1.3 * region.factor);
    Interval& interval = estimate.interval;
    interval = {estimate.value, estimate.value};
    const auto widen = [&](const Vector2d& by) {
        const double value = derived.value(moved(at, by));
        interval = {std::min(interval.low, value), std::max(interval.high, value)};
    };
    visit_edges(region, target, widen);
    visit_ends(region, target, widen);
    const bool open = region.open_above && region.slices.back().root_of_rise < target;
    if (open && grows_with_damping(derived.quantity)) interval.high = std::numeric_limits<double>::infinity();
}

// Upper ends that the recording does not set are put where a damping ratio of this size has them: whoever
// reads the interval sees how far it goes, and what is left out does not depend on where noise put the value.
constexpr double largest_value_with_open_end = 10.0;

void close_open_ends(Quantities& quantities) {
    const auto ratio = quantities.find(Quantity::damping_ratio);
    const auto frequency = quantities.find(Quantity::natural_frequency);
    if (ratio == quantities.end() || frequency == quantities.end()) return;
    if (ratio->second.value > largest_value_with_open_end) return;
    // From no damping at all to any: nothing is told.
    if (!std::isfinite(ratio->second.interval.high) && !(ratio->second.interval.low > 0.0)) return;
    const auto slow = quantities.find(Quantity::slow_decay_rate);
    const double rate = slow != quantities.end() && std::isfinite(slow->second.interval.high)
                            ? slow->second.interval.high
                            : std::numbers::pi * frequency->second.value / ratio->second.value;
    if (!std::isfinite(ratio->second.interval.high)) ratio->second.interval.high = largest_damping_ratio;
    if (!std::isfinite(frequency->second.interval.high))
        frequency->second.interval.high = rate * largest_damping_ratio / std::numbers::pi;
}

// An interval that reaches far to one side belongs to an error that does: the standard uncertainty is not
// smaller than the wider side over the factor that makes the interval.
void follow_wider_side(Estimate& estimate, double confidence_level) {
    const double wider =
        std::max(estimate.interval.high - estimate.value, estimate.value - estimate.interval.low);
    estimate.standard_uncertainty =
        std::max(estimate.standard_uncertainty,
                 wider / student_t_factor(confidence_level, estimate.degrees_of_freedom));
}

bool exists(const Derived& derived, const Oscillator& o) {
    if (derived.quantity == Quantity::slow_decay_rate) return o.damping_ratio() > critical;
    if (derived.quantity == Quantity::damped_frequency) return std::abs(o.damping_ratio()) < 1.0;
    return true;
}

Estimate through(const Estimate& of, double (*function)(double), double slope) {
    Estimate estimate = of;
    estimate.value = function(of.value);
    estimate.standard_uncertainty = std::abs(slope) * of.standard_uncertainty;
    const double a = function(of.interval.low), b = function(of.interval.high);
    estimate.interval = {std::min(a, b), std::max(a, b)};
    return estimate;
}

double decrement_of(double zeta) {
    return zeta < 1.0 ? two_pi * zeta / std::sqrt(1.0 - zeta * zeta) : 1e300;
}
double loss_factor_of(double zeta) {
    return 2.0 * zeta;
}
double quality_factor_of(double zeta) {
    return 0.5 / zeta;
}

// Far beyond critical damping the fast pole has no end: then frequency and damping ratio are not told, one
// not without the other.
void drop_undetermined(Quantities& quantities) {
    if (quantities.contains(Quantity::damping_ratio) && quantities.contains(Quantity::natural_frequency))
        return;
    for (const Quantity q : {Quantity::damping_ratio, Quantity::natural_frequency, Quantity::decay_rate,
                             Quantity::damped_frequency})
        quantities.erase(q);
    constexpr double widest_ratio = 30.0;
    const auto slow = quantities.find(Quantity::slow_decay_rate);
    if (slow != quantities.end() && slow->second.interval.high > widest_ratio * slow->second.interval.low)
        quantities.erase(slow);
}

}  // namespace

double relative_uncertainty_of_size(const CurveFit& fit, std::size_t index) {
    const DecayModel& model = fit.fit.model;
    const Index width = model.has_one_column() ? 1 : 2;
    const Index column = model.first_oscillator_column() + width * static_cast<Index>(index);
    VectorXd decay = linear_columns(model, fit.samples).middleCols(column, width) *
                     fit.fit.coefficients.segment(column, width);
    whiten(fit.noise.noise, fit.samples.stretches, decay);
    return std::sqrt(fit.noise.noise.innovation_variance / decay.squaredNorm());
}

void add_functions_of_damping(Quantities& quantities) {
    const auto found = quantities.find(Quantity::damping_ratio);
    if (found == quantities.end()) return;
    const Estimate zeta = found->second;
    quantities[Quantity::loss_factor] = through(zeta, loss_factor_of, 2.0);
    if (zeta.interval.high < 1.0 && zeta.value > -1.0)
        quantities[Quantity::logarithmic_decrement] =
            through(zeta, decrement_of, two_pi / std::pow(1.0 - zeta.value * zeta.value, 1.5));
    if (zeta.interval.low > 0.0)
        quantities[Quantity::quality_factor] =
            through(zeta, quality_factor_of, 0.5 / (zeta.value * zeta.value));
}

Quantities decay_quantities(const CurveFit& fit, std::size_t index, double confidence_level) {
    const Oscillator& at = fit.fit.model.oscillators[index];
    const Matrix2d covariance = joint_covariance(fit, index);
    const double factor_of_higher_order = higher_order_factor(fit, index);
    Quantities quantities;
    std::optional<Region> region;
    for (const Derived& derived : basic) {
        if (!exists(derived, at)) continue;
        const Vector2d gradient = gradient_of(derived, at);
        Spread spread = spread_of_oscillator(fit, index, gradient);
        spread.scale *= factor_of_higher_order;
        if (!std::isfinite(spread.scale) || spread.scale <= 0.0) continue;
        Estimate estimate = straight_estimate(derived, at, spread, confidence_level);
        const double plain = std::sqrt(gradient.dot(covariance * gradient));
        if (!region) {
            const double factor =
                student_t_factor(confidence_level, spread.degrees_of_freedom) * spread.scale / plain;
            region = trace_region(fit, index, factor);
        }
        if (region->curved) bend_interval(estimate, derived, fit, index, *region, plain, confidence_level);
        quantities[derived.quantity] = estimate;
    }
    close_open_ends(quantities);
    std::erase_if(quantities, [](const auto& entry) {
        return !std::isfinite(entry.second.interval.low) || !std::isfinite(entry.second.interval.high);
    });
    if (region && region->curved)
        for (auto& [quantity, estimate] : quantities) follow_wider_side(estimate, confidence_level);
    drop_undetermined(quantities);
    add_functions_of_damping(quantities);
    return quantities;
}

Quantities quantities_from(const Estimate& natural_frequency_estimate, const Estimate& damping_ratio_estimate,
                           double correlation, double confidence_level) {
    Quantities quantities;
    quantities[Quantity::natural_frequency] = natural_frequency_estimate;
    quantities[Quantity::damping_ratio] = damping_ratio_estimate;
    const Oscillator at =
        Oscillator::from(damping_ratio_estimate.value, two_pi * natural_frequency_estimate.value);
    const Vector2d unit(1.0 / std::cosh(at.asinh_damping), 1.0 / natural_frequency_estimate.value);
    const Vector2d deviation(damping_ratio_estimate.standard_uncertainty * unit(0),
                             natural_frequency_estimate.standard_uncertainty * unit(1));
    Matrix2d covariance;
    covariance << deviation(0) * deviation(0), correlation * deviation(0) * deviation(1),
        correlation * deviation(0) * deviation(1), deviation(1) * deviation(1);
    for (const Derived& derived : basic) {
        if (quantities.contains(derived.quantity) || !exists(derived, at)) continue;
        const Vector2d gradient = gradient_of(derived, at);
        const Spread spread{std::sqrt(gradient.dot(covariance * gradient)),
                            std::min(natural_frequency_estimate.degrees_of_freedom,
                                     damping_ratio_estimate.degrees_of_freedom)};
        quantities[derived.quantity] = straight_estimate(derived, at, spread, confidence_level);
    }
    add_functions_of_damping(quantities);
    return quantities;
}

}  // namespace ringwright::identify
