// Figures over time: the whole recording, one decay with its residuals.

#include <algorithm>
#include <cmath>

#include "drawing/kinds.hpp"

namespace ringwright::drawing {
namespace {

/// Sparse samples are shown as dots, dense ones as a line.
bool sparse(std::size_t count, const Rect& frame) {
    return static_cast<double>(count) < 0.4 * frame.width;
}

void draw_envelope(Panel& panel, const SampleEnvelope& signal) {
    const std::size_t columns = signal.low.size();
    if (columns == 0) return;
    const double step = (signal.end_s - signal.begin_s) / static_cast<double>(columns);
    std::vector<double> x, y;
    std::size_t empty_run = 0;
    for (std::size_t i = 0; i < columns; ++i) {
        if (!std::isfinite(signal.low[i])) {
            // A few empty columns are the spacing of the samples; more are a gap in time.
            if (++empty_run == 4) x.push_back(NAN), y.push_back(NAN);
            continue;
        }
        empty_run = 0;
        const double middle = signal.begin_s + (static_cast<double>(i) + 0.5) * step;
        const bool rising = !y.empty() && y.back() < 0.5 * (signal.low[i] + signal.high[i]);
        x.insert(x.end(), {middle, middle});
        y.push_back(rising ? signal.low[i] : signal.high[i]);
        y.push_back(rising ? signal.high[i] : signal.low[i]);
    }
    panel.curve(x, y, {palette::fitted, 0.7, Dash::solid});
}

void draw_events(Canvas& canvas, Panel& panel, const std::vector<EventMark>& events) {
    const double size = canvas.font_size();
    double free_from = -1.0;
    for (const EventMark& event : events) {
        const double left = panel.place(std::max(event.begin_s, panel.x_axis().low), panel.y_axis().low).x;
        const double right = panel.place(std::min(event.end_s, panel.x_axis().high), panel.y_axis().low).x;
        const double above = panel.frame().top - 0.25 * size;
        canvas.line({left, above}, {std::max(right, left + 1.0), above}, {palette::accent, 2.0, Dash::solid});
        if (left < free_from) continue;
        canvas.text(event.label, {left, above - 0.75 * size}, {0.92 * size, palette::accent});
        free_from = left + canvas.text_width(event.label, 0.92 * size) + 0.4 * size;
    }
}

Axis signal_axis(const Range& range, const std::string& name, const std::string& unit, int count) {
    return linear_axis(range.low, range.high, axis_label(name, unit), count, 0.06);
}

void draw_decay_curves(Canvas& canvas, Panel& panel, const DecayFigure& figure) {
    const Stroke observed{palette::observed, 2.4, Dash::solid}, fitted{palette::fitted, 0.9, Dash::solid};
    const Stroke envelope{palette::accent, 1.0, Dash::dashed};
    const bool dots = sparse(figure.time_s.size(), panel.frame());
    if (dots)
        panel.marks(figure.time_s, figure.observed, Mark::disc, 1.7, palette::observed);
    else
        panel.curve(figure.time_s, figure.observed, observed);
    panel.curve(figure.time_s, figure.fitted, fitted);
    panel.curve(figure.time_s, figure.envelope_high, envelope);
    panel.curve(figure.time_s, figure.envelope_low, envelope);
    std::vector<KeyEntry> key{{"recorded", observed, false, dots, Mark::disc}};
    if (!figure.fitted.empty()) key.push_back({"fitted decay", fitted, false, false, Mark::disc});
    if (!figure.envelope_high.empty()) key.push_back({"its envelope", envelope, false, false, Mark::disc});
    draw_key(canvas, key, panel);
}

/// The envelope is seen as far as it stays near the samples.
void include_envelope(Range& values, const DecayFigure& figure) {
    Range envelope;
    envelope.include(figure.envelope_low);
    envelope.include(figure.envelope_high);
    if (values.empty || envelope.empty) return;
    const double reach = 0.15 * (values.high - values.low);
    values = {std::max(std::min(envelope.low, values.low), values.low - reach),
              std::min(std::max(envelope.high, values.high), values.high + reach), false};
}

void draw_residuals(Canvas& canvas, const DecayFigure& figure, Rect frame, Axis x) {
    Range range;
    range.include(figure.residual);
    const double size = std::max(std::abs(range.low), std::abs(range.high));
    Axis y = linear_axis(-size, size, axis_label("recorded − fitted", figure.unit), 4, 0.1);
    Panel panel(canvas, frame, std::move(x), std::move(y));
    panel.level(0.0, {palette::frame, 0.7, Dash::solid});
    if (sparse(figure.time_s.size(), frame))
        panel.marks(figure.time_s, figure.residual, Mark::disc, 1.3, palette::observed);
    else
        panel.curve(figure.time_s, figure.residual, {palette::observed, 0.8, Dash::solid});
    panel.close();
}

}  // namespace

void draw(Canvas& canvas, const RecordingFigure& figure) {
    Range range;
    range.include(figure.signal.low);
    range.include(figure.signal.high);
    const Axis x = linear_axis(figure.signal.begin_s, figure.signal.end_s, "time in s", 8);
    const Axis y = signal_axis(range, figure.signal_name, figure.unit, 5);
    const double room = figure.events.empty() ? 0.0 : 1.2 * canvas.font_size();
    Rect frame = frame_within(canvas, {0, 0, canvas.width(), canvas.height()}, x, y);
    frame.top += room;
    frame.height -= room;
    // The name of the axis moves up to leave its row to the marks of the events.
    Axis nameless = y;
    nameless.label.clear();
    const double size = canvas.font_size();
    canvas.text(y.label, {frame.left, frame.top - room - 0.95 * size}, {size, palette::ink});
    if (!figure.events.empty())
        draw_key(canvas, {{"analysed", {palette::accent, 2.0, Dash::solid}, false, false, Mark::disc}},
                 frame.right(), frame.top - room - 0.95 * size);
    for (const EventMark& event : figure.events) {
        const double span = x.high - x.low;
        const double left = frame.left + frame.width * std::clamp((event.begin_s - x.low) / span, 0.0, 1.0);
        const double right = frame.left + frame.width * std::clamp((event.end_s - x.low) / span, 0.0, 1.0);
        canvas.fill({left, frame.top, right - left, frame.height}, palette::shade);
    }
    Panel panel(canvas, frame, x, nameless);
    draw_envelope(panel, figure.signal);
    draw_events(canvas, panel, figure.events);
    panel.close();
}

void draw(Canvas& canvas, const DecayFigure& figure) {
    Range times, values;
    times.include(figure.time_s);
    values.include(figure.observed);
    values.include(figure.fitted);
    include_envelope(values, figure);
    const bool with_residuals = !figure.residual.empty();
    const double size = canvas.font_size(), residual_height = with_residuals ? 8.2 * size : 0.0;
    Axis x = linear_axis(times.low, times.high, "time in s", 8);
    const Axis y = signal_axis(values, figure.signal_name, figure.unit, 5);
    Range left;
    left.include(figure.residual);
    const Axis residual = linear_axis(left.low, left.high, "r", 3, 0.1);
    Rect main = frame_within(canvas, {0, 0, canvas.width(), canvas.height()}, x, y);
    const double shift = std::max(0.0, label_width(canvas, residual) + 0.8 * size - label_width(canvas, y));
    main.left += shift;
    main.width -= shift;
    const Rect lower{main.left, main.bottom() - residual_height + 1.9 * size, main.width,
                     residual_height - 1.9 * size};
    if (with_residuals) main.height -= residual_height + 0.6 * size;
    Axis upper = x;
    if (with_residuals) {
        upper.label.clear();
        for (Tick& tick : upper.ticks) tick.label.clear();
    }
    Panel panel(canvas, main, upper, y);
    draw_decay_curves(canvas, panel, figure);
    panel.close();
    if (with_residuals) draw_residuals(canvas, figure, lower, x);
}

}  // namespace ringwright::drawing
