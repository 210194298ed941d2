#include "identify/half_power.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <numbers>
#include <optional>

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double looked_at = 1.5;    // widths to each side of the peak
constexpr double left_at_end = 4.6;  // nepers: one per cent of the start

// The record from its first zero crossing on, offset removed and windowed, times from the crossing.
struct WindowedRecord {
    VectorXd value;  // padded with zeros to a multiple of eight
    double first_time = 0.0, step = 0.0;

    // Eight phasors side by side, started afresh now and then, so that the sum is neither slow nor inexact.
    [[nodiscard]] double power(double frequency_hz) const {
        constexpr Index lanes = 8, fresh = 256 * lanes;
        using Lanes = Eigen::Array<double, lanes, 1>;
        const double turn = -two_pi * frequency_hz * step;
        const std::complex<double> rotation = std::polar(1.0, turn * static_cast<double>(lanes));
        const double rotate_c = rotation.real(), rotate_s = rotation.imag();
        Lanes real = Lanes::Zero(), imaginary = Lanes::Zero(), c, s;
        for (Index i = 0; i < value.size(); i += lanes) {
            if (i % fresh == 0)
                for (Index lane = 0; lane < lanes; ++lane) {
                    const double angle = turn * static_cast<double>(i + lane);
                    c(lane) = std::cos(angle);
                    s(lane) = std::sin(angle);
                }
            const auto v = value.segment<lanes>(i).array();
            real += v * c;
            imaginary += v * s;
            const Lanes next = c * rotate_c - s * rotate_s;
            s = c * rotate_s + s * rotate_c;
            c = next;
        }
        const double re = real.sum(), im = imaginary.sum();
        return re * re + im * im;
    }
};

// The spectrum near one frequency at a fraction of the cost: the record turned back by that frequency changes
// little within a short block, where its moments up to the sixth tell the sum for every frequency near by, to
// 1e-8.
class SpectrumNear {
  public:
    SpectrumNear(const WindowedRecord& record, double centre_hz, double reach_hz)
        : record_(record), centre_hz_(centre_hz), reach_hz_(reach_hz) {
        constexpr double largest_turn = 0.25;  // rad, from the middle of a block to its end
        constexpr Index shortest = 6;
        const double block = largest_turn / (std::numbers::pi * reach_hz * record.step);
        if (!(block >= static_cast<double>(shortest))) return;
        block_ = std::min(static_cast<Index>(block), record.value.size());
        const Index blocks = (record.value.size() + block_ - 1) / block_;
        Eigen::MatrixXd values = Eigen::MatrixXd::Zero(block_, blocks);
        values.reshaped().head(record.value.size()) = record.value;
        Eigen::Matrix<double, 2 * moments, Eigen::Dynamic> weights(2 * moments, block_);
        const double turn = -two_pi * centre_hz * record.step, middle = 0.5 * static_cast<double>(block_ - 1);
        for (Index j = 0; j < block_; ++j) {
            const double c = std::cos(turn * static_cast<double>(j)),
                         s = std::sin(turn * static_cast<double>(j));
            const double along = (static_cast<double>(j) - middle) * record.step;
            double weight = 1.0;
            for (Index k = 0; k < moments; ++k, weight *= along) {
                weights(2 * k, j) = weight * c;
                weights(2 * k + 1, j) = weight * s;
            }
        }
        moments_.noalias() = weights * values;
    }

    [[nodiscard]] double power(double frequency_hz) const {
        if (block_ == 0 || std::abs(frequency_hz - centre_hz_) > reach_hz_)
            return record_.power(frequency_hz);
        // Σ (−iδ)^k/k! of the moments, δ the distance in rad/s; an even and an odd part.
        const double distance = two_pi * (frequency_hz - centre_hz_);
        double re = 0.0, im = 0.0;
        const std::complex<double> rotation =
            std::polar(1.0, -two_pi * frequency_hz * record_.step * static_cast<double>(block_));
        std::array<double, moments> factor;
        factor[0] = 1.0;
        for (std::size_t k = 1; k < moments; ++k)
            factor[k] = factor[k - 1] * distance / static_cast<double>(k);
        double c = 1.0, s = 0.0;
        for (Index b = 0; b < moments_.cols(); ++b) {
            const double* m = moments_.col(b).data();
            // (−i)^k turns by a quarter: 1, −i, −1, i.
            const double sum_re = m[0] + factor[1] * m[3] - factor[2] * m[4] - factor[3] * m[7] +
                                  factor[4] * m[8] + factor[5] * m[11] - factor[6] * m[12];
            const double sum_im = m[1] - factor[1] * m[2] - factor[2] * m[5] + factor[3] * m[6] +
                                  factor[4] * m[9] - factor[5] * m[10] - factor[6] * m[13];
            re += c * sum_re - s * sum_im;
            im += c * sum_im + s * sum_re;
            const double next = c * rotation.real() - s * rotation.imag();
            s = c * rotation.imag() + s * rotation.real();
            c = next;
        }
        return re * re + im * im;
    }

  private:
    static constexpr int moments = 7;
    const WindowedRecord& record_;
    double centre_hz_ = 0.0, reach_hz_ = 0.0;
    Index block_ = 0;  // 0: too short a record for blocks
    Eigen::Matrix<double, 2 * moments, Eigen::Dynamic> moments_;
};

// Mean over the last whole cycles within the last third.
double offset_of(const DecaySamples& samples, double frequency_hz, Index count) {
    const double cycle = 1.0 / (frequency_hz * samples.step_s);
    const double third = static_cast<double>(count) / 3.0;
    const double whole = std::max(1.0, std::floor(third / cycle)) * cycle;
    const auto length = std::clamp<Index>(static_cast<Index>(std::lround(whole)), 1, count);
    return samples.value.segment(count - length, length).mean();
}

std::optional<WindowedRecord> cut_at_crossing(const DecaySamples& samples,
                                              const HalfPowerSettings& settings) {
    const Index count =
        std::upper_bound(samples.time.begin(), samples.time.end(), settings.end_s) - samples.time.begin();
    if (count < 16) return std::nullopt;
    const double offset = offset_of(samples, settings.cycle_hz, count);
    const VectorXd value = samples.value.head(count).array() - offset;
    Index first = 1;
    while (first < count && !(value(first - 1) * value(first) <= 0.0 && value(first) != 0.0)) ++first;
    if (first + 12 > count || samples.time(first) - samples.time(0) > 0.8 / settings.cycle_hz)
        return std::nullopt;
    const double share =
        value(first) / (value(first) - value(first - 1));  // of the step, from crossing to sample
    WindowedRecord record;
    record.step = samples.step_s;
    record.first_time = share * record.step;
    const Index length = count - first;
    record.value = VectorXd::Zero((length + 7) / 8 * 8);
    record.value.head(length) = value.tail(length);
    record.value(0) *= 0.5 * (1.0 + share);  // trapezium from the crossing
    const double factor = std::exp(-settings.window_rate * record.step);
    double window = std::exp(-settings.window_rate * record.first_time);
    for (double& v : record.value) {
        v *= window;
        window *= factor;
    }
    return record;
}

// Highest point near `frequency_hz`: a coarse look when the place is not yet known, then parabolas through
// three points.
double peak_near(const SpectrumNear& record, double frequency_hz, double width_hz, bool known) {
    double best = frequency_hz;
    const double reach = std::min(0.5 * frequency_hz, 2.0 * width_hz);
    if (!known) {
        double best_power = 0.0;
        for (int i = -4; i <= 4; ++i) {
            const double f = frequency_hz + reach * i / 4.0, p = record.power(f);
            if (p > best_power) {
                best_power = p;
                best = f;
            }
        }
    }
    double h = known ? 0.2 * width_hz : reach / 4.0;
    for (int i = 0; i < (known ? 3 : 4); ++i) {
        const double left = std::log(record.power(best - h)), middle = std::log(record.power(best)),
                     right = std::log(record.power(best + h));
        const double bend = left - 2.0 * middle + right;
        if (bend < 0.0) best += std::clamp(0.5 * (left - right) / bend, -1.0, 1.0) * h;
        h *= 0.4;
    }
    return best;
}

// Frequency at which the power falls to half of that of the peak on one side of it (direction ±1); nothing
// when it never does.
std::optional<double> crossing(const SpectrumNear& record, double peak_hz, double peak_power, double width_hz,
                               double direction) {
    const double level = 0.5 * peak_power;
    const auto logarithm = [&](double f) { return std::log(record.power(f) / level); };
    double inside = peak_hz, inside_value = std::numbers::ln2, step = 0.5 * width_hz, outside = peak_hz,
           outside_value = 0.0;
    for (int i = 0;; ++i) {
        outside = inside + direction * step;
        if (outside <= 0.0 || i > 40) return std::nullopt;
        outside_value = logarithm(outside);
        if (outside_value < 0.0) break;
        inside = outside;
        inside_value = outside_value;
        step = 0.25 * width_hz;
    }
    // Regula falsi; an end that stays twice in turn counts half (Illinois), or it would stay for good.
    double before = 0.0;
    for (int i = 0; i < 20 && std::abs(outside - inside) > 1e-9 * peak_hz; ++i) {
        const double f = inside - inside_value * (outside - inside) / (outside_value - inside_value);
        const double value = logarithm(f);
        if (std::abs(value) < 1e-7) return f;
        const bool again = value * before > 0.0;
        before = value;
        if (value < 0.0) {
            outside = f;
            outside_value = value;
            if (again) inside_value *= 0.5;
        } else {
            inside = f;
            inside_value = value;
            if (again) outside_value *= 0.5;
        }
    }
    return 0.5 * (inside + outside);
}

}  // namespace

HalfPowerReading read_half_power(const DecaySamples& samples, const HalfPowerSettings& settings) {
    HalfPowerReading reading;
    const std::optional<WindowedRecord> record = cut_at_crossing(samples, settings);
    if (!record) {
        reading.reason = "the decay is too short: fewer than a dozen samples follow its first zero crossing";
        return reading;
    }
    const SpectrumNear spectrum(*record, settings.frequency_hz, looked_at * settings.width_hz);
    reading.peak_hz = peak_near(spectrum, settings.frequency_hz, settings.width_hz, settings.peak_known);
    reading.peak_power = spectrum.power(reading.peak_hz);
    const auto side = [&](double direction) {
        return crossing(spectrum, reading.peak_hz, reading.peak_power, settings.width_hz, direction);
    };
    const std::optional<double> low = side(-1.0), high = side(1.0);
    if (!low || !high) {
        reading.reason = "the spectrum does not fall to half its peak on both sides of it";
        return reading;
    }
    reading.low_hz = *low;
    reading.high_hz = *high;
    const double square_low = *low * *low, square_high = *high * *high;
    const double twice_theta = std::atan2(square_high - square_low, square_high + square_low);
    const double windowed_ratio = std::sin(0.5 * twice_theta);
    const double windowed_omega =
        two_pi * std::sqrt((square_low + square_high) / (2.0 * std::cos(twice_theta)));
    const double rate = windowed_ratio * windowed_omega - settings.window_rate;
    const double p = windowed_omega * windowed_omega * (1.0 - windowed_ratio * windowed_ratio);
    const double omega = std::sqrt(p + rate * rate);
    reading.natural_frequency_hz = omega / two_pi;
    reading.damping_ratio = rate / omega;
    reading.valid = std::isfinite(omega) && std::isfinite(rate);
    return reading;
}

double window_rate_for(double frequency_hz, double decay_rate, double end_s) {
    const double length = std::max(0.25 / frequency_hz, end_s - 0.25 / frequency_hz);
    return std::max(0.0, left_at_end / length - decay_rate);
}

HalfPowerSettings choose_half_power_settings(const DecaySamples& samples, double frequency_hz,
                                             double decay_rate, double end_s) {
    HalfPowerSettings settings;
    settings.cycle_hz = frequency_hz;
    settings.frequency_hz = frequency_hz;
    settings.end_s = std::min(end_s, samples.time(samples.size() - 1));
    settings.window_rate = window_rate_for(frequency_hz, decay_rate, settings.end_s);
    settings.width_hz = 2.0 * (decay_rate + settings.window_rate) / two_pi;
    return settings;
}

VectorXd half_power_spectrum(const DecaySamples& samples, const HalfPowerSettings& settings,
                             const VectorXd& frequency_hz) {
    const std::optional<WindowedRecord> record = cut_at_crossing(samples, settings);
    VectorXd power = VectorXd::Zero(frequency_hz.size());
    if (record)
        for (Index i = 0; i < power.size(); ++i) power(i) = record->power(frequency_hz(i));
    return power;
}

}  // namespace ringwright::identify
