#include "identify/decay_picture.hpp"

#include <algorithm>
#include <cmath>

namespace ringwright::identify {

using Eigen::Index;
using Eigen::VectorXd;

namespace {

std::vector<double> to_vector(const VectorXd& values) {
    return {values.begin(), values.end()};
}

void add_decay(DecayPicture& picture, const Recording& recording, const CurveFit& fit) {
    const double start = recording.clock.time_of(fit.window.begin), scale = fit.samples.scale;
    picture.time_s = to_vector(fit.samples.time.array() + start);
    picture.observed = to_vector(fit.samples.value * scale);
    picture.fitted = to_vector((fit.samples.value - fit.residual) * scale);
    picture.residual = to_vector(fit.residual * scale);
    const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, 0);
    const double offset = fit.fit.coefficients(0);
    picture.offset = offset * scale;
    const double released = fit.fit.model.release.value_or(0.0);
    const Eigen::ArrayXd since = (fit.samples.time.array() - released).cwiseMax(0.0);
    picture.envelope =
        to_vector(scale * (offset + amplitude * (-fit.oscillator().slowest_rate() * since).exp()));
}

void add_spectrum(DecayPicture& picture, const CurveFit& fit, const MethodReadings& readings) {
    if (!readings.half_power.valid) return;
    const HalfPowerReading& reading = readings.half_power;
    const double width = reading.high_hz - reading.low_hz;
    const double low = std::max(0.02 * reading.peak_hz, reading.peak_hz - 4.0 * width),
                 high = reading.peak_hz + 4.0 * width;
    const VectorXd frequency = VectorXd::LinSpaced(201, low, high);
    const VectorXd power = half_power_spectrum(fit.samples, readings.half_power_settings, frequency);
    picture.frequency_hz = to_vector(frequency);
    picture.spectrum = to_vector((power / reading.peak_power).cwiseSqrt());
    picture.half_power_low_hz = reading.low_hz;
    picture.half_power_high_hz = reading.high_hz;
    picture.half_power_level = std::sqrt(0.5);
}

void add_autocorrelation(DecayPicture& picture, const CurveFit& fit) {
    const VectorXd& x = fit.innovations;
    const Index lags = std::min<Index>(40, x.size() / 3);
    for (Index lag = 0; lag <= lags; ++lag)
        picture.residual_autocorrelation.push_back(x.head(x.size() - lag).dot(x.tail(x.size() - lag)) /
                                                   x.squaredNorm());
    picture.residual_autocorrelation_band = 1.959964 / std::sqrt(static_cast<double>(x.size()));
}

}  // namespace

DecayPicture draw_decay(const Recording& recording, const CurveFit& fit, const MethodBootstrap& bootstrap) {
    DecayPicture picture;
    add_decay(picture, recording, fit);
    const DecrementReading& decrement = bootstrap.readings.decrement;
    picture.half_cycle = decrement.half_cycle;
    picture.log_amplitude = decrement.log_difference;
    picture.log_amplitude_line = decrement.line;
    for (double& v : picture.log_amplitude) v += std::log(fit.samples.scale);
    for (double& v : picture.log_amplitude_line) v += std::log(fit.samples.scale);
    add_spectrum(picture, fit, bootstrap.readings);
    add_autocorrelation(picture, fit);
    return picture;
}

}  // namespace ringwright::identify
