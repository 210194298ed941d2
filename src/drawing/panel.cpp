#include <plplot/plplot.h>

#include <algorithm>
#include <cmath>

#include "drawing/canvas.hpp"

namespace ringwright::drawing {
namespace {

void set_plplot_pen(Colour colour, double width) {
    plscol0(1, colour.red, colour.green, colour.blue);
    plcol0(1);
    plwidth(width);
}

double on_scale(const Axis& axis, double value) {
    return axis.logarithmic ? std::log10(value) : value;
}

std::vector<double> on_scale(const Axis& axis, const std::vector<double>& values) {
    std::vector<double> scaled(values.size());
    std::ranges::transform(values, scaled.begin(), [&](double value) { return on_scale(axis, value); });
    return scaled;
}

double share_of(const Axis& axis, double value) {
    const double low = on_scale(axis, axis.low);
    return (on_scale(axis, value) - low) / (on_scale(axis, axis.high) - low);
}

double within(const Axis& axis, double value) {
    return std::clamp(value, axis.low, axis.high);
}

}  // namespace

Panel::Panel(Canvas& canvas, Rect frame, Axis x, Axis y)
    : canvas_(canvas), frame_(frame), x_(std::move(x)), y_(std::move(y)) {
    const double size = canvas.font_size();
    const TextStyle below{0.92 * size, palette::muted, Anchor::middle, Weight::normal, 0.0};
    const TextStyle beside{0.92 * size, palette::muted, Anchor::end, Weight::normal, 0.0};
    for (const Tick& tick : x_.ticks) {
        upright(tick.value, {palette::grid, 0.7, Dash::solid});
        canvas.text(tick.label, {place(tick.value, y_.low).x, frame_.bottom() + 0.9 * size}, below);
    }
    for (const Tick& tick : y_.ticks) {
        level(tick.value, {palette::grid, 0.7, Dash::solid});
        canvas.text(tick.label, {frame_.left - 0.5 * size, place(x_.low, tick.value).y}, beside);
    }
    canvas.text(x_.label, {frame_.left + 0.5 * frame_.width, frame_.bottom() + 2.25 * size},
                {size, palette::ink, Anchor::middle, Weight::normal, frame_.width});
    canvas.text(y_.label, {frame_.left, frame_.top - 0.95 * size},
                {size, palette::ink, Anchor::start, Weight::normal, frame_.width});
}

void Panel::select() const {
    const double width = canvas_.width(), height = canvas_.height();
    plvpor(frame_.left / width, frame_.right() / width, 1.0 - frame_.bottom() / height,
           1.0 - frame_.top / height);
    plwind(on_scale(x_, x_.low), on_scale(x_, x_.high), on_scale(y_, y_.low), on_scale(y_, y_.high));
}

Point Panel::place(double x, double y) const {
    return {frame_.left + frame_.width * share_of(x_, x), frame_.bottom() - frame_.height * share_of(y_, y)};
}

void Panel::curve(const std::vector<double>& x, const std::vector<double>& y, const Stroke& stroke) {
    const auto columns = static_cast<std::size_t>(std::max(frame_.width, 1.0));
    const Polyline line =
        under_columns(on_scale(x_, x), on_scale(y_, y), on_scale(x_, x_.low), on_scale(x_, x_.high), columns);
    if (stroke.dash != Dash::solid) {
        std::vector<Point> points;
        for (std::size_t i = 0; i < line.x.size(); ++i) {
            const double px = x_.logarithmic ? std::pow(10.0, line.x[i]) : line.x[i];
            const double py = y_.logarithmic ? std::pow(10.0, line.y[i]) : line.y[i];
            points.push_back(place(px, py));
        }
        canvas_.path(points, stroke, frame_);
        return;
    }
    select();
    set_plplot_pen(stroke.colour, stroke.width);
    for (std::size_t begin = 0; begin < line.x.size();) {
        std::size_t end = begin;
        while (end < line.x.size() && std::isfinite(line.x[end]) && std::isfinite(line.y[end])) ++end;
        if (end - begin > 1)
            plline(static_cast<int>(end - begin), line.x.data() + begin, line.y.data() + begin);
        begin = end + 1;
    }
}

void Panel::area(const std::vector<double>& x, const std::vector<double>& low,
                 const std::vector<double>& high, Colour colour) {
    std::vector<double> outline_x, outline_y;
    for (std::size_t i = 0; i < x.size(); ++i) {
        outline_x.push_back(on_scale(x_, x[i]));
        outline_y.push_back(on_scale(y_, within(y_, low[i])));
    }
    for (std::size_t i = x.size(); i-- > 0;) {
        outline_x.push_back(on_scale(x_, x[i]));
        outline_y.push_back(on_scale(y_, within(y_, high[i])));
    }
    if (outline_x.size() < 4) return;
    select();
    set_plplot_pen(colour, 0.0);
    plfill(static_cast<int>(outline_x.size()), outline_x.data(), outline_y.data());
}

void Panel::block(double x_low, double x_high, double y_low, double y_high, Colour colour) {
    area({within(x_, x_low), within(x_, x_high)}, {y_low, y_low}, {y_high, y_high}, colour);
}

void Panel::marks(const std::vector<double>& x, const std::vector<double>& y, Mark mark, double radius,
                  Colour colour) {
    for (std::size_t i = 0; i < std::min(x.size(), y.size()); ++i)
        if (std::isfinite(x[i]) && std::isfinite(y[i])) canvas_.mark(mark, place(x[i], y[i]), radius, colour);
}

void Panel::level(double y, const Stroke& stroke) {
    curve({x_.low, x_.high}, {y, y}, stroke);
}

void Panel::upright(double x, const Stroke& stroke) {
    curve({x, x}, {y_.low, y_.high}, stroke);
}

void Panel::close() {
    select();
    set_plplot_pen(palette::frame, 0.8);
    plbox("bc", 0.0, 0, "bc", 0.0, 0);
}

double label_width(Canvas& canvas, const Axis& axis) {
    double widest = 0.0;
    for (const Tick& tick : axis.ticks)
        widest = std::max(widest, canvas.text_width(tick.label, 0.92 * canvas.font_size()));
    return widest;
}

Rect frame_within(Canvas& canvas, const Rect& outer, const Axis& x, const Axis& y) {
    const double size = canvas.font_size();
    const double left = label_width(canvas, y) + (y.ticks.empty() ? 1.0 : 0.9 * size);
    const double right = 0.9 * size;
    const double top = y.label.empty() ? 0.6 * size : 1.9 * size;
    const bool numbers = std::ranges::any_of(x.ticks, [](const Tick& tick) { return !tick.label.empty(); });
    const double bottom = (numbers ? 1.5 * size : 0.5 * size) + (x.label.empty() ? 0.0 : 1.4 * size);
    return {outer.left + left, outer.top + top, outer.width - left - right, outer.height - top - bottom};
}

namespace {

struct KeyMeasures {
    double size, gap, between;
    [[nodiscard]] double sample(const KeyEntry& entry) const { return entry.is_mark ? size : 1.8 * size; }
};

KeyMeasures key_measures(const Canvas& canvas) {
    const double size = 0.92 * canvas.font_size();
    return {size, 0.45 * size, 1.2 * size};
}

double key_width(Canvas& canvas, const std::vector<KeyEntry>& entries) {
    const KeyMeasures measures = key_measures(canvas);
    double width = -measures.between;
    for (const KeyEntry& entry : entries)
        width += canvas.text_width(entry.text, measures.size) + measures.gap + measures.sample(entry) +
                 measures.between;
    return width;
}

void draw_area_sample(Canvas& canvas, const KeyEntry& entry, const Rect& rect) {
    canvas.fill(rect, entry.stroke.colour);
    if (entry.hatch) canvas.hatch(rect, *entry.hatch);
}

void draw_sample(Canvas& canvas, const KeyEntry& entry, double from, double to, double y, double size) {
    const Stroke& stroke = entry.stroke;
    if (entry.is_mark)
        canvas.mark(entry.mark, {0.5 * (from + to), y}, 0.28 * size, stroke.colour);
    else if (entry.is_area)
        draw_area_sample(canvas, entry, {from, y - 0.35 * size, to - from, 0.7 * size});
    else
        canvas.line({from, y}, {to, y}, {stroke.colour, std::max(1.2, stroke.width), stroke.dash});
}

}  // namespace

void draw_key(Canvas& canvas, const std::vector<KeyEntry>& entries, double right, double y) {
    const KeyMeasures measures = key_measures(canvas);
    double at = right;
    for (auto entry = entries.rbegin(); entry != entries.rend(); ++entry) {
        at -= canvas.text_width(entry->text, measures.size);
        canvas.text(entry->text, {at, y}, {measures.size, palette::ink, Anchor::start, Weight::normal, 0.0});
        at -= measures.gap;
        const double from = at - measures.sample(*entry);
        draw_sample(canvas, *entry, from, at, y, measures.size);
        at = from - measures.between;
    }
}

void draw_key(Canvas& canvas, const std::vector<KeyEntry>& entries, const Panel& panel) {
    const double name = canvas.text_width(panel.y_axis().label, canvas.font_size());
    if (name + canvas.font_size() + key_width(canvas, entries) > panel.frame().width) return;
    draw_key(canvas, entries, panel.frame().right(), panel.frame().top - 0.95 * canvas.font_size());
}

}  // namespace ringwright::drawing
