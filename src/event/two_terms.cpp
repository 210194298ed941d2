#include "event/two_terms.hpp"

#include <Eigen/Cholesky>
#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <vector>

#include "event/term_table.hpp"
#include "event/work.hpp"

namespace ringwright::event_search {
namespace {

constexpr std::size_t fewest_points = 14, linear_count = 5, shape_count = 4;
using Linear = Eigen::Matrix<double, linear_count, 1>;
using Shapes = Eigen::Matrix<double, shape_count, 1>;  ///< ln ω, ln ζ of both

/// Offset and both terms of both shapes at t = 0, 1, 2 …, on the points that they are fitted to.
struct Columns {
    explicit Columns(const Eigen::VectorXd& points)
        : values(points),
          all(points.size(), static_cast<Eigen::Index>(linear_count)),
          terms(static_cast<std::size_t>(points.size())) {
        all.col(0).setOnes();
    }
    void put(Eigen::Index at, const DecayShape& shape) {
        terms.set(shape, 0.0);
        const auto n = all.rows();
        all.col(at) = Eigen::Map<const Eigen::VectorXd>(terms.cosine_like().data(), n);
        all.col(at + 1) = Eigen::Map<const Eigen::VectorXd>(terms.sine_like().data(), n);
    }

    const Eigen::VectorXd& values;
    Eigen::Matrix<double, Eigen::Dynamic, linear_count> all;
    TermTable terms;
};

struct Projection {
    Linear coefficients;
    Eigen::VectorXd residual;
    double sum = 0.0;
};

DecayShape shape_at(const Shapes& shapes, Eigen::Index which) {
    return {std::exp(shapes(2 * which)), std::exp(shapes(2 * which + 1))};
}

/// The columns have to hold the terms of the shapes.
Projection project(const Columns& columns) {
    constexpr double ridge = 1e-11;  // alike columns far beyond critical damping
    Eigen::Matrix<double, linear_count, linear_count> normal;
    Linear right;
    for (Eigen::Index j = 0; j < normal.cols(); ++j) {
        for (Eigen::Index i = 0; i <= j; ++i)
            normal(i, j) = normal(j, i) = columns.all.col(i).dot(columns.all.col(j));
        right(j) = columns.all.col(j).dot(columns.values);
    }
    const Linear scale = normal.diagonal().cwiseSqrt().cwiseMax(1e-300).cwiseInverse();
    normal = scale.asDiagonal() * normal * scale.asDiagonal();
    normal.diagonal().array() += ridge;
    Projection projection;
    projection.coefficients = scale.cwiseProduct(normal.ldlt().solve(scale.cwiseProduct(right)));
    projection.residual = columns.values;
    for (Eigen::Index j = 0; j < normal.cols(); ++j)
        projection.residual -= projection.coefficients(j) * columns.all.col(j);
    projection.sum = projection.residual.squaredNorm();
    if (!std::isfinite(projection.sum)) projection.sum = 1e300;
    return projection;
}

Projection project(Columns& columns, const Shapes& shapes) {
    for (const Eigen::Index which : {0, 1}) columns.put(1 + 2 * which, shape_at(shapes, which));
    return project(columns);
}

Shapes bounded(Shapes shapes) {
    for (const Eigen::Index i : {0, 2}) shapes(i) = std::clamp(shapes(i), std::log(1e-6), std::log(3.1));
    for (const Eigen::Index i : {1, 3}) shapes(i) = std::clamp(shapes(i), std::log(1e-6), std::log(30.0));
    return shapes;
}

TwoTermFit to_fit(const Shapes& shapes, const Projection& projection, double mean) {
    const Linear& c = projection.coefficients;
    return {shape_at(shapes, 0),
            shape_at(shapes, 1),
            mean + c(0),
            c(1),
            c(2),
            c(3),
            c(4),
            projection.sum,
            static_cast<std::size_t>(projection.residual.size())};
}

/// Levenberg and Marquardt on the four shape numbers with the amplitudes eliminated at every step.
TwoTermFit refine(const Eigen::VectorXd& values, Shapes shapes, double mean) {
    ++refined_shapes;
    constexpr int most_steps = 30;
    constexpr double step = 1e-5, settled = 1e-4;
    Columns columns(values);
    Projection best = project(columns, shapes);
    double damping = 1e-2;
    for (int i = 0; i < most_steps && damping < 1e7; ++i) {
        Eigen::Matrix<double, Eigen::Dynamic, shape_count> jacobian(values.size(),
                                                                    static_cast<Eigen::Index>(shape_count));
        for (const Eigen::Index which : {0, 1}) {
            columns.put(3 - 2 * which, shape_at(shapes, 1 - which));
            for (const Eigen::Index j : {2 * which, 2 * which + 1}) {
                Shapes moved = shapes;
                moved(j) += step;
                columns.put(1 + 2 * which, shape_at(moved, which));
                jacobian.col(j) = (project(columns).residual - best.residual) / step;
            }
        }
        const Eigen::Matrix4d normal = jacobian.transpose().lazyProduct(jacobian);
        const Shapes right = -jacobian.transpose() * best.residual;
        bool improved = false;
        double gain = 0.0;
        for (int attempt = 0; attempt < 6 && !improved; ++attempt) {
            Eigen::Matrix4d damped = normal;
            damped.diagonal() *= 1.0 + damping;
            damped.diagonal().array() += 1e-12 * normal.trace();
            const Shapes move = damped.ldlt().solve(right).cwiseMax(-0.7).cwiseMin(0.7);
            const Shapes tried = bounded(shapes + move);
            const Projection after = project(columns, tried);
            if (after.sum < best.sum) {
                gain = (best.sum - after.sum) / best.sum;
                best = after, shapes = tried, improved = true;
                damping = std::max(0.2 * damping, 1e-9);
            } else {
                damping *= 6.0;
            }
        }
        if (!improved || gain < settled) break;
    }
    return to_fit(shapes, best, mean);
}

Shapes shapes_of(const DecayShape& first, const DecayShape& second) {
    return {std::log(first.undamped_angular_frequency), std::log(std::max(first.damping_ratio, 1e-6)),
            std::log(second.undamped_angular_frequency), std::log(std::max(second.damping_ratio, 1e-6))};
}

}  // namespace

double TwoTermFit::value_at(double t) const {
    const DecayTerms a = decay_terms(first, t), b = decay_terms(second, t);
    return offset + first_cosine * a.cosine_like + first_sine * a.sine_like + second_cosine * b.cosine_like +
           second_sine * b.sine_like;
}

double TwoTermFit::residual_rms() const {
    return std::sqrt(residual_sum / std::max(1.0, static_cast<double>(points) - 9.0));
}

std::optional<TwoTermFit> fit_two_terms(std::span<const double> points, const DecayShape& first,
                                        const DecayShape& second) {
    if (points.size() < fewest_points) return {};
    Eigen::VectorXd values =
        Eigen::Map<const Eigen::VectorXd>(points.data(), static_cast<Eigen::Index>(points.size()));
    const double mean = values.mean();
    values.array() -= mean;
    if (!(values.squaredNorm() > 0.0)) return {};
    return refine(values, bounded(shapes_of(first, second)), mean);
}

std::optional<TwoTermFit> fit_two_terms(std::span<const double> points, const DecayShape& first) {
    if (points.size() < fewest_points) return {};
    const DecayFit alone = fit_amplitudes(points, first);
    std::vector<double> left(points.size());
    for (std::size_t k = 0; k < points.size(); ++k)
        left[k] = points[k] - alone.value_at(static_cast<double>(k));
    const std::optional<DecayFit> second = fit_decay(left);
    if (!second) return {};
    return fit_two_terms(points, first, second->shape);
}

TwoTermFit fit_two_amplitudes(std::span<const double> points, const DecayShape& first,
                              const DecayShape& second) {
    Eigen::VectorXd values =
        Eigen::Map<const Eigen::VectorXd>(points.data(), static_cast<Eigen::Index>(points.size()));
    const double mean = values.mean();
    values.array() -= mean;
    Columns columns(values);
    const Shapes shapes = shapes_of(first, second);
    return to_fit(shapes, project(columns, shapes), mean);
}

}  // namespace ringwright::event_search
