#pragma once
// The figures of a result: what each needs, as plain values, and the drawing of one as SVG, PDF or PNG.
//
// A figure holds values in the unit that its axis names; nothing is converted while drawing.

#include <cstddef>
#include <limits>
#include <optional>
#include <string>
#include <string_view>
#include <variant>
#include <vector>

#include "ringwright/analysis.hpp"
#include "ringwright/estimate.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// Lowest and highest sample in each of a number of equally long stretches of time, so that no spike is lost
/// however many samples lie under one column of a picture. `low` and `high` are equally long; a column with
/// no sample (a gap) holds NaN in both.
struct SampleEnvelope {
    double begin_s = 0.0, end_s = 0.0;
    std::vector<double> low, high;
};
/// The envelope of the whole recording in `columns` (≥ 1) columns, each value divided by `unit_factor`.
[[nodiscard]] SampleEnvelope envelope_of(const Recording& recording, std::size_t columns,
                                         double unit_factor = 1.0);

/// A value with its interval as a figure shows it. `interval` may be absent (NaN ends).
struct ShownValue {
    double value = 0.0;
    double low = std::numeric_limits<double>::quiet_NaN();
    double high = std::numeric_limits<double>::quiet_NaN();
};

struct EventMark {
    double begin_s = 0.0, end_s = 0.0;
    std::string label;  ///< "1", "2" …
};

/// The whole recording with the stretches that were analysed.
struct RecordingFigure {
    SampleEnvelope signal;
    std::string signal_name, unit;
    std::vector<EventMark> events;
};

/// One event: samples, fitted decay with its envelope, residuals below on the same time axis.
struct DecayFigure {
    std::string signal_name, unit;
    std::vector<double> time_s, observed, fitted, envelope_low, envelope_high, residual;
};

/// Half the peak-to-peak swing against cycle number on a logarithmic scale, with the straight line.
struct DecrementFigure {
    std::string signal_name, unit;
    std::vector<double> cycle, amplitude, line;  ///< amplitudes > 0; `line` may be empty
};

/// Magnitude around the mode with the half-power points.
struct SpectrumFigure {
    std::vector<double> frequency_hz, magnitude;      ///< magnitude relative to its peak, 0 … 1
    double low_hz = 0.0, high_hz = 0.0, level = 0.0;  ///< half-power points; 0: not found
};

/// One row of the figure of the three methods.
struct MethodRow {
    std::string group;   ///< "event 1", "pooled"; rows of one group stand together
    std::string method;  ///< "logarithmic decrement" …
    std::optional<ShownValue> value;
    bool result = false;  ///< this is the answer
};
struct MethodColumn {
    std::string quantity, unit;
    std::vector<MethodRow> rows;
};
/// The three methods with their intervals on one scale, a column for each quantity; equally many rows each.
struct MethodsFigure {
    std::vector<MethodColumn> columns;
};

struct AutocorrelationFigure {
    std::vector<double> values;  ///< lags 0, 1, …
    double band = 0.0;           ///< half-width of the band in which white noise stays
};

/// Damping ratio against amplitude: stretches of the decay with their intervals, and the fitted model.
struct CourseFigure {
    std::string signal_name, unit;
    std::vector<double> amplitude, damping_ratio, low, high;
    std::string model;  ///< what the curve is called; empty: "fit"
    std::vector<double> model_amplitude, model_damping_ratio, model_low, model_high;
};

/// One limit of a verdict: value, interval, limits, and the acceptance limits where a guard band is kept.
struct JudgedValue {
    std::string quantity, unit;
    ShownValue value;
    std::optional<double> lower_limit, upper_limit;
    std::optional<double> lower_acceptance, upper_acceptance;
    std::string decision;  ///< "conforms", "does_not_conform", "undecided"
};
struct VerdictFigure {
    std::vector<JudgedValue> values;
};

struct ChartPoint {
    std::string label;  ///< date or number of the entry
    ShownValue value;
    bool flagged = false;
};
/// A control chart, or the history of one article (then without control limits, perhaps with specification
/// limits).
struct ChartFigure {
    std::string quantity, unit;
    std::vector<ChartPoint> points;
    std::optional<double> centre, lower_control, upper_control, lower_limit, upper_limit;
};

struct ComparedValue {
    std::string quantity, unit;
    ShownValue before, after;
    std::optional<ShownValue> change;  ///< relative change, 1
    bool changed = false;
};
struct ComparisonFigure {
    std::vector<ComparedValue> values;
};

/// A gauge study: what each article measured, by operator, and how the variation divides.
struct GaugeReading {
    std::string article, operator_name;
    std::vector<double> values;
};
struct GaugeShare {
    std::string source;
    double share = 0.0;  ///< of the total variation, 0 … 1
};
struct GaugeFigure {
    std::string quantity, unit;
    std::vector<GaugeReading> readings;
    std::vector<GaugeShare> shares;
};

using Figure = std::variant<RecordingFigure, DecayFigure, DecrementFigure, SpectrumFigure, MethodsFigure,
                            AutocorrelationFigure, CourseFigure, VerdictFigure, ChartFigure, ComparisonFigure,
                            GaugeFigure>;

/// A figure with the name that `--figure` takes ("methods", "verdict", "recording-1", "decay-1" for the first
/// release, "decrement-1" …), a title and a sentence that says what is seen.
struct NamedFigure {
    std::string name, title, caption;
    Figure figure;
};

/// The figures of an identification, in the order of the report. Needs the samples of the recordings and
/// their decay pictures (IdentifyOptions::pictures); a figure whose data is absent is left out.
[[nodiscard]] std::vector<NamedFigure> figures_of(const Identification& identification);

enum class ImageFormat { svg, pdf, png };
/// The format that a file name asks for by its ending, in any case; nothing when it is none of these.
[[nodiscard]] std::optional<ImageFormat> image_format_of(std::string_view file_name);

/// Points (1/72 inch). A height of 0 lets the figure choose. PNG is drawn at `pixels_per_point`.
struct FigureSize {
    double width = 480.0;
    double height = 0.0;
    double font = 9.0;
    double margin = 8.0;  ///< white around the figure, on top of width and height
    double pixels_per_point = 3.0;
};

/// The bytes of one figure. The same figure gives the same bytes. Throws OutputError when PLplot's
/// external-Cairo device is not installed or Cairo cannot draw.
[[nodiscard]] std::string draw_figure(const Figure& figure, ImageFormat format, const FigureSize& size = {});

}  // namespace ringwright
