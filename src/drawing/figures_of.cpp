// The figures that need the samples, out of an identification in memory.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "ringwright/figures.hpp"

namespace ringwright {
namespace {

/// What the samples are called and shown in on an axis.
struct SignalNames {
    std::string name, unit;
    double factor = 1.0;  ///< SI, or as recorded, in one unit of the axis
};

SignalNames names_of(const Recording& recording) {
    SignalNames names{recording.quantity_known ? std::string(to_text(recording.quantity)) : "signal",
                      recording.unit.symbol, recording.scaled ? recording.unit.si_factor : 1.0};
    std::ranges::replace(names.name, '-', ' ');
    if (!(names.factor > 0.0)) names.factor = 1.0;
    return names;
}

std::vector<double> scaled(const std::vector<double>& values, double factor) {
    std::vector<double> result(values.size());
    std::ranges::transform(values, result.begin(), [&](double value) { return value / factor; });
    return result;
}

Figure recording_figure(const RecordingIdentification& identified, const SignalNames& names,
                        std::size_t first_number) {
    constexpr std::size_t columns = 960;
    RecordingFigure figure{
        envelope_of(identified.recording, columns, names.factor), names.name, names.unit, {}};
    for (const EventIdentification& event : identified.events)
        figure.events.push_back({event.start_s, event.end_s, fmt::format("{}", first_number++)});
    return figure;
}

Figure decay_figure(const DecayPicture& picture, const SignalNames& names) {
    DecayFigure figure{names.name,
                       names.unit,
                       picture.time_s,
                       scaled(picture.observed, names.factor),
                       scaled(picture.fitted, names.factor),
                       {},
                       scaled(picture.envelope, names.factor),
                       scaled(picture.residual, names.factor)};
    for (const double high : picture.envelope)
        figure.envelope_low.push_back((2.0 * picture.offset - high) / names.factor);
    return figure;
}

Figure decrement_figure(const DecayPicture& picture, const SignalNames& names) {
    DecrementFigure figure{names.name, names.unit, {}, {}, {}};
    // The logarithm is of the difference of two extremes, which is twice the swing.
    for (std::size_t i = 0; i < picture.half_cycle.size(); ++i) {
        figure.cycle.push_back(0.5 * picture.half_cycle[i]);
        figure.amplitude.push_back(0.5 * std::exp(picture.log_amplitude[i]) / names.factor);
        if (i < picture.log_amplitude_line.size())
            figure.line.push_back(0.5 * std::exp(picture.log_amplitude_line[i]) / names.factor);
    }
    return figure;
}

Figure course_figure(const EventIdentification& event, const SignalNames& names) {
    const DecayPicture& picture = event.picture;
    return CourseFigure{names.name,
                        names.unit,
                        scaled(picture.course_amplitude, names.factor),
                        picture.course_damping_ratio,
                        picture.course_low,
                        picture.course_high,
                        event.curve_fit.model,
                        scaled(picture.model_amplitude, names.factor),
                        picture.model_damping_ratio,
                        picture.model_low,
                        picture.model_high};
}

void add_release(std::vector<NamedFigure>& figures, const EventIdentification& event,
                 const SignalNames& names, std::size_t number) {
    const DecayPicture& picture = event.picture;
    const auto add = [&](const char* name, const char* title, const char* caption, Figure figure) {
        figures.push_back({fmt::format("{}-{}", name, number), fmt::format("{}, release {}", title, number),
                           caption, std::move(figure)});
    };
    if (!picture.time_s.empty())
        add("decay", "Recorded and fitted decay",
            "Samples, fitted decay and its envelope; below, what the fit leaves.",
            decay_figure(picture, names));
    if (!picture.half_cycle.empty())
        add("decrement", "Logarithmic decrement",
            "Swings on a logarithmic scale: a constant damping is a straight line.",
            decrement_figure(picture, names));
    if (!picture.frequency_hz.empty())
        add("spectrum", "Half-power bandwidth", "Spectrum around the mode with its half-power points.",
            SpectrumFigure{picture.frequency_hz, picture.spectrum, picture.half_power_low_hz,
                           picture.half_power_high_hz, picture.half_power_level});
    if (picture.residual_autocorrelation.size() > 1)
        add("autocorrelation", "What the noise model leaves",
            "Inside the band the intervals rest on an adequate noise model.",
            AutocorrelationFigure{picture.residual_autocorrelation, picture.residual_autocorrelation_band});
    if (picture.course_amplitude.size() > 1 || picture.model_amplitude.size() > 1)
        add("course", "Damping against amplitude",
            "Stretches of the decay, each as a viscous decay of its own, beside what was fitted to the "
            "whole.",
            course_figure(event, names));
}

}  // namespace

std::vector<NamedFigure> figures_of(const Identification& identification) {
    std::vector<NamedFigure> figures;
    std::size_t number = 0, recording_number = 0;
    for (const RecordingIdentification& identified : identification.recordings) {
        const SignalNames names = names_of(identified.recording);
        ++recording_number;
        if (!identified.recording.samples.empty())
            figures.push_back({fmt::format("recording-{}", recording_number),
                               identification.recordings.size() == 1
                                   ? "The whole recording"
                                   : fmt::format("The whole of recording {}", recording_number),
                               "The marked stretches were analysed.",
                               recording_figure(identified, names, number + 1)});
        for (const EventIdentification& event : identified.events)
            add_release(figures, event, names, ++number);
    }
    return figures;
}

}  // namespace ringwright
