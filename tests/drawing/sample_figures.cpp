#include "drawing/sample_figures.hpp"

#include <cmath>
#include <cstdint>
#include <numbers>

namespace ringwright::samples {
namespace {

/// Between −1 and 1, from a linear congruential generator (Knuth, MMIX constants, from memory).
class Noise {
  public:
    explicit Noise(std::uint64_t seed) : state_(seed) {}
    double operator()() {
        state_ = state_ * 6364136223846793005ULL + 1442695040888963407ULL;
        return static_cast<double>(state_ >> 11) / 4503599627370496.0 - 1.0;
    }

  private:
    std::uint64_t state_;
};

constexpr double two_pi = 2.0 * std::numbers::pi;

RecordingFigure recording() {
    RecordingFigure figure{{0.0, 24.0, {}, {}}, "displacement", "mm", {}};
    Noise noise(7);
    for (std::size_t i = 0; i < 960; ++i) {
        const double t = 24.0 * static_cast<double>(i) / 960.0;
        double swing = 0.04;
        for (const double start : {2.0, 9.5, 17.0})
            if (t >= start) swing += 12.0 * std::exp(-1.2 * (t - start)) * (start == 9.5 ? 0.8 : 1.0);
        figure.signal.low.push_back(1.0 - swing * (0.97 + 0.03 * noise()));
        figure.signal.high.push_back(1.0 + swing * (0.97 + 0.03 * noise()));
    }
    figure.events = {{2.0, 6.8, "1"}, {9.5, 14.0, "2"}, {17.0, 21.9, "3"}};
    return figure;
}

DecrementFigure decrement() {
    DecrementFigure figure{"displacement", "mm", {}, {}, {}};
    Noise noise(3);
    for (int half = 0; half < 36; ++half) {
        const double cycle = 0.5 * half, line = 11.5 * std::exp(-0.283 * cycle);
        figure.cycle.push_back(cycle);
        figure.line.push_back(line);
        figure.amplitude.push_back(line + 0.03 * noise());
    }
    return figure;
}

SpectrumFigure spectrum() {
    SpectrumFigure figure;
    for (int i = 0; i <= 300; ++i) {
        const double f = 2.8 + 0.01 * i, r = f / 4.2;
        figure.frequency_hz.push_back(f);
        figure.magnitude.push_back(0.09 / std::hypot(1.0 - r * r, 0.09 * r));
    }
    figure.low_hz = 4.2 * std::sqrt(1.0 - 2 * 0.045 * 0.045 - 0.09);
    figure.high_hz = 4.2 * std::sqrt(1.0 - 2 * 0.045 * 0.045 + 0.09);
    figure.level = std::numbers::sqrt2 / 2.0;
    return figure;
}

MethodsFigure methods() {
    MethodsFigure figure{{{"natural frequency", "Hz", {}}, {"damping ratio", "1", {}}}};
    Noise noise(11);
    for (const char* event : {"event 1", "event 2", "event 3"})
        for (const char* method : {"logarithmic decrement", "half-power bandwidth", "curve fit"}) {
            const double u = method[0] == 'h' ? 3.0 : method[0] == 'l' ? 1.6 : 1.0;
            const double f = 4.2 + 0.004 * u * noise(), z = 0.045 + 0.0006 * u * noise();
            figure.columns[0].rows.push_back(
                {event, method, ShownValue{f, f - 0.006 * u, f + 0.006 * u}, false});
            figure.columns[1].rows.push_back(
                {event, method, ShownValue{z, z - 0.001 * u, z + 0.001 * u}, false});
        }
    figure.columns[1].rows[4].value.reset();
    figure.columns[0].rows.push_back({"pooled", "curve fit", ShownValue{4.2003, 4.1965, 4.2041}, true});
    figure.columns[1].rows.push_back({"pooled", "curve fit", ShownValue{0.04512, 0.0444, 0.0459}, true});
    return figure;
}

AutocorrelationFigure autocorrelation() {
    AutocorrelationFigure figure{{1.0}, 0.06};
    Noise noise(5);
    for (int lag = 1; lag <= 40; ++lag)
        figure.values.push_back(0.5 * std::pow(0.7, lag) * std::cos(0.5 * lag) + 0.05 * noise());
    return figure;
}

CourseFigure course() {
    CourseFigure figure{"displacement", "mm", {}, {}, {}, {}, "viscous+friction", {}, {}, {}, {}};
    const auto law = [](double amplitude) { return 0.04 + 0.03 / (0.5 + amplitude); };
    Noise noise(13);
    for (int i = 0; i < 7; ++i) {
        const double a = 10.0 * std::pow(0.62, i), u = 0.0008 + 0.002 / (1.0 + a);
        const double ratio = law(a) + 0.7 * u * noise();
        figure.amplitude.push_back(a);
        figure.damping_ratio.push_back(ratio);
        figure.low.push_back(ratio - 2.0 * u);
        figure.high.push_back(ratio + 2.0 * u);
    }
    for (int i = 0; i < 40; ++i) {
        const double a = 12.0 * std::pow(0.92, i);
        figure.model_amplitude.push_back(a);
        figure.model_damping_ratio.push_back(law(a));
        figure.model_low.push_back(law(a) - 0.001);
        figure.model_high.push_back(law(a) + 0.001);
    }
    return figure;
}

VerdictFigure verdict() {
    JudgedValue damping{"damping ratio", "1", {0.281, 0.272, 0.290}, 0.22, 0.34, 0.229, 0.331, "conforms"};
    JudgedValue stiffness{"stiffness", "N/m",      {3330.0, 3290.0, 3370.0}, 2852.0, 3348.0, 2892.0,
                          3308.0,      "undecided"};
    JudgedValue frequency{"natural frequency", "Hz", {3.82, 3.78, 3.86}, 4.0,
                          std::nullopt,        4.04, std::nullopt,       "does_not_conform"};
    return {{damping, stiffness, frequency}};
}

ChartFigure chart() {
    ChartFigure figure{"damping ratio", "1", {}, 0.281, 0.268, 0.294, 0.26, 0.31};
    Noise noise(17);
    for (int i = 0; i < 26; ++i) {
        const double value = i == 19 ? 0.299 : 0.281 + 0.007 * noise();
        figure.points.push_back({"2031-04-" + std::string(i < 9 ? "0" : "") + std::to_string(i + 1),
                                 {value, value - 0.004, value + 0.004},
                                 i == 19});
    }
    return figure;
}

ComparisonFigure comparison() {
    return {{{"damping ratio", "1", {0.181, 0.172, 0.190}, {0.283, 0.275, 0.291}, ShownValue{0.564}, true},
             {"stiffness",
              "N/m",
              {3110.0, 3070.0, 3150.0},
              {3095.0, 3060.0, 3130.0},
              ShownValue{-0.005},
              false}}};
}

GaugeFigure gauge() {
    GaugeFigure figure{"damping ratio", "1", {}, {}};
    Noise noise(23);
    for (int article = 0; article < 6; ++article)
        for (int who = 0; who < 3; ++who) {
            GaugeReading reading{
                "S2-0" + std::to_string(411 + article), std::string("bench ") + char('A' + who), {}};
            for (int i = 0; i < 3; ++i)
                reading.values.push_back(0.25 + 0.02 * article + 0.004 * who + 0.004 * noise());
            figure.readings.push_back(reading);
        }
    figure.shares = {{"articles", 0.912}, {"repeatability", 0.061}, {"reproducibility", 0.027}};
    return figure;
}

}  // namespace

DecayFigure decay(double rate_hz, double duration_s, double frequency_hz) {
    DecayFigure figure{"displacement", "mm", {}, {}, {}, {}, {}, {}};
    Noise noise(1);
    const auto count = static_cast<std::size_t>(rate_hz * duration_s);
    for (std::size_t i = 0; i < count; ++i) {
        const double t = static_cast<double>(i) / rate_hz;
        const double envelope = 11.5 * std::exp(-0.045 * two_pi * frequency_hz * t);
        const double fitted = 1.0 + envelope * std::cos(two_pi * frequency_hz * t);
        const double residual = 0.05 * noise();
        figure.time_s.push_back(2.0 + t);
        figure.fitted.push_back(fitted);
        figure.observed.push_back(fitted + residual);
        figure.envelope_high.push_back(1.0 + envelope);
        figure.envelope_low.push_back(1.0 - envelope);
        figure.residual.push_back(residual);
    }
    return figure;
}

std::vector<NamedFigure> one_of_each() {
    return {{"recording", "The whole recording", "", recording()},
            {"decay-1", "Event 1", "", decay(1000.0, 4.5)},
            {"decrement-1", "Logarithmic decrement of event 1", "", decrement()},
            {"spectrum-1", "Spectrum of event 1", "", spectrum()},
            {"methods", "The three methods", "", methods()},
            {"autocorrelation-1", "What the fit leaves", "", autocorrelation()},
            {"course-1", "Damping against amplitude", "", course()},
            {"verdict", "The verdict", "", verdict()},
            {"chart", "Control chart", "", chart()},
            {"comparison", "Before and after", "", comparison()},
            {"gauge", "Gauge study", "", gauge()}};
}

}  // namespace ringwright::samples
