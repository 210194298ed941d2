#pragma once
// Least squares of a motion that a few numbers determine, to points at t = 0, 1, 2 …

#include <Eigen/Core>
#include <algorithm>
#include <cmath>
#include <cstddef>
#include <optional>
#include <span>
#include <unsupported/Eigen/LevenbergMarquardt>
#include <utility>
#include <vector>

namespace ringwright::event_search {

/// A motion and what it leaves of the points.
template <typename Motion>
struct MotionFit {
    Motion motion;
    Eigen::VectorXd residuals;
    double residual_sum = 0.0;  ///< of squares
    std::size_t numbers = 0;    ///< fitted
    [[nodiscard]] double residual_rms() const {
        return std::sqrt(residual_sum /
                         std::max(1.0, static_cast<double>(residuals.size()) - static_cast<double>(numbers)));
    }
};

/// Sum of squares of what each residual is besides `correlation` times the one before it.
inline double whitened_sum(const Eigen::VectorXd& residuals, double correlation) {
    const Eigen::Index n = residuals.size() - 1;
    return (residuals.tail(n) - correlation * residuals.head(n)).squaredNorm();
}

/// Correlation of neighbouring residuals.
inline double correlation_of(const Eigen::VectorXd& residuals) {
    const Eigen::Index n = residuals.size() - 1;
    return residuals.head(n).dot(residuals.tail(n)) / std::max(residuals.squaredNorm(), 1e-300);
}

/// Sum of squares of what it leaves of each third point: enough to tell good starts from bad ones.
template <typename Motion>
double sum_left_by(const Motion& motion, std::span<const double> points) {
    constexpr std::size_t stride = 3;
    double sum = 0.0;
    for (std::size_t k = 0; k < points.size(); k += stride) {
        const double r = points[k] - motion.value_at(static_cast<double>(k));
        sum += r * r;
    }
    return sum;
}

/// What Eigen's search for the least sum of squares asks for; `make` gives the motion of a vector of numbers,
/// `steps` are those of the differences that stand for derivatives.
template <typename Make>
struct MotionResiduals : Eigen::DenseFunctor<double> {
    MotionResiduals(std::span<const double> all, const Make& maker, Eigen::VectorXd differences)
        : DenseFunctor(static_cast<int>(differences.size()), static_cast<int>(all.size())),
          points(all),
          make(maker),
          steps(std::move(differences)) {}

    int operator()(const Eigen::VectorXd& at, Eigen::VectorXd& residuals) const {
        const auto motion = make(at);
        for (Eigen::Index k = 0; k < residuals.size(); ++k)
            residuals(k) = points[static_cast<std::size_t>(k)] - motion.value_at(static_cast<double>(k));
        return 0;
    }

    int df(const Eigen::VectorXd& at, Eigen::MatrixXd& jacobian) const {
        Eigen::VectorXd above(values()), below(values());
        for (Eigen::Index j = 0; j < steps.size(); ++j) {
            Eigen::VectorXd moved = at;
            moved(j) = at(j) + steps(j);
            (*this)(moved, above);
            moved(j) = at(j) - steps(j);
            (*this)(moved, below);
            jacobian.col(j) = (above - below) / (2.0 * steps(j));
        }
        return 0;
    }

    std::span<const double> points;
    const Make& make;
    Eigen::VectorXd steps;
};

/// From `start` downhill. `make` takes any finite numbers.
template <typename Make>
auto fit_motion(std::span<const double> points, const Make& make, const Eigen::VectorXd& start,
                const Eigen::VectorXd& steps) {
    constexpr int most_evaluations = 60;
    constexpr double tolerance = 1e-6;
    MotionResiduals<Make> residuals(points, make, steps);
    Eigen::LevenbergMarquardt<MotionResiduals<Make>> search(residuals);
    search.setMaxfev(most_evaluations);
    search.setXtol(tolerance);
    search.setFtol(tolerance);
    Eigen::VectorXd at = start;
    search.minimize(at);
    MotionFit<decltype(make(at))> fit{make(at), Eigen::VectorXd(residuals.values()), 0.0,
                                      static_cast<std::size_t>(at.size())};
    residuals(at, fit.residuals);
    fit.residual_sum = fit.residuals.squaredNorm();
    return fit;
}

/// Numbers of a motion that a fit may start from, and the sum of squares that they leave.
template <typename Numbers>
struct MotionTrial {
    Numbers numbers;
    double sum = 0.0;
};

/// The best of the fits that `refine` makes of the `kept` trials that leave least; nothing without a trial.
template <typename Numbers, typename Refine>
auto best_refined(std::vector<MotionTrial<Numbers>> trials, std::size_t kept, const Refine& refine) {
    const auto count = static_cast<std::ptrdiff_t>(std::min(kept, trials.size()));
    std::partial_sort(
        trials.begin(), trials.begin() + count, trials.end(),
        [](const MotionTrial<Numbers>& a, const MotionTrial<Numbers>& b) { return a.sum < b.sum; });
    std::optional<decltype(refine(trials.front().numbers))> best;
    for (auto trial = trials.begin(); trial != trials.begin() + count; ++trial) {
        auto fit = refine(trial->numbers);
        if (std::isfinite(fit.residual_sum) && (!best || fit.residual_sum < best->residual_sum))
            best = std::move(fit);
    }
    return best;
}

}  // namespace ringwright::event_search
