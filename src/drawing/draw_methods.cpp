// Figures of the three methods: decrement, spectrum, all three on one scale, noise check, course of damping.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "drawing/kinds.hpp"

namespace ringwright::drawing {
namespace {

Rect whole(const Canvas& canvas) {
    return {0.0, 0.0, canvas.width(), canvas.height()};
}

Panel framed(Canvas& canvas, const Axis& x, const Axis& y) {
    return {canvas, frame_within(canvas, whole(canvas), x, y), x, y};
}

}  // namespace

void draw(Canvas& canvas, const DecrementFigure& figure) {
    Range cycles, amplitudes;
    cycles.include(figure.cycle);
    amplitudes.include(figure.amplitude);
    const Axis x = linear_axis(std::min(0.0, cycles.low), cycles.high, "cycle number", 8, 0.02);
    const Axis y = logarithmic_axis(amplitudes.empty ? 1.0 : amplitudes.low, amplitudes.high,
                                    axis_label("amplitude", figure.unit));
    Panel panel = framed(canvas, x, y);
    const Stroke line{palette::fitted, 1.3, Dash::solid};
    panel.curve(figure.cycle, figure.line, line);
    const double radius = figure.cycle.size() > 120 ? 1.4 : 2.2;
    panel.marks(figure.cycle, figure.amplitude, Mark::ring, radius, palette::ink);
    panel.close();
    std::vector<KeyEntry> key{{"swings used", {palette::ink, 1.0, Dash::solid}, false, true, Mark::ring}};
    if (!figure.line.empty()) key.push_back({"straight line", line, false, false, Mark::disc});
    draw_key(canvas, key, panel);
}

void draw(Canvas& canvas, const SpectrumFigure& figure) {
    Range frequencies, magnitudes;
    frequencies.include(figure.frequency_hz);
    magnitudes.include(figure.magnitude);
    const Axis x = linear_axis(frequencies.low, frequencies.high, "frequency in Hz", 7);
    const Axis y = linear_axis(0.0, magnitudes.high * 1.08, "magnitude / peak", 5);
    Panel panel = framed(canvas, x, y);
    const bool found = figure.low_hz > 0.0 && figure.high_hz > figure.low_hz;
    if (found) {
        panel.block(figure.low_hz, figure.high_hz, 0.0, figure.level, palette::band);
        panel.level(figure.level, {palette::accent, 0.9, Dash::dashed});
    }
    panel.curve(figure.frequency_hz, figure.magnitude, {palette::fitted, 1.3, Dash::solid});
    if (found) {
        panel.marks({figure.low_hz, figure.high_hz}, {figure.level, figure.level}, Mark::disc, 2.6,
                    palette::accent);
        draw_key(canvas,
                 {{"half-power points", {palette::accent, 1.0, Dash::solid}, false, true, Mark::disc}},
                 panel);
    }
    panel.close();
}

void draw(Canvas& canvas, const AutocorrelationFigure& figure) {
    // Lag 0 is 1 whatever the noise, so it is left out and the rest fills the frame.
    Range values;
    for (std::size_t lag = 1; lag < figure.values.size(); ++lag) values.include(figure.values[lag]);
    values.include(-2.0 * figure.band);
    values.include(2.0 * figure.band);
    const double last = static_cast<double>(std::max<std::size_t>(figure.values.size(), 3) - 1);
    const Axis x = linear_axis(1.0 - 0.02 * last, 1.02 * last, "lag", 8);
    const Axis y = linear_axis(values.low, values.high, "autocorrelation", 5, 0.04);
    Panel panel = framed(canvas, x, y);
    panel.block(x.low, x.high, -figure.band, figure.band, palette::band);
    panel.level(0.0, {palette::frame, 0.8, Dash::solid});
    for (std::size_t lag = 1; lag < figure.values.size(); ++lag) {
        const double at = static_cast<double>(lag);
        panel.curve({at, at}, {0.0, figure.values[lag]}, {palette::ink, 1.0, Dash::solid});
        if (figure.values.size() <= 80)
            canvas.mark(Mark::disc, panel.place(at, figure.values[lag]), 1.5, palette::ink);
    }
    panel.close();
    draw_key(canvas, {{"95 % of white noise", {palette::band, 1.0, Dash::solid}, true, false, Mark::disc}},
             panel);
}

namespace {

constexpr Stroke interval_of_stretch{palette::ink, 1.0, Dash::solid};

Range ratios_of(const CourseFigure& figure) {
    Range ratios, wide;
    ratios.include(figure.damping_ratio);
    ratios.include(figure.model_damping_ratio);
    wide = ratios;
    wide.include(figure.low);
    wide.include(figure.high);
    // An interval that is much wider than the course itself would flatten it.
    const double reach = 1.5 * std::max(ratios.high - ratios.low, 0.1 * std::abs(ratios.high));
    Range shown;
    shown.include(std::max(wide.low, ratios.low - reach));
    shown.include(std::min(wide.high, ratios.high + reach));
    // What hardly changes is to look so: a tenth of it above and below at least.
    const double middle = 0.5 * (ratios.low + ratios.high);
    shown.include(0.9 * middle);
    shown.include(1.1 * middle);
    // From zero, where that costs less than half of the picture.
    if (shown.low > 0.0 && shown.low < shown.high - shown.low) shown.include(0.0);
    return shown;
}

/// "fit: viscous + friction".
std::string fit_name(const std::string& model) {
    std::string name = model.empty() ? "fit" : "fit: ";
    for (const char letter : model) {
        const bool plus = letter == '+';
        name.append(plus ? " + " : std::string(1, letter));
    }
    return name;
}

void draw_stretches(Canvas& canvas, Panel& panel, const CourseFigure& figure) {
    const auto inside = [&](double ratio) {
        return std::clamp(ratio, panel.y_axis().low, panel.y_axis().high);
    };
    const std::size_t count = std::min(figure.amplitude.size(), figure.damping_ratio.size());
    for (std::size_t i = 0; i < count; ++i) {
        if (i < figure.low.size() && i < figure.high.size()) {
            const Point low = panel.place(figure.amplitude[i], inside(figure.low[i]));
            const Point high = panel.place(figure.amplitude[i], inside(figure.high[i]));
            canvas.line(low, high, interval_of_stretch);
            // An end beyond the frame has no cap.
            if (figure.low[i] >= panel.y_axis().low)
                canvas.line({low.x - 2.4, low.y}, {low.x + 2.4, low.y}, interval_of_stretch);
            if (figure.high[i] <= panel.y_axis().high)
                canvas.line({high.x - 2.4, high.y}, {high.x + 2.4, high.y}, interval_of_stretch);
        }
        canvas.mark(Mark::disc, panel.place(figure.amplitude[i], inside(figure.damping_ratio[i])), 1.9,
                    palette::ink);
    }
}

}  // namespace

void draw(Canvas& canvas, const CourseFigure& figure) {
    Range amplitudes;
    amplitudes.include(figure.amplitude);
    amplitudes.include(figure.model_amplitude);
    const Range ratios = ratios_of(figure);
    const Axis x = logarithmic_axis(amplitudes.empty ? 1.0 : amplitudes.low, amplitudes.high,
                                    axis_label("amplitude", figure.unit), 0.06);
    const Axis y = linear_axis(ratios.low, ratios.high, "damping ratio", 5, 0.05);
    Panel panel = framed(canvas, x, y);
    const Stroke line{palette::fitted, 1.3, Dash::solid};
    if (figure.model_low.size() == figure.model_amplitude.size())
        panel.area(figure.model_amplitude, figure.model_low, figure.model_high, palette::band);
    panel.curve(figure.model_amplitude, figure.model_damping_ratio, line);
    draw_stretches(canvas, panel, figure);
    panel.close();
    std::vector<KeyEntry> key;
    if (!figure.amplitude.empty()) key.push_back({"stretch", interval_of_stretch, false, true, Mark::disc});
    if (!figure.model_amplitude.empty())
        key.push_back({fit_name(figure.model), line, false, false, Mark::disc});
    draw_key(canvas, key, panel);
}

namespace {

constexpr double method_row_height = 1.55;  // of the font size

/// Rows from the top: their names at the left, once for each group.
struct RowNames {
    double width = 0.0;
    double group_width = 0.0;
};

RowNames row_names(Canvas& canvas, const MethodColumn& column) {
    const double size = canvas.font_size();
    RowNames names;
    double method_width = 0.0;
    for (const MethodRow& row : column.rows) {
        names.group_width =
            std::max(names.group_width,
                     canvas.text_width(row.group, size, row.result ? Weight::bold : Weight::normal));
        method_width = std::max(method_width, canvas.text_width(row.method, size));
    }
    names.group_width += 0.8 * size;
    names.width = names.group_width + method_width + 0.8 * size;
    return names;
}

Mark mark_of(const std::string& method) {
    if (method.starts_with("log")) return Mark::square;
    if (method.starts_with("half")) return Mark::triangle;
    return Mark::disc;
}

void draw_row_names(Canvas& canvas, const MethodColumn& column, const RowNames& names, double top,
                    double row_height) {
    const double size = canvas.font_size();
    std::string last;
    for (std::size_t i = 0; i < column.rows.size(); ++i) {
        const MethodRow& row = column.rows[i];
        const double middle = top + (static_cast<double>(i) + 0.5) * row_height;
        const Weight weight = row.result ? Weight::bold : Weight::normal;
        if (row.group != last) {
            if (i > 0)
                canvas.line({0.0, middle - 0.5 * row_height}, {names.width, middle - 0.5 * row_height},
                            {palette::grid, 0.7, Dash::solid});
            canvas.text(row.group, {0.0, middle}, {size, palette::ink, Anchor::start, weight, 0.0});
        }
        canvas.text(row.method, {names.group_width, middle},
                    {size, row.result ? palette::ink : palette::muted, Anchor::start, weight, 0.0});
        last = row.group;
    }
}

Axis scale_of(const MethodColumn& column, int count) {
    Range tight, wide;
    for (const MethodRow& row : column.rows) {
        if (!row.value) continue;
        tight.include(row.value->value);
        wide.include(row.value->low);
        wide.include(row.value->high);
        if (row.result) tight.include(row.value->low), tight.include(row.value->high);
    }
    // One very wide interval must not shrink all others to dots: it is cut at the frame, with an arrow.
    const double reach = 3.0 * std::max(tight.high - tight.low, 1e-9 * std::abs(tight.high));
    const double low = wide.empty ? tight.low : std::max(std::min(wide.low, tight.low), tight.low - reach);
    const double high =
        wide.empty ? tight.high : std::min(std::max(wide.high, tight.high), tight.high + reach);
    return linear_axis(low, high, axis_label(column.quantity, column.unit), count, 0.06);
}

void draw_interval(Canvas& canvas, const Panel& panel, const ShownValue& shown, double y,
                   const Stroke& stroke) {
    if (!std::isfinite(shown.low) || !std::isfinite(shown.high)) return;
    const Axis& x = panel.x_axis();
    const double low = std::max(shown.low, x.low), high = std::min(shown.high, x.high);
    const double from = panel.place(low, 0.0).x, to = panel.place(high, 0.0).x;
    canvas.line({from, y}, {to, y}, stroke);
    const double cap = 2.4;
    const auto end = [&](double at, bool cut, double direction) {
        if (!cut) {
            canvas.line({at, y - cap}, {at, y + cap}, stroke);
            return;
        }
        canvas.line({at - 3.0 * direction, y - cap}, {at, y}, stroke);
        canvas.line({at - 3.0 * direction, y + cap}, {at, y}, stroke);
    };
    end(from, shown.low < x.low, -1.0);
    end(to, shown.high > x.high, 1.0);
}

void draw_method_column(Canvas& canvas, const MethodColumn& column, const Rect& frame) {
    Axis rows{0.0, std::max(1.0, static_cast<double>(column.rows.size())), false, "", {}};
    const int count = std::clamp(static_cast<int>(frame.width / (5.5 * canvas.font_size())), 2, 5);
    Panel panel(canvas, frame, scale_of(column, count), rows);
    std::string last;
    for (std::size_t i = 0; i < column.rows.size(); ++i) {
        const MethodRow& row = column.rows[i];
        const double number = static_cast<double>(column.rows.size() - i);
        if (i > 0 && row.group != last) panel.level(number, {palette::grid, 0.7, Dash::solid});
        last = row.group;
        if (!row.value) continue;
        if (row.result && std::isfinite(row.value->low) && std::isfinite(row.value->high))
            panel.block(row.value->low, row.value->high, rows.low, rows.high, palette::band);
    }
    for (std::size_t i = 0; i < column.rows.size(); ++i) {
        const MethodRow& row = column.rows[i];
        const double y = panel.place(panel.x_axis().low, static_cast<double>(column.rows.size() - i) - 0.5).y;
        if (!row.value) {
            canvas.text("does not apply", {frame.left + 0.5 * frame.width, y},
                        {0.88 * canvas.font_size(), palette::muted, Anchor::middle});
            continue;
        }
        const Colour colour = row.result ? palette::fitted : palette::ink;
        draw_interval(canvas, panel, *row.value, y, {colour, row.result ? 1.8 : 1.1, Dash::solid});
        const Point at{panel.place(row.value->value, 0.0).x, y};
        if (at.x >= frame.left && at.x <= frame.right())
            canvas.mark(row.result ? Mark::diamond : mark_of(row.method), at, row.result ? 3.2 : 2.4, colour);
    }
    panel.close();
}

}  // namespace

void draw(Canvas& canvas, const MethodsFigure& figure) {
    if (figure.columns.empty()) return;
    const double size = canvas.font_size(), row_height = method_row_height * size;
    const RowNames names = row_names(canvas, figure.columns.front());
    const auto count = static_cast<double>(figure.columns.size());
    const double top = 0.6 * size, gap = 1.4 * size;
    const double height = row_height * static_cast<double>(figure.columns.front().rows.size());
    const double width = (canvas.width() - names.width - 0.9 * size - (count - 1.0) * gap) / count;
    draw_row_names(canvas, figure.columns.front(), names, top, row_height);
    double left = names.width;
    for (const MethodColumn& column : figure.columns) {
        draw_method_column(canvas, column, {left, top, width, height});
        left += width + gap;
    }
}

}  // namespace ringwright::drawing
