#include "identify/method_bootstrap.hpp"

#include <fmt/format.h>

#include <boost/random/mersenne_twister.hpp>
#include <boost/random/normal_distribution.hpp>
#include <cmath>
#include <mutex>
#include <numbers>
#include <vector>

#include "identify/decay_quantities.hpp"
#include "ringwright/each_index.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr double two_pi = 2.0 * std::numbers::pi;
constexpr double largest_failed_share = 0.05;

struct Setup {
    double frequency_hz = 0.0;  // damped
    double noise = 0.0;         // standard deviation of a sample
    VectorXd interference;      // tones, drift and nuisance poles, to be taken off before the simple methods
    VectorXd model;             // the decay alone, with offset
};

Setup set_up(const CurveFit& fit) {
    Setup setup;
    setup.frequency_hz = fit.oscillator().damped_frequency_hz();
    setup.noise = std::sqrt(fit.noise.noise.variance());
    const MatrixXd columns = linear_columns(fit.fit.model, fit.samples);
    VectorXd interference = fit.fit.coefficients;
    interference(0) = 0.0;
    interference
        .segment(fit.fit.model.first_oscillator_column(),
                 static_cast<Index>(2 * fit.fit.model.oscillators.size()))
        .setZero();
    setup.interference = columns * interference;
    setup.model = columns * fit.fit.coefficients - setup.interference;
    return setup;
}

double time_to_noise(const CurveFit& fit, double noise) {
    const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, 0);
    const double rate = std::max(fit.oscillator().slowest_rate(), 1e-12);
    return std::log(std::max(amplitude / noise, 1.5)) / rate;
}

// Error of (ln frequency, damping ratio) of the curve fit for given noise, to first order.
class FitError {
  public:
    explicit FitError(const CurveFit& fit) : fit_(fit) {
        MatrixXd whitened = fit.basis;
        whiten(fit.noise.noise, fit.samples.stretches, whitened);
        const MatrixXd rows = fit.map.middleRows(fit.linear_count(), 2);
        gain_ = rows * fit.noise.fit.unit_covariance * whitened.transpose();
        damping_slope_ = std::cosh(fit.oscillator().asinh_damping);
    }
    [[nodiscard]] std::array<double, 2> operator()(const VectorXd& noise) const {
        VectorXd whitened = noise;
        whiten(fit_.noise.noise, fit_.samples.stretches, whitened);
        const VectorXd move = gain_ * whitened;
        return {move(1), move(0) * damping_slope_};
    }

  private:
    const CurveFit& fit_;
    MatrixXd gain_;
    double damping_slope_ = 1.0;
};

// The noise models of the replicates follow the weights of the draws.
std::vector<const NoiseDraw*> spread_draws(const NoiseFit& noise, int replicates) {
    std::vector<const NoiseDraw*> chosen;
    double sum = 0.0;
    std::size_t at = 0;
    for (int i = 0; i < replicates; ++i) {
        const double wanted = (i + 0.5) / replicates;
        while (at + 1 < noise.draws.size() && sum + noise.draws[at].weight < wanted)
            sum += noise.draws[at++].weight;
        chosen.push_back(&noise.draws[at]);
    }
    return chosen;
}

// What the methods read from the fitted decay with other noise; not valid where they failed.
struct Replicate {
    std::array<double, 2> fit_error{};
    DecrementReading decrement;
    HalfPowerReading half_power;
};

// Reads the methods from replicates. The noise of one after the other is drawn from one generator, whichever
// thread comes for it; what is made of it is work for many.
class Replicator {
  public:
    Replicator(const CurveFit& fit, const VectorXd& model, const DecaySamples& samples,
               const MethodReadings& readings, const DecrementSettings& decrement,
               const HalfPowerSettings& half_power)
        : fit_(fit),
          model_(model),
          samples_(samples),
          readings_(readings),
          decrement_(decrement),
          half_power_(half_power),
          fit_error_(fit) {}

    [[nodiscard]] std::vector<Replicate> run(int count, std::uint64_t seed, unsigned threads) const {
        std::vector<Replicate> replicates(static_cast<std::size_t>(count));
        const std::vector<const NoiseDraw*> draws = spread_draws(fit_.noise, count);
        boost::random::mt19937_64 generator(seed);
        boost::random::normal_distribution<double> normal;
        std::mutex drawing;
        std::size_t next = 0;
        for_each_index(threads, threads, [&](std::size_t, unsigned) {
            VectorXd deviates(samples_.size());
            DecaySamples samples = samples_;
            for (;;) {
                std::size_t i = 0;
                {
                    const std::scoped_lock lock(drawing);
                    if (next == replicates.size()) return;
                    i = next++;
                    for (double& d : deviates) d = normal(generator);
                }
                replicates[i] = read(*draws[i], deviates, samples);
            }
        });
        return replicates;
    }

  private:
    [[nodiscard]] Replicate read(const NoiseDraw& draw, const VectorXd& deviates,
                                 DecaySamples& samples) const {
        const AutoregressiveNoise noise_model{draw.partial_autocorrelation,
                                              draw.fit.residual_sum / fit_.noise.degrees_of_freedom};
        VectorXd noise(samples.size());
        colour(noise_model, samples.stretches, deviates, noise);
        samples.value = model_ + noise;
        Replicate replicate;
        replicate.fit_error = fit_error_(noise);
        if (readings_.decrement.valid) replicate.decrement = read_decrement(samples, decrement_);
        if (readings_.half_power.valid) {
            // The window was chosen by a decay rate that has its own error.
            HalfPowerSettings chosen_anew = half_power_;
            const double rate = (fit_.oscillator().damping_ratio() + replicate.fit_error[1]) *
                                fit_.oscillator().angular_frequency();
            chosen_anew.window_rate = window_rate_for(half_power_.cycle_hz, rate, half_power_.end_s);
            replicate.half_power = read_half_power(samples, chosen_anew);
        }
        return replicate;
    }

    const CurveFit& fit_;
    const VectorXd& model_;
    const DecaySamples& samples_;
    const MethodReadings& readings_;
    const DecrementSettings& decrement_;
    const HalfPowerSettings& half_power_;
    FitError fit_error_;
};

template <typename Reading>
void collect(MethodErrors& errors, const Reading& reading, const Oscillator& truth,
             const std::array<double, 2>& fit_error) {
    errors.errors.push_back({std::log(two_pi * reading.natural_frequency_hz) - truth.log_frequency,
                             reading.damping_ratio - truth.damping_ratio()});
    errors.fit_errors.push_back(fit_error);
}

void summarise(MethodErrors& errors, int replicates) {
    const auto n = static_cast<double>(errors.errors.size());
    const double failed = 1.0 - n / replicates;
    if (failed > largest_failed_share) {
        errors.reason = fmt::format(
            "with this much noise the method would fail on {:.0f} % of such recordings", 100.0 * failed);
        return;
    }
    double cross = 0.0;
    for (const auto& e : errors.errors)
        for (std::size_t k = 0; k < 2; ++k) errors.bias[k] += e[k] / n;
    for (const auto& e : errors.errors) {
        for (std::size_t k = 0; k < 2; ++k)
            errors.deviation[k] += (e[k] - errors.bias[k]) * (e[k] - errors.bias[k]) / (n - 1.0);
        cross += (e[0] - errors.bias[0]) * (e[1] - errors.bias[1]) / (n - 1.0);
    }
    for (double& d : errors.deviation) d = std::sqrt(d);
    errors.correlation = cross / (errors.deviation[0] * errors.deviation[1]);
    errors.usable = true;
}

}  // namespace

MethodBootstrap bootstrap_methods(const CurveFit& fit, int replicates, std::uint64_t seed, unsigned threads) {
    MethodBootstrap result;
    const Setup setup = set_up(fit);
    MethodReadings& readings = result.readings;
    if (setup.frequency_hz <= 0.0) {
        readings.decrement.reason = readings.half_power.reason =
            "the decay does not ring: it is at or beyond critical damping";
        return result;
    }
    DecaySamples samples = fit.samples;
    samples.value -= setup.interference;
    const Eigen::Index column = fit.fit.model.first_oscillator_column();
    const DecrementSettings decrement_settings =
        choose_decrement_settings(samples, fit.oscillator(), fit.fit.coefficients(column),
                                  fit.fit.coefficients(column + 1), setup.noise);
    readings.decrement = read_decrement(samples, decrement_settings);
    readings.half_power_settings = choose_half_power_settings(
        samples, setup.frequency_hz, fit.oscillator().decay_rate(), time_to_noise(fit, setup.noise));
    if (samples.stretches.size() == 1)
        readings.half_power = read_half_power(samples, readings.half_power_settings);
    else
        readings.half_power.reason =
            "the decay is interrupted by gaps or clipped samples, which a spectrum cannot bridge";

    HalfPowerSettings settings = readings.half_power_settings;
    if (readings.half_power.valid) {
        settings.frequency_hz = readings.half_power.peak_hz;
        settings.width_hz = readings.half_power.high_hz - readings.half_power.low_hz;
        settings.peak_known = true;
        readings.half_power = read_half_power(samples, settings);  // as the replicates will be read
    }
    const Replicator replicator{fit, setup.model, samples, readings, decrement_settings, settings};
    for (const Replicate& replicate : replicator.run(replicates, seed, threads)) {
        if (replicate.decrement.valid)
            collect(result.decrement, replicate.decrement, fit.oscillator(), replicate.fit_error);
        if (replicate.half_power.valid)
            collect(result.half_power, replicate.half_power, fit.oscillator(), replicate.fit_error);
    }
    if (readings.decrement.valid) summarise(result.decrement, replicates);
    if (readings.half_power.valid) summarise(result.half_power, replicates);
    return result;
}

}  // namespace ringwright::identify
