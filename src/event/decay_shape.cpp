#include "event/decay_shape.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>
#include <vector>

#include "event/term_table.hpp"
#include "event/work.hpp"

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

/// Points that are fitted with many shapes: their mean is taken out once, and the terms of a shape are made
/// once for the amplitudes and for what these leave.
class Projection {
  public:
    explicit Projection(std::span<const double> points)
        : mean_(mean_of(points)), centred_(points.size()), terms_(points.size()), left_(points.size()) {
        for (std::size_t k = 0; k < points.size(); ++k) {
            centred_[k] = points[k] - mean_;
            total_ += centred_[k] * centred_[k];
        }
    }

    [[nodiscard]] DecayFit fit(const DecayShape& shape) {
        terms_.set(shape, 0.0);
        const std::array<double, 3> x = solve(normal_equations());
        DecayFit fit;
        fit.shape = shape;
        fit.points = centred_.size();
        fit.offset = mean_ + x[0];
        fit.cosine_part = x[1];
        fit.sine_part = x[2];
        fit.total_sum = total_;
        fit.residual_sum = leave(x);
        if (!std::isfinite(fit.residual_sum)) {
            fit.residual_sum = total_, fit.cosine_part = fit.sine_part = 0.0;
            for (std::size_t k = 0; k < left_.size(); ++k) left_[k] = centred_[k] + mean_ - fit.offset;
        }
        return fit;
    }

    /// What the shape with its best amplitudes leaves of the sum of squares, from the normal equations:
    /// enough to compare shapes by.
    [[nodiscard]] double rough_residual_sum(const DecayShape& shape) {
        terms_.set(shape, 0.0);
        const NormalEquations equations = normal_equations();
        const std::array<double, 3> x = solve(equations);
        const double sum = total_ - x[1] * equations.right[1] - x[2] * equations.right[2];
        return std::isfinite(sum) ? std::clamp(sum, 0.0, total_) : total_;
    }

    [[nodiscard]] double total_sum() const { return total_; }

    /// What the last fit left of each point.
    [[nodiscard]] const std::vector<double>& left() const { return left_; }

  private:
    double mean_ = 0.0, total_ = 0.0;
    std::vector<double> centred_;
    TermTable terms_;
    std::vector<double> left_;

    /// Sums of every second point apart: they do not wait for each other.
    [[nodiscard]] NormalEquations normal_equations() const {
        constexpr std::size_t ways = 2;
        using Sum = std::array<double, ways>;
        Sum c1{}, s1{}, cc{}, cs{}, ss{}, yc{}, ys{};
        const std::size_t n = centred_.size(), whole = n - n % ways;
        const double *c = terms_.cosine_like().data(), *s = terms_.sine_like().data(), *y = centred_.data();
        const auto add = [&](std::size_t k, std::size_t i) {
            c1[i] += c[k], s1[i] += s[k], cc[i] += c[k] * c[k], cs[i] += c[k] * s[k], ss[i] += s[k] * s[k];
            yc[i] += y[k] * c[k], ys[i] += y[k] * s[k];
        };
        for (std::size_t k = 0; k < whole; k += ways)
            for (std::size_t i = 0; i < ways; ++i) add(k + i, i);
        if (whole < n) add(whole, 0);
        const auto of = [](const Sum& sum) { return sum[0] + sum[1]; };
        NormalEquations equations;
        equations.matrix = {
            {{static_cast<double>(n), of(c1), of(s1)}, {of(c1), of(cc), of(cs)}, {of(s1), of(cs), of(ss)}}};
        equations.right = {0.0, of(yc), of(ys)};
        return equations;
    }

    /// Fills left_ and gives its sum of squares.
    double leave(const std::array<double, 3>& x) {
        const double *c = terms_.cosine_like().data(), *s = terms_.sine_like().data(), *y = centred_.data();
        double* left = left_.data();
        for (std::size_t k = 0; k < left_.size(); ++k) left[k] = y[k] - x[0] - x[1] * c[k] - x[2] * s[k];
        double sum = 0.0, other = 0.0;
        std::size_t k = 0;
        for (; k + 1 < left_.size(); k += 2) sum += left[k] * left[k], other += left[k + 1] * left[k + 1];
        if (k < left_.size()) sum += left[k] * left[k];
        return sum + other;
    }
};

/// The slopes of what is left along ln ω_n and ln ζ, as their products with each other and with it.
struct Slopes {
    double ff = 0.0, fd = 0.0, dd = 0.0, fr = 0.0, dr = 0.0;
};

Slopes slopes_at(Projection& projection, const DecayShape& at, const std::vector<double>& left) {
    constexpr double step = 1e-5;
    (void)projection.fit({at.undamped_angular_frequency * (1.0 + step), at.damping_ratio});
    const std::vector<double> along_frequency = projection.left();
    (void)projection.fit({at.undamped_angular_frequency, at.damping_ratio * (1.0 + step)});
    const std::vector<double>& along_damping = projection.left();
    Slopes slopes;
    for (std::size_t k = 0; k < left.size(); ++k) {
        const double f = (along_frequency[k] - left[k]) / step, d = (along_damping[k] - left[k]) / step;
        slopes.ff += f * f, slopes.fd += f * d, slopes.dd += d * d;
        slopes.fr += f * left[k], slopes.dr += d * left[k];
    }
    return slopes;
}

/// One step of Levenberg and Marquardt; nothing where the slopes do not tell where to.
std::optional<DecayShape> moved(const DecayShape& at, const Slopes& slopes, double damping) {
    const double a = slopes.ff * (1.0 + damping), b = slopes.fd, c = slopes.dd * (1.0 + damping);
    const double determinant = a * c - b * b;
    if (!(determinant > 0.0)) return {};
    const double move_f = std::clamp(-(c * slopes.fr - b * slopes.dr) / determinant, -0.5, 0.5);
    const double move_d = std::clamp(-(a * slopes.dr - b * slopes.fr) / determinant, -1.0, 1.0);
    return DecayShape{std::clamp(at.undamped_angular_frequency * std::exp(move_f), 1e-7, 3.1),
                      std::clamp(at.damping_ratio * std::exp(move_d), 1e-7, 50.0)};
}

/// Whether a fit on its way has all but come to one that was found before: it will end there as well.
bool arrives_at(const DecayFit& found, const DecayFit& fit) {
    constexpr double near = 0.01, near_in_damping = 0.1, as_good = 1.01;
    const double frequencies = fit.shape.undamped_angular_frequency / found.shape.undamped_angular_frequency;
    const double dampings = fit.shape.damping_ratio / found.shape.damping_ratio;
    return std::abs(std::log(frequencies)) < near && std::abs(std::log(dampings)) < near_in_damping &&
           fit.residual_sum < as_good * found.residual_sum;
}

/// Levenberg–Marquardt on (ln ω_n, ln ζ) with the amplitudes eliminated at every step; ends early where it
/// comes to what was found from another start.
DecayFit refine(Projection& projection, const DecayShape& start, const DecayFit* found = nullptr) {
    ++refined_shapes;
    constexpr int largest_iterations = 40, attempts = 8;
    DecayFit best = projection.fit(start);
    std::vector<double> left = projection.left();
    double damping = 1e-3;
    for (int iteration = 0; iteration < largest_iterations; ++iteration) {
        const Slopes slopes = slopes_at(projection, best.shape, left);
        double gain = 0.0;
        for (int attempt = 0; attempt < attempts && gain == 0.0; ++attempt) {
            const std::optional<DecayShape> tried = moved(best.shape, slopes, damping);
            if (!tried) break;
            const DecayFit fit = projection.fit(*tried);
            if (fit.residual_sum < best.residual_sum) {
                gain = (best.residual_sum - fit.residual_sum) / best.residual_sum;
                best = fit, left = projection.left();
                damping = std::max(damping * 0.2, 1e-9);
            } else {
                damping = std::min(damping * 6.0, 1e9);
            }
        }
        if (gain < 1e-6 || (found && arrives_at(*found, best))) break;
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

/// d/dt of e^(−st)[A·C + B·S], p = ω² − s²: e^(−st)[(B − sA)·C − (pA + sB)·S].
DecayAmplitudes rate_of(const DecayShape& shape, const DecayAmplitudes& amplitudes) {
    const double s = shape.decay_rate(), omega = shape.undamped_angular_frequency, p = omega * omega - s * s;
    return {amplitudes.sine_part - s * amplitudes.cosine_part,
            -p * amplitudes.cosine_part - s * amplitudes.sine_part};
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
    return Projection(points).fit(shape);
}

double roughly_explained(std::span<const double> points) {
    const double per_cycle = 2.0 * std::numbers::pi / static_cast<double>(points.size());
    const double highest = static_cast<double>(points.size()) / 2.3;
    Projection projection(points);
    double least = projection.total_sum();
    for (double cycles = 0.5; cycles <= highest; cycles += 0.6)
        least =
            std::min(least, projection.rough_residual_sum({cycles * per_cycle, 0.25 / (1.0 + 2.0 * cycles)}));
    for (double cycles = 0.4; cycles <= highest; cycles *= 2.0)
        least = std::min(least, projection.rough_residual_sum({cycles * per_cycle, 0.5}));
    return least > 0.0 ? (projection.total_sum() - least) / least : 1e30;
}

std::optional<DecayFit> fit_decay(std::span<const double> points, const std::optional<DecayShape>& start) {
    if (points.size() < 8) return {};
    Projection projection(points);
    if (start) {
        if (!(projection.fit(*start).total_sum > 0.0)) return {};
        return refine(projection, *start);
    }
    if (!(projection.total_sum() > 0.0)) return {};
    struct Start {
        double residual_sum = 0.0;
        DecayShape shape;
    };
    std::vector<Start> starts;
    for (const DecayShape& shape : starting_shapes(points.size()))
        starts.push_back({projection.rough_residual_sum(shape), shape});
    const std::size_t kept = std::min<std::size_t>(3, starts.size());
    std::ranges::partial_sort(starts, starts.begin() + static_cast<std::ptrdiff_t>(kept), {},
                              &Start::residual_sum);
    DecayFit best = refine(projection, starts.front().shape);
    for (std::size_t i = 1; i < kept; ++i) {
        const DecayFit other = refine(projection, starts[i].shape, &best);
        if (other.residual_sum < best.residual_sum) best = other;
    }
    return best;
}

}  // namespace ringwright::event_search
