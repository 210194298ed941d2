#include "identify/decay_model.hpp"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

namespace ringwright::identify {

using Eigen::ArrayXd;
using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

Oscillator Oscillator::from(double damping_ratio, double angular_frequency) {
    return {std::asinh(damping_ratio), std::log(angular_frequency)};
}
double Oscillator::damping_ratio() const {
    return std::sinh(asinh_damping);
}
double Oscillator::angular_frequency() const {
    return std::exp(log_frequency);
}
double Oscillator::decay_rate() const {
    return damping_ratio() * angular_frequency();
}

double Oscillator::damped_frequency_hz() const {
    const double ratio = damping_ratio();
    if (ratio * ratio >= 1.0) return 0.0;
    return angular_frequency() * std::sqrt(1.0 - ratio * ratio) / (2.0 * std::numbers::pi);
}

double Oscillator::fastest_rate() const {
    const double ratio = std::abs(damping_ratio());
    return angular_frequency() * (ratio <= 1.0 ? 1.0 : ratio + std::sqrt(ratio * ratio - 1.0));
}

double Oscillator::slowest_rate() const {
    const double ratio = damping_ratio();
    return ratio <= 1.0 ? decay_rate() : angular_frequency() / (ratio + std::sqrt(ratio * ratio - 1.0));
}

Index DecayModel::nonlinear_count() const {
    return static_cast<Index>(2 * oscillators.size() + tones.size() + real_poles.size()) + (release ? 1 : 0);
}

Index DecayModel::linear_count() const {
    return first_tone_column() + static_cast<Index>(2 * tones.size() + real_poles.size());
}

Index DecayModel::first_tone_column() const {
    return first_oscillator_column() + static_cast<Index>(2 * oscillators.size()) -
           (has_one_column() ? 1 : 0);
}

VectorXd DecayModel::parameters() const {
    VectorXd all(nonlinear_count());
    Index at = 0;
    for (const Oscillator& o : oscillators) {
        all(at++) = o.asinh_damping;
        all(at++) = o.log_frequency;
    }
    for (const double tone : tones) all(at++) = tone;
    for (const double pole : real_poles) all(at++) = pole;
    if (release) all(at++) = *release;
    return all;
}

void DecayModel::set_parameters(const VectorXd& parameters) {
    Index at = 0;
    for (Oscillator& o : oscillators) {
        o.asinh_damping = parameters(at++);
        o.log_frequency = parameters(at++);
    }
    for (double& tone : tones) tone = parameters(at++);
    for (double& pole : real_poles) pole = parameters(at++);
    if (release) *release = parameters(at++);
}

namespace {

struct OscillatorConstants {
    double omega, decay, p, root, ds_dz, dp_dz;
    explicit OscillatorConstants(const Oscillator& o)
        : omega(o.angular_frequency()),
          decay(o.decay_rate()),
          p(omega * omega * (1.0 - o.damping_ratio() * o.damping_ratio())),
          root(std::sqrt(std::abs(p))),
          ds_dz(omega * std::cosh(o.asinh_damping)),
          dp_dz(-2.0 * omega * o.damping_ratio() * ds_dz) {}
    // decay − root without cancellation, beyond critical damping
    [[nodiscard]] double slow_rate() const { return omega * omega / (decay + root); }
};

// e^(−s t) C(p,t), e^(−s t) S(p,t) and, where derivatives are wanted, e^(−s t) ∂S/∂p at every time.
struct Kernels {
    ArrayXd c, s, ds_dp;
};

enum class Wanted { values, derivatives };

// Power series in p t², for |p| t² < 0.05: six terms leave less than 1e-16.
void near_critical(const OscillatorConstants& k, double t, Index i, Kernels& out) {
    const double t2 = t * t, x = k.p * t2, e = std::exp(-k.decay * t);
    const double c =
        1.0 - x / 2.0 * (1.0 - x / 12.0 * (1.0 - x / 30.0 * (1.0 - x / 56.0 * (1.0 - x / 90.0))));
    const double s =
        t * (1.0 - x / 6.0 * (1.0 - x / 20.0 * (1.0 - x / 42.0 * (1.0 - x / 72.0 * (1.0 - x / 110.0)))));
    const double ds =
        -t * t2 / 6.0 * (1.0 - x / 10.0 * (1.0 - x / 28.0 * (1.0 - x / 54.0 * (1.0 - x / 88.0))));
    out.c(i) = e * c;
    out.s(i) = e * s;
    if (out.ds_dp.size() > 0) out.ds_dp(i) = e * ds;
}

// Fills [begin, end) with e^(−s t)C and e^(−s t)S. With equal steps by recurrence, started afresh every 32
// samples.
void ringing(const OscillatorConstants& k, const VectorXd& time, Index begin, Index end, double step,
             Kernels& out) {
    const Index fresh = step > 0.0 ? 32 : 1;
    const std::complex<double> turn = std::polar(std::exp(-k.decay * step), k.root * step);
    for (Index i = begin; i < end; i += fresh) {
        const double e = std::exp(-k.decay * time(i));
        double re = e * std::cos(k.root * time(i)), im = e * std::sin(k.root * time(i));
        for (Index j = i; j < std::min(i + fresh, end); ++j) {
            out.c(j) = re;
            out.s(j) = im / k.root;
            const double next = re * turn.real() - im * turn.imag();
            im = re * turn.imag() + im * turn.real();
            re = next;
        }
    }
}

// Two decaying exponentials, so that nothing overflows.
void creeping(const OscillatorConstants& k, const VectorXd& time, Index begin, Index end, double step,
              Kernels& out) {
    const Index fresh = step > 0.0 ? 32 : 1;
    const double slow_rate = k.slow_rate(), fast_rate = k.decay + k.root;
    const double slow_step = std::exp(-slow_rate * step), fast_step = std::exp(-fast_rate * step);
    for (Index i = begin; i < end; i += fresh) {
        double slow = std::exp(-slow_rate * time(i)), fast = std::exp(-fast_rate * time(i));
        for (Index j = i; j < std::min(i + fresh, end); ++j) {
            out.c(j) = 0.5 * (slow + fast);
            out.s(j) = 0.5 * (slow - fast) / k.root;
            slow *= slow_step;
            fast *= fast_step;
        }
    }
}

// `step` is the common step within each stretch, or 0.
Kernels kernels_at(const OscillatorConstants& k, const VectorXd& time, double step,
                   const std::vector<Stretch>& stretches, Wanted wanted) {
    const Index n = time.size();
    Kernels out{ArrayXd(n), ArrayXd(n), ArrayXd(wanted == Wanted::derivatives ? n : 0)};
    const auto fill = [&](Index begin, Index end) {
        while (begin < end && std::abs(k.p) * time(begin) * time(begin) < 0.05)
            near_critical(k, time(begin), begin, out), ++begin;
        if (begin == end) return;
        if (k.p > 0.0)
            ringing(k, time, begin, end, step, out);
        else
            creeping(k, time, begin, end, step, out);
        if (wanted == Wanted::values) return;
        const Index m = end - begin;
        out.ds_dp.segment(begin, m) =
            (time.segment(begin, m).array() * out.c.segment(begin, m) - out.s.segment(begin, m)) /
            (2.0 * k.p);
    };
    if (step == 0.0)
        fill(0, n);
    else
        for (const Stretch& stretch : stretches) fill(stretch.begin, stretch.begin + stretch.length);
    return out;
}

// Evaluates `fill(time, out)` at the block centres, or at every sample and averages over the blocks.
template <typename Fill>
MatrixXd over_blocks(const DecaySamples& samples, Index columns, Fill fill) {
    MatrixXd out(samples.size(), columns);
    if (samples.fine_time.size() == 0) {
        fill(samples.time, out);
        return out;
    }
    MatrixXd fine(samples.fine_time.size(), columns);
    fill(samples.fine_time, fine);
    for (Index i = 0; i < samples.size(); ++i)
        out.row(i) = fine.middleRows(i * samples.block, samples.block).colwise().mean();
    return out;
}

// On the clock of a release, before which nothing has moved.
Kernels kernels_since(const OscillatorConstants& k, const VectorXd& time, double release, Wanted wanted) {
    return kernels_at(k, (time.array() - release).cwiseMax(0.0), 0.0, {}, wanted);
}

struct Released {
    ArrayXd by_damping, by_log_frequency, by_release;
};

Released released_derivatives(const OscillatorConstants& k, const VectorXd& time, double release) {
    const Kernels kernels = kernels_since(k, time, release, Wanted::derivatives);
    const ArrayXd since = (time.array() - release).cwiseMax(0.0);
    const ArrayXd by_decay = kernels.s - since * (kernels.c + k.decay * kernels.s);
    const ArrayXd by_p = -0.5 * since * kernels.s + k.decay * kernels.ds_dp;
    return {by_decay * k.ds_dz + by_p * k.dp_dz, by_decay * k.decay + by_p * (2.0 * k.p),
            k.omega * k.omega * kernels.s};
}

double common_step(const DecaySamples& samples) {
    return samples.uniform ? samples.step_s : 0.0;
}

}  // namespace

MatrixXd linear_columns(const DecayModel& model, const DecaySamples& samples) {
    const double span = std::max(samples.time.maxCoeff(), samples.step_s);
    return over_blocks(samples, model.linear_count(), [&](const VectorXd& time, MatrixXd& out) {
        Index column = 0;
        out.col(column++).setOnes();
        if (model.drift) out.col(column++) = time / span;
        for (std::size_t i = 0; i < model.oscillators.size(); ++i) {
            const OscillatorConstants k(model.oscillators[i]);
            if (i == 0 && model.release) {
                const Kernels kernels = kernels_since(k, time, *model.release, Wanted::values);
                const ArrayXd falling = kernels.c + k.decay * kernels.s;
                const auto after = time.array() >= *model.release;
                out.col(column++) = model.let_go_slowly ? after.select(falling, 0.0).eval() : falling;
                if (model.let_go_slowly) out.col(column++) = after.select(ArrayXd::Zero(time.size()), 1.0);
                continue;
            }
            const Kernels kernels =
                kernels_at(k, time, common_step(samples), samples.stretches, Wanted::values);
            out.col(column) = kernels.c;
            out.col(column + 1) = k.omega * kernels.s;
            column += 2;
        }
        for (const double tone : model.tones) {
            const double omega = std::exp(tone);
            out.col(column++) = (omega * time.array()).cos();
            out.col(column++) = (omega * time.array()).sin();
        }
        for (const double pole : model.real_poles) out.col(column++) = (-std::exp(pole) * time.array()).exp();
    });
}

MatrixXd derivative_columns(const DecayModel& model, const DecaySamples& samples,
                            const VectorXd& coefficients) {
    return over_blocks(samples, model.nonlinear_count(), [&](const VectorXd& time, MatrixXd& out) {
        Index column = 0, linear = model.first_oscillator_column();
        for (std::size_t i = 0; i < model.oscillators.size(); ++i) {
            const OscillatorConstants k(model.oscillators[i]);
            if (i == 0 && model.release) {
                const Released derivatives = released_derivatives(k, time, *model.release);
                out.col(column++) = coefficients(linear) * derivatives.by_damping;
                out.col(column++) = coefficients(linear) * derivatives.by_log_frequency;
                out.col(out.cols() - 1) = coefficients(linear) * derivatives.by_release;
                linear += model.has_one_column() ? 1 : 2;
                continue;
            }
            const double a = coefficients(linear), b = coefficients(linear + 1);
            const Kernels kernels =
                kernels_at(k, time, common_step(samples), samples.stretches, Wanted::derivatives);
            const ArrayXd by_decay = -time.array() * (a * kernels.c + b * k.omega * kernels.s);
            const ArrayXd by_p = -0.5 * a * time.array() * kernels.s + b * k.omega * kernels.ds_dp;
            out.col(column) = by_decay * k.ds_dz + by_p * k.dp_dz;
            out.col(column + 1) = by_decay * k.decay + by_p * (2.0 * k.p) + b * k.omega * kernels.s;
            column += 2;
            linear += 2;
        }
        for (const double tone : model.tones) {
            const Eigen::ArrayXd phase = std::exp(tone) * time.array();
            out.col(column++) =
                phase * (coefficients(linear + 1) * phase.cos() - coefficients(linear) * phase.sin());
            linear += 2;
        }
        for (const double pole : model.real_poles) {
            const Eigen::ArrayXd decayed = std::exp(pole) * time.array();
            out.col(column++) = -coefficients(linear++) * decayed * (-decayed).exp();
        }
    });
}

double start_amplitude(const DecayModel& model, const VectorXd& coefficients, std::size_t index) {
    const OscillatorConstants k(model.oscillators[index]);
    const Index column = model.first_oscillator_column() + 2 * static_cast<Index>(index);
    if (model.release && index == 0) {  // b ω = a s
        const double a = std::abs(coefficients(column));
        return k.p <= 0.0 ? a * (1.0 + k.decay / k.omega) : a * std::hypot(1.0, k.decay / k.root);
    }
    const Index own = column - (model.has_one_column() ? 1 : 0);
    const double a = coefficients(own), b = coefficients(own + 1);
    if (k.p <= 0.0) return std::abs(a) + std::abs(b);
    return std::hypot(a, b * k.omega / k.root);
}

}  // namespace ringwright::identify
