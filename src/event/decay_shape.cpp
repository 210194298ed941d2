#include "event/decay_shape.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

namespace ringwright::event_search {
namespace {

/// Largest exponent of a term; beyond it the model is meaningless and must only stay finite.
constexpr double largest_exponent = 300.0;

double bounded_exp(double x) {
    return std::exp(std::clamp(x, -largest_exponent, largest_exponent));
}

/// The 3×3 normal equations of [1, C, S]·x = y, scaled by column and solved by Cholesky with a small ridge:
/// C and S become alike far beyond critical damping.
struct NormalEquations {
    std::array<std::array<double, 3>, 3> matrix{};
    std::array<double, 3> right{};
    double square_sum = 0.0;
};

std::array<double, 3> solve(NormalEquations equations) {
    constexpr double ridge = 1e-11;
    std::array<double, 3> scale{};
    for (std::size_t i = 0; i < 3; ++i) {
        const double diagonal = equations.matrix[i][i];
        scale[i] = diagonal > 0.0 ? 1.0 / std::sqrt(diagonal) : 0.0;
    }
    auto& m = equations.matrix;
    auto& r = equations.right;
    for (std::size_t i = 0; i < 3; ++i) {
        for (std::size_t j = 0; j < 3; ++j) m[i][j] *= scale[i] * scale[j];
        m[i][i] = 1.0 + ridge;
        r[i] *= scale[i];
    }
    for (std::size_t i = 0; i < 3; ++i) {
        for (std::size_t j = i + 1; j < 3; ++j) {
            const double factor = m[j][i] / m[i][i];
            for (std::size_t k = i; k < 3; ++k) m[j][k] -= factor * m[i][k];
            r[j] -= factor * r[i];
        }
    }
    std::array<double, 3> x{};
    for (std::size_t i = 3; i-- > 0;) {
        double sum = r[i];
        for (std::size_t j = i + 1; j < 3; ++j) sum -= m[i][j] * x[j];
        x[i] = sum / m[i][i];
    }
    for (std::size_t i = 0; i < 3; ++i) x[i] *= scale[i];
    return x;
}

/// Both terms at t = 0, 1, 2 … : the free decay obeys z(t+1) = 2 e^(−s) C₁ z(t) − e^(−2s) z(t−1).
class TermSequence {
  public:
    explicit TermSequence(const DecayShape& shape) {
        const DecayTerms first = decay_terms(shape, 1.0);
        next_ = first;
        trace_ = 2.0 * first.cosine_like;
        determinant_ = bounded_exp(-2.0 * shape.decay_rate());
    }
    [[nodiscard]] const DecayTerms& current() const { return current_; }
    void advance() {
        const DecayTerms after{trace_ * next_.cosine_like - determinant_ * current_.cosine_like,
                               trace_ * next_.sine_like - determinant_ * current_.sine_like};
        current_ = next_;
        next_ = after;
    }

  private:
    DecayTerms current_{1.0, 0.0};
    DecayTerms next_;
    double trace_ = 0.0;
    double determinant_ = 0.0;
};

double mean_of(std::span<const double> points) {
    double sum = 0.0;
    for (const double y : points) sum += y;
    return sum / static_cast<double>(points.size());
}

std::vector<DecayShape> starting_shapes(std::size_t points) {
    const double per_cycle = 2.0 * std::numbers::pi / static_cast<double>(points);
    const double highest = static_cast<double>(points) / 2.3;
    std::vector<DecayShape> shapes;
    for (double cycles = 0.5; cycles <= highest; cycles += 0.4)
        shapes.push_back({cycles * per_cycle, 0.2 / (1.0 + 2.0 * cycles)});
    for (const double damping : {0.2, 0.6, 1.1, 3.0}) {
        for (double cycles = 0.3; cycles <= std::max(1.0, highest); cycles *= 1.4)
            shapes.push_back({cycles * per_cycle, damping});
    }
    return shapes;
}

/// Levenberg–Marquardt on (ln ω_n, ln ζ) with the amplitudes eliminated at every step.
DecayFit refine(std::span<const double> points, DecayFit best) {
    constexpr int largest_iterations = 40;
    double damping = 1e-3;
    const std::size_t n = points.size();
    std::vector<double> residual(n), along_frequency(n), along_damping(n);
    const auto residuals_of = [&](const DecayFit& fit, std::vector<double>& into) {
        TermSequence terms(fit.shape);
        for (std::size_t k = 0; k < n; ++k, terms.advance())
            into[k] = points[k] - fit.offset - fit.cosine_part * terms.current().cosine_like -
                      fit.sine_part * terms.current().sine_like;
    };
    for (int iteration = 0; iteration < largest_iterations; ++iteration) {
        constexpr double step = 1e-5;
        const DecayShape at = best.shape;
        residuals_of(best, residual);
        residuals_of(fit_amplitudes(points, {at.undamped_angular_frequency * (1.0 + step), at.damping_ratio}),
                     along_frequency);
        residuals_of(fit_amplitudes(points, {at.undamped_angular_frequency, at.damping_ratio * (1.0 + step)}),
                     along_damping);
        double ff = 0.0, fd = 0.0, dd = 0.0, fr = 0.0, dr = 0.0;
        for (std::size_t k = 0; k < n; ++k) {
            const double f = (along_frequency[k] - residual[k]) / step;
            const double d = (along_damping[k] - residual[k]) / step;
            ff += f * f, fd += f * d, dd += d * d, fr += f * residual[k], dr += d * residual[k];
        }
        bool improved = false;
        double gain = 0.0;
        for (int attempt = 0; attempt < 8 && !improved; ++attempt) {
            const double a = ff * (1.0 + damping), b = fd, c = dd * (1.0 + damping);
            const double determinant = a * c - b * b;
            if (!(determinant > 0.0)) break;
            const double move_f = std::clamp(-(c * fr - b * dr) / determinant, -0.5, 0.5);
            const double move_d = std::clamp(-(a * dr - b * fr) / determinant, -1.0, 1.0);
            const DecayShape tried{std::clamp(at.undamped_angular_frequency * std::exp(move_f), 1e-7, 3.1),
                                   std::clamp(at.damping_ratio * std::exp(move_d), 1e-7, 50.0)};
            const DecayFit fit = fit_amplitudes(points, tried);
            if (fit.residual_sum < best.residual_sum) {
                gain = (best.residual_sum - fit.residual_sum) / best.residual_sum;
                best = fit;
                damping = std::max(damping * 0.2, 1e-9);
                improved = true;
            } else {
                damping = std::min(damping * 6.0, 1e9);
            }
        }
        if (!improved || gain < 1e-6) break;
    }
    return best;
}

}  // namespace

double DecayShape::slow_rate() const {
    if (damping_ratio <= 1.0) return decay_rate();
    return undamped_angular_frequency / (damping_ratio + std::sqrt(damping_ratio * damping_ratio - 1.0));
}

double DecayShape::damped_angular_frequency() const {
    if (damping_ratio >= 1.0) return 0.0;
    return undamped_angular_frequency * std::sqrt(1.0 - damping_ratio * damping_ratio);
}

DecayShape at_level(const DecayShape& shape, std::size_t from, std::size_t to) {
    return {std::ldexp(shape.undamped_angular_frequency, static_cast<int>(to) - static_cast<int>(from)),
            shape.damping_ratio};
}

DecayTerms decay_terms(const DecayShape& shape, double t) {
    const double s = shape.decay_rate();
    const double p = shape.undamped_angular_frequency * shape.undamped_angular_frequency *
                     (1.0 - shape.damping_ratio * shape.damping_ratio);
    const double root = std::sqrt(std::abs(p));
    if (root * std::abs(t) < 1e-6) return {bounded_exp(-s * t), t * bounded_exp(-s * t)};
    if (p > 0.0) {
        const double decay = bounded_exp(-s * t);
        return {decay * std::cos(root * t), decay * std::sin(root * t) / root};
    }
    const double slow = bounded_exp(-shape.slow_rate() * t);
    const double fast = bounded_exp(-(s + root) * t);
    return {0.5 * (slow + fast), 0.5 * (slow - fast) / root};
}

double DecayFit::value_at(double t) const {
    const DecayTerms terms = decay_terms(shape, t);
    return offset + cosine_part * terms.cosine_like + sine_part * terms.sine_like;
}

double DecayFit::envelope_at(double t) const {
    if (shape.damping_ratio < 0.5) {
        const double decay = bounded_exp(-shape.decay_rate() * t);
        return decay * std::hypot(cosine_part, sine_part / shape.damped_angular_frequency());
    }
    constexpr int looks = 24;
    const double span = 3.0 / shape.undamped_angular_frequency;
    double largest = 0.0;
    for (int i = 0; i <= looks; ++i)
        largest = std::max(largest, std::abs(value_at(t + span * i / looks) - offset));
    return largest;
}

double DecayFit::residual_rms() const {
    const double freedom = std::max(1.0, static_cast<double>(points) - 5.0);
    return std::sqrt(residual_sum / freedom);
}

double DecayFit::explained_ratio() const {
    return residual_sum > 0.0 ? (total_sum - residual_sum) / residual_sum : 1e30;
}

DecayFit fit_amplitudes(std::span<const double> points, const DecayShape& shape) {
    const double mean = mean_of(points);
    NormalEquations equations;
    TermSequence terms(shape);
    double c1 = 0.0, s1 = 0.0, cc = 0.0, cs = 0.0, ss = 0.0, yc = 0.0, ys = 0.0, yy = 0.0;
    for (const double point : points) {
        const double y = point - mean, c = terms.current().cosine_like, s = terms.current().sine_like;
        c1 += c, s1 += s, cc += c * c, cs += c * s, ss += s * s, yc += y * c, ys += y * s, yy += y * y;
        terms.advance();
    }
    const auto count = static_cast<double>(points.size());
    equations.matrix = {{{count, c1, s1}, {c1, cc, cs}, {s1, cs, ss}}};
    equations.right = {0.0, yc, ys};
    const std::array<double, 3> x = solve(equations);
    DecayFit fit;
    fit.shape = shape;
    fit.points = points.size();
    fit.offset = mean + x[0];
    fit.cosine_part = x[1];
    fit.sine_part = x[2];
    fit.total_sum = yy;
    TermSequence again(shape);
    for (const double point : points) {
        const double r =
            point - fit.offset - x[1] * again.current().cosine_like - x[2] * again.current().sine_like;
        fit.residual_sum += r * r;
        again.advance();
    }
    if (!std::isfinite(fit.residual_sum)) fit.residual_sum = yy, fit.cosine_part = fit.sine_part = 0.0;
    return fit;
}

double roughly_explained(std::span<const double> points) {
    const double per_cycle = 2.0 * std::numbers::pi / static_cast<double>(points.size());
    const double highest = static_cast<double>(points.size()) / 2.3;
    double best = 0.0;
    for (double cycles = 0.5; cycles <= highest; cycles += 0.6)
        best = std::max(
            best,
            fit_amplitudes(points, {cycles * per_cycle, 0.25 / (1.0 + 2.0 * cycles)}).explained_ratio());
    for (double cycles = 0.4; cycles <= highest; cycles *= 2.0)
        best = std::max(best, fit_amplitudes(points, {cycles * per_cycle, 0.5}).explained_ratio());
    return best;
}

std::optional<DecayFit> fit_decay(std::span<const double> points, const std::optional<DecayShape>& start) {
    if (points.size() < 8) return {};
    if (start) {
        const DecayFit first = fit_amplitudes(points, *start);
        if (!(first.total_sum > 0.0)) return {};
        return refine(points, first);
    }
    std::vector<DecayFit> fits;
    for (const DecayShape& shape : starting_shapes(points.size()))
        fits.push_back(fit_amplitudes(points, shape));
    const auto better = [](const DecayFit& a, const DecayFit& b) { return a.residual_sum < b.residual_sum; };
    const std::size_t kept = std::min<std::size_t>(3, fits.size());
    std::partial_sort(fits.begin(), fits.begin() + static_cast<std::ptrdiff_t>(kept), fits.end(), better);
    if (!(fits.front().total_sum > 0.0)) return {};
    DecayFit best = refine(points, fits.front());
    for (std::size_t i = 1; i < kept; ++i) {
        const DecayFit other = refine(points, fits[i]);
        if (better(other, best)) best = other;
    }
    return best;
}

}  // namespace ringwright::event_search
