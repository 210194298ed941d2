#include "identify/law_model.hpp"

#include <algorithm>
#include <cmath>
#include <limits>

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double fit_tolerance = 1e-7;  // of the swing; a recording of 80 dB has noise of 1e-4
constexpr double derivative_tolerance = 1e-5;  // relative: steers the search and gives the covariance
// Acceleration jumps at reversals, so that its mean over a block takes more points than that of a smooth
// motion, for which two leave an error of 1e-6 of the amplitude.
constexpr Index smooth_points = 2, jumping_points = 8;

// Instants within each block whose mean and variance are those of the block's samples.
std::vector<double> instants(const DecaySamples& samples, Index points, double rate) {
    std::vector<double> times;
    if (samples.fine_time.size() > 0) {
        for (const double t : samples.fine_time) times.push_back(rate * t);
        return times;
    }
    const auto n = static_cast<double>(samples.block), m = static_cast<double>(points);
    const double sample_step = samples.step_s / n;
    const double step = points < 2 ? 0.0 : sample_step * std::sqrt((n * n - 1.0) / (m * m - 1.0));
    for (const double centre : samples.time)
        for (Index i = 0; i < points; ++i)
            times.push_back(rate * std::max(0.0, centre + step * (static_cast<double>(i) - 0.5 * (m - 1.0))));
    return times;
}

}  // namespace

LawModel::LawModel(const DecaySamples& samples, Measured measured, double rate, const LawTerms& terms)
    : samples_(samples), measured_(measured), rate_(rate) {
    for (std::size_t i = 0; i < law_parameter_count; ++i) {
        const auto parameter = static_cast<LawParameter>(i);
        if (terms.has(parameter)) free_.push_back(parameter);
    }
    const Index most = measured == Measured::acceleration ? jumping_points : smooth_points;
    points_ = samples.fine_time.size() > 0 ? samples.block : std::min(samples.block, most);
    times_ = instants(samples, points_, rate);
}

VectorXd LawModel::pack(const LawState& state) const {
    const VectorXd others = state.others.parameters();
    VectorXd all(state.coefficients.size() + static_cast<Index>(free_.size()) + others.size());
    Index at = 0;
    for (const double c : state.coefficients) all(at++) = c;
    for (const LawParameter p : free_) all(at++) = state.law[p];
    for (const double o : others) all(at++) = o;
    return all;
}

LawState LawModel::unpack(const VectorXd& parameters, const LawState& like) const {
    LawState state = like;
    const Index linear = like.coefficients.size(), laws = static_cast<Index>(free_.size());
    state.coefficients = parameters.head(linear);
    for (Index i = 0; i < laws; ++i) state.law[free_[static_cast<std::size_t>(i)]] = parameters(linear + i);
    state.others.set_parameters(parameters.tail(parameters.size() - linear - laws));
    return state;
}

bool LawModel::usable(const LawState& state) const {
    constexpr double widest_log_frequency = 1.5, most_damping = 5.0, longest = 20.0;
    const DampingLaw& law = state.law;
    return std::ranges::all_of(law.values, [](double v) { return std::isfinite(v); }) &&
           law[LawParameter::friction] >= 0.0 && law[LawParameter::quadratic] >= 0.0 &&
           std::abs(law[LawParameter::log_frequency]) < widest_log_frequency &&
           std::abs(law[LawParameter::damping]) < most_damping &&
           std::abs(law[LawParameter::asymmetry]) < most_damping &&
           std::abs(law[LawParameter::displacement]) < longest &&
           std::abs(law[LawParameter::velocity]) < longest && state.coefficients.allFinite() &&
           state.others.parameters().allFinite();
}

MatrixXd LawModel::block_means_of(const MatrixXd& fine) const {
    if (points_ == 1) return fine;
    MatrixXd out(samples_.size(), fine.cols());
    for (Index i = 0; i < out.rows(); ++i)
        out.row(i) = fine.middleRows(i * points_, points_).colwise().mean();
    return out;
}

VectorXd LawModel::value(const LawState& state) const {
    const LawMotion motion = move(state.law, measured_, times_, {}, fit_tolerance);
    if (!motion.valid) return VectorXd::Constant(samples_.size(), std::numeric_limits<double>::quiet_NaN());
    return linear_columns(state.others, samples_) * state.coefficients + block_means_of(motion.value);
}

MatrixXd LawModel::law_columns(const DampingLaw& law, const std::vector<LawParameter>& by) const {
    return block_means_of(move(law, measured_, times_, by, derivative_tolerance).derivative);
}

MatrixXd LawModel::columns(const LawState& state) const {
    const MatrixXd linear = linear_columns(state.others, samples_);
    const MatrixXd others = derivative_columns(state.others, samples_, state.coefficients);
    MatrixXd all(samples_.size(), linear.cols() + static_cast<Index>(free_.size()) + others.cols());
    all << linear, law_columns(state.law, free_), others;
    return all;
}

LawMotion LawModel::motion(const DampingLaw& law, Measured what, const std::vector<double>& time_s) const {
    std::vector<double> times(time_s);
    for (double& t : times) t *= rate_;
    return move(law, what, times, {}, fit_tolerance);
}

}  // namespace ringwright::identify
