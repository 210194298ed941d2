#include "ringwright/noise_model.hpp"

#include <Eigen/Cholesky>
#include <algorithm>
#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>
#include <complex>
#include <limits>
#include <numbers>

namespace ringwright {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

// Row m holds the coefficients of the best predictor from m past samples (m = 0 … p).
MatrixXd predictors_of(const VectorXd& partial) {
    const Index order = partial.size();
    MatrixXd predictors = MatrixXd::Zero(order + 1, std::max<Index>(order, 1));
    for (Index m = 1; m <= order; ++m) {
        const double kappa = partial(m - 1);
        for (Index j = 0; j < m - 1; ++j)
            predictors(m, j) = predictors(m - 1, j) - kappa * predictors(m - 1, m - 2 - j);
        predictors(m, m - 1) = kappa;
    }
    return predictors;
}

// Prediction variance from m past samples over the innovation variance (m = 0 … p; the last is 1).
VectorXd relative_variances(const VectorXd& partial) {
    const Index order = partial.size();
    VectorXd variances(order + 1);
    variances(order) = 1.0;
    for (Index m = order; m > 0; --m)
        variances(m - 1) = variances(m) / (1.0 - partial(m - 1) * partial(m - 1));
    return variances;
}

}  // namespace

VectorXd AutoregressiveNoise::coefficients() const {
    return predictors_of(partial_autocorrelation).row(order()).head(order());
}

double AutoregressiveNoise::variance() const {
    return innovation_variance * relative_variances(partial_autocorrelation)(0);
}

double AutoregressiveNoise::spectral_density(double cycles_per_sample) const {
    const VectorXd a = coefficients();
    std::complex<double> transfer = 1.0;
    for (Index j = 0; j < a.size(); ++j)
        transfer -=
            a(j) * std::polar(1.0, -2.0 * std::numbers::pi * cycles_per_sample * static_cast<double>(j + 1));
    return innovation_variance / std::norm(transfer);
}

void whiten(const AutoregressiveNoise& noise, const std::vector<Stretch>& stretches,
            Eigen::Ref<MatrixXd> columns) {
    const Index order = noise.order();
    if (order == 0) return;
    const MatrixXd predictors = predictors_of(noise.partial_autocorrelation);
    const VectorXd variances = relative_variances(noise.partial_autocorrelation);
    for (Index c = 0; c < columns.cols(); ++c) {
        for (const Stretch& stretch : stretches) {
            double* x = &columns(stretch.begin, c);
            for (Index t = stretch.length - 1; t >= order; --t) {
                double innovation = x[t];
                for (Index j = 0; j < order; ++j) innovation -= predictors(order, j) * x[t - 1 - j];
                x[t] = innovation;
            }
            for (Index t = std::min(order, stretch.length) - 1; t >= 0; --t) {
                double innovation = x[t];
                for (Index j = 0; j < t; ++j) innovation -= predictors(t, j) * x[t - 1 - j];
                x[t] = innovation / std::sqrt(variances(t));
            }
        }
    }
}

void colour(const AutoregressiveNoise& noise, const std::vector<Stretch>& stretches, const VectorXd& deviates,
            Eigen::Ref<VectorXd> out) {
    const Index order = noise.order();
    const MatrixXd predictors = predictors_of(noise.partial_autocorrelation);
    const VectorXd variances = relative_variances(noise.partial_autocorrelation);
    const double innovation_sd = std::sqrt(noise.innovation_variance);
    const VectorXd last = predictors.row(order).head(order);
    for (const Stretch& stretch : stretches) {
        for (Index t = 0; t < stretch.length; ++t) {
            const Index row = stretch.begin + t;
            const Index m = std::min(t, order);
            double value = deviates(row) * innovation_sd;
            if (m < order) {
                value *= std::sqrt(variances(m));
                for (Index j = 0; j < m; ++j) value += predictors(m, j) * out(row - 1 - j);
            } else {
                for (Index j = 0; j < order; ++j) value += last(j) * out(row - 1 - j);
            }
            out(row) = value;
        }
    }
}

RestrictedLikelihood::RestrictedLikelihood(const MatrixXd& design, const VectorXd& response,
                                           std::vector<Stretch> stretches, Index highest_order)
    : width_(design.cols() + 1), highest_order_(highest_order), stretches_(std::move(stretches)) {
    full_products_.assign(static_cast<std::size_t>(highest_order + 1), MatrixXd::Zero(width_, width_));
    products_of_order_.resize(static_cast<std::size_t>(highest_order + 1));
    MatrixXd rows(design.rows(), width_);
    rows << design, response;
    for (const Stretch& stretch : stretches_) {
        rows_ += stretch.length;
        const auto block = rows.middleRows(stretch.begin, stretch.length);
        for (Index lag = 0; lag <= std::min(highest_order, stretch.length - 1); ++lag) {
            const Index count = stretch.length - lag;
            full_products_[static_cast<std::size_t>(lag)].noalias() +=
                block.bottomRows(count).transpose() * block.topRows(count);
        }
        const Index edge = std::min(highest_order, stretch.length);
        heads_.emplace_back(block.topRows(edge));
        tails_.emplace_back(block.bottomRows(edge));
    }
}

// One column for each pair i ≤ j of 0 … p, in that order: the lower triangle of P + Pᵀ (of P where i = j),
// column by column, where P = Σ over t = p … end of z_(t−i) z_(t−j)ᵀ, all stretches longer than p.
const MatrixXd& RestrictedLikelihood::lag_products(Index order) const {
    MatrixXd& products = products_of_order_[static_cast<std::size_t>(order)];
    if (products.size() > 0) return products;
    products.resize(width_ * (width_ + 1) / 2, (order + 1) * (order + 2) / 2);
    Index column = 0;
    for (Index i = 0; i <= order; ++i) {
        for (Index j = i; j <= order; ++j) {
            const Index lag = j - i;
            MatrixXd sum = full_products_[static_cast<std::size_t>(lag)];
            for (std::size_t s = 0; s < stretches_.size(); ++s) {
                const Index length = stretches_[s].length;
                const MatrixXd &head = heads_[s], &tail = tails_[s];
                if (length <= order) {  // the stretch is whitened by its edge rows alone
                    for (Index u = lag; u < length; ++u)
                        sum.noalias() -= head.row(u).transpose() * head.row(u - lag);
                    continue;
                }
                for (Index u = lag; u < order - i; ++u)
                    sum.noalias() -= head.row(u).transpose() * head.row(u - lag);
                const Index offset = tail.rows() - length;  // tail row of sample u is u + offset
                for (Index u = length - i; u < length; ++u) {
                    const auto later = tail.row(u + offset);
                    if (u - lag + offset >= 0)
                        sum.noalias() -= later.transpose() * tail.row(u - lag + offset);
                    else
                        sum.noalias() -= later.transpose() * head.row(u - lag);
                }
            }
            if (j > i) sum += sum.transpose().eval();
            for (Index c = 0, at = 0; c < width_; at += width_ - c, ++c)
                products.col(column).segment(at, width_ - c) = sum.col(c).tail(width_ - c);
            ++column;
        }
    }
    return products;
}

MatrixXd RestrictedLikelihood::gram(const MatrixXd& predictors, const VectorXd& variances) const {
    const Index order = predictors.rows() - 1;
    VectorXd filter(order + 1);
    filter(0) = 1.0;
    filter.tail(order) = -predictors.row(order).head(order).transpose();
    const MatrixXd& products = lag_products(order);
    VectorXd weights(products.cols());
    Index column = 0;
    for (Index i = 0; i <= order; ++i)
        for (Index j = i; j <= order; ++j) weights(column++) = filter(i) * filter(j);
    const VectorXd lower = products * weights;
    MatrixXd sum = MatrixXd::Zero(width_, width_);
    for (Index c = 0, at = 0; c < width_; at += width_ - c, ++c)
        sum.col(c).tail(width_ - c) = lower.segment(at, width_ - c);
    for (std::size_t s = 0; s < stretches_.size(); ++s) {
        for (Index m = 0; m < std::min(order, stretches_[s].length); ++m) {
            Eigen::RowVectorXd innovation = heads_[s].row(m);
            for (Index j = 0; j < m; ++j) innovation -= predictors(m, j) * heads_[s].row(m - 1 - j);
            sum.noalias() += innovation.transpose() * innovation / variances(m);
        }
    }
    return sum;
}

WhitenedFit RestrictedLikelihood::evaluate(const VectorXd& partial) const {
    return evaluate(partial, true);
}

double RestrictedLikelihood::criterion(const VectorXd& partial) const {
    const WhitenedFit fit = evaluate(partial, false);
    return fit.valid ? fit.criterion : std::numeric_limits<double>::infinity();
}

WhitenedFit RestrictedLikelihood::evaluate(const VectorXd& partial, bool with_coefficients) const {
    const MatrixXd predictors = predictors_of(partial);
    const VectorXd variances = relative_variances(partial);
    const MatrixXd sum = gram(predictors, variances);
    const Index k = width_ - 1;
    WhitenedFit fit;
    double log_determinant = 0.0;
    for (const Stretch& stretch : stretches_)
        for (Index m = 0; m < std::min(partial.size(), stretch.length); ++m)
            log_determinant += std::log(variances(m));
    const double log_determinant_noise = log_determinant;
    double explained = 0.0;
    if (k > 0) {
        const Eigen::LLT<MatrixXd> factor(sum.topLeftCorner(k, k));
        if (factor.info() != Eigen::Success) return fit;
        explained = factor.matrixL().solve(sum.row(k).head(k).transpose()).squaredNorm();
        log_determinant += 2.0 * factor.matrixLLT().diagonal().array().log().sum();
        if (with_coefficients) {
            fit.coefficients = factor.solve(sum.row(k).head(k).transpose());
            fit.unit_covariance = factor.solve(MatrixXd::Identity(k, k));
        }
    }
    fit.residual_sum = sum(k, k) - explained;
    if (!(fit.residual_sum > 0.0) || !std::isfinite(log_determinant)) return fit;
    fit.criterion = static_cast<double>(rows_ - k) * std::log(fit.residual_sum) + log_determinant;
    fit.likelihood_criterion =
        static_cast<double>(rows_) * std::log(fit.residual_sum) + log_determinant_noise;
    fit.valid = std::isfinite(fit.criterion);
    return fit;
}

namespace {

constexpr double largest_partial = 0.9995;  // keeps the noise stationary in double precision

VectorXd to_partial(const VectorXd& unbounded) {
    return unbounded.array().tanh().max(-largest_partial).min(largest_partial);
}

// Prior of each partial autocorrelation, (1 − κ²)^−(1 + prior_exponent). The restricted likelihood of slow
// noise in a short record still leans towards less correlation than there is; this exponent was chosen by the
// coverage study (AR(1), φ = 0.95, three cycles: 91 % of 95 % intervals held with a flat prior, 93 % with
// this one; no change for white noise).
constexpr double prior_exponent = 0.25;

// −2 log posterior as a function of the inverse hyperbolic tangents of the partial autocorrelations.
double minus_two_log_posterior(double criterion, const VectorXd& partial) {
    return criterion + 2.0 * prior_exponent * (1.0 - partial.array().square()).log().sum();
}

double minus_two_log_posterior(const WhitenedFit& fit, const VectorXd& partial) {
    return fit.valid ? minus_two_log_posterior(fit.criterion, partial)
                     : std::numeric_limits<double>::infinity();
}

double minus_two_log_posterior(const RestrictedLikelihood& likelihood, const VectorXd& unbounded) {
    const VectorXd partial = to_partial(unbounded);
    return minus_two_log_posterior(likelihood.criterion(partial), partial);
}

VectorXd gradient_of(const RestrictedLikelihood& likelihood, const VectorXd& at) {
    constexpr double step = 1e-4;
    VectorXd gradient(at.size());
    for (Index i = 0; i < at.size(); ++i) {
        VectorXd up = at, down = at;
        up(i) += step;
        down(i) -= step;
        gradient(i) = (minus_two_log_posterior(likelihood, up) - minus_two_log_posterior(likelihood, down)) /
                      (2.0 * step);
    }
    return gradient;
}

// One-sided, for the way down: it moves the minimum by half a step, 1/200 of the posterior's width in 10,000
// rows.
VectorXd downhill_gradient(const RestrictedLikelihood& likelihood, const VectorXd& at, double value) {
    constexpr double step = 1e-4;
    VectorXd gradient(at.size());
    for (Index i = 0; i < at.size(); ++i) {
        VectorXd up = at;
        up(i) += step;
        gradient(i) = (minus_two_log_posterior(likelihood, up) - value) / step;
    }
    return gradient;
}

// Quasi-Newton (BFGS) descent with backtracking; the surface is smooth and low-dimensional.
VectorXd minimise(const RestrictedLikelihood& likelihood, VectorXd at) {
    const Index n = at.size();
    if (n == 0) return at;
    MatrixXd inverse_hessian =
        MatrixXd::Identity(n, n) / std::max(1.0, static_cast<double>(likelihood.rows()));
    double value = minus_two_log_posterior(likelihood, at);
    VectorXd gradient = downhill_gradient(likelihood, at, value);
    for (int iteration = 0; iteration < 40; ++iteration) {
        VectorXd step = -inverse_hessian * gradient;
        const double longest = step.cwiseAbs().maxCoeff();
        if (longest > 1.0) step /= longest;
        double slope = step.dot(gradient);
        if (slope >= 0.0) break;
        double next_value = 0.0, scale = 1.0;
        int halvings = 0;
        for (; halvings < 12; ++halvings, scale /= 2.0) {
            next_value = minus_two_log_posterior(likelihood, at + scale * step);
            if (next_value <= value + 1e-4 * scale * slope) break;
        }
        if (halvings == 12) break;
        const VectorXd moved = scale * step, next = at + moved;
        const VectorXd next_gradient = downhill_gradient(likelihood, next, next_value),
                       change = next_gradient - gradient;
        const double curvature = moved.dot(change);
        if (curvature > 1e-12) {
            const double rho = 1.0 / curvature;
            const MatrixXd project = MatrixXd::Identity(n, n) - rho * moved * change.transpose();
            inverse_hessian =
                project * inverse_hessian * project.transpose() + rho * moved * moved.transpose();
        }
        const double gain = value - next_value;
        at = next;
        value = next_value;
        gradient = next_gradient;
        if (gain < 1e-4) break;
    }
    return at;
}

// Covariance of the unbounded parameters: inverse of half the curvature of −2 log posterior.
MatrixXd posterior_covariance(const RestrictedLikelihood& likelihood, const VectorXd& at) {
    // Well inside the posterior, whose width falls with the root of the number of rows.
    const double step = std::min(0.02, 0.4 / std::sqrt(static_cast<double>(likelihood.rows())));
    const Index n = at.size();
    MatrixXd hessian(n, n);
    for (Index i = 0; i < n; ++i) {
        VectorXd up = at, down = at;
        up(i) += step;
        down(i) -= step;
        hessian.col(i) = (gradient_of(likelihood, up) - gradient_of(likelihood, down)) / (2.0 * step);
    }
    hessian = (hessian + hessian.transpose()).eval() / 4.0;
    for (double ridge = 0.0; ridge < 1e6; ridge = ridge == 0.0 ? 1.0 : ridge * 10.0) {
        const Eigen::LLT<MatrixXd> factor(hessian + ridge * MatrixXd::Identity(n, n));
        if (factor.info() == Eigen::Success) return factor.solve(MatrixXd::Identity(n, n));
    }
    return MatrixXd::Identity(n, n) / static_cast<double>(likelihood.rows());
}

// Importance draws about the mode, in antithetic pairs.
std::vector<NoiseDraw> draw_noise(const RestrictedLikelihood& likelihood, const VectorXd& mode,
                                  const NoiseOptions& options) {
    const NoiseDraw best{to_partial(mode), 1.0, likelihood.evaluate(to_partial(mode))};
    if (mode.size() == 0 || options.draws < 2) return {best};
    constexpr double widening = 1.15;  // of the proposal, so that its tails reach those of the target
    const MatrixXd covariance = posterior_covariance(likelihood, mode);
    const MatrixXd root = Eigen::LLT<MatrixXd>(covariance).matrixL();
    const double at_mode = minus_two_log_posterior(best.fit, best.partial_autocorrelation);
    boost::random::mt19937_64 generator(options.seed);
    boost::random::normal_distribution<double> normal;
    std::vector<NoiseDraw> draws;
    double total = 0.0;
    for (int i = 0; i < options.draws / 2; ++i) {
        VectorXd deviate(mode.size());
        for (double& d : deviate) d = normal(generator);
        for (const double sign : {1.0, -1.0}) {
            const VectorXd partial = to_partial(mode + sign * widening * (root * deviate));
            WhitenedFit fit = likelihood.evaluate(partial);
            const double log_ratio =
                -0.5 * (minus_two_log_posterior(fit, partial) - at_mode) + 0.5 * deviate.squaredNorm();
            if (!std::isfinite(log_ratio)) continue;
            draws.push_back({partial, std::exp(std::min(log_ratio, 3.0)), std::move(fit)});
            total += draws.back().weight;
        }
    }
    // Beside a posterior much narrower than its curvature says, every draw weighs nothing.
    if (!(total > 0.0)) return {best};
    for (NoiseDraw& draw : draws) draw.weight /= total;
    return draws;
}

}  // namespace

namespace {

VectorXd to_unbounded(const VectorXd& partial) {
    return partial.array().max(-largest_partial).min(largest_partial).atanh();
}

// The unbounded parameters at the order that the Bayesian information criterion chooses.
VectorXd best_of_orders(const RestrictedLikelihood& likelihood, Index highest) {
    const double spare = static_cast<double>(likelihood.rows() - likelihood.columns());
    VectorXd best, current;
    double best_criterion = std::numeric_limits<double>::infinity();
    Index since_best = 0;
    for (Index order = 0; order <= highest && since_best < 4; ++order, ++since_best) {
        VectorXd start = VectorXd::Zero(order);
        start.head(current.size()) = current;
        current = minimise(likelihood, start);
        const WhitenedFit fit = likelihood.evaluate(to_partial(current));
        if (!fit.valid) continue;
        const double parameters = static_cast<double>(order) + 1.0;
        const double criterion = fit.criterion + std::log(spare) * parameters;
        if (criterion < best_criterion) {
            best_criterion = criterion;
            best = current;
            since_best = -1;
        }
    }
    return best;
}

}  // namespace

NoiseFit fit_noise(const RestrictedLikelihood& likelihood, const NoiseOptions& options) {
    const double spare = static_cast<double>(likelihood.rows() - likelihood.columns());
    const Index highest = std::min({options.highest_order, likelihood.highest_order(),
                                    std::max<Index>(0, static_cast<Index>(spare / 8.0))});
    const bool order_known = options.start && options.start->size() <= highest;
    const VectorXd best = order_known ? minimise(likelihood, to_unbounded(*options.start))
                                      : best_of_orders(likelihood, highest);
    NoiseFit result;
    result.noise.partial_autocorrelation = to_partial(best);
    result.fit = likelihood.evaluate(result.noise.partial_autocorrelation);
    result.degrees_of_freedom = spare;
    result.noise.innovation_variance = result.fit.residual_sum / spare;
    result.draws = draw_noise(likelihood, best, options);
    return result;
}

}  // namespace ringwright
