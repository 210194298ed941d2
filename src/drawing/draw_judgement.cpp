// Figures of what follows from the result: verdict, chart, comparison, gauge study.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>

#include "drawing/kinds.hpp"

namespace ringwright::drawing {
namespace {

std::string decision_text(const std::string& decision) {
    if (decision == "conforms") return "conforms";
    if (decision == "does_not_conform") return "does not conform";
    return "undecided";
}

void draw_bar(Canvas& canvas, const Panel& panel, const ShownValue& shown, double y, Colour colour) {
    const double x = panel.place(shown.value, 0.0).x;
    if (std::isfinite(shown.low) && std::isfinite(shown.high)) {
        const double from = panel.place(std::max(shown.low, panel.x_axis().low), 0.0).x;
        const double to = panel.place(std::min(shown.high, panel.x_axis().high), 0.0).x;
        canvas.line({from, y}, {to, y}, {colour, 2.2, Dash::solid});
        canvas.line({from, y - 4.0}, {from, y + 4.0}, {colour, 1.4, Dash::solid});
        canvas.line({to, y - 4.0}, {to, y + 4.0}, {colour, 1.4, Dash::solid});
    }
    canvas.mark(Mark::diamond, {x, y}, 4.0, colour);
}

Axis judged_axis(const JudgedValue& judged) {
    Range range;
    for (const double end : {judged.value.value, judged.value.low, judged.value.high}) range.include(end);
    if (judged.lower_limit) range.include(*judged.lower_limit);
    if (judged.upper_limit) range.include(*judged.upper_limit);
    return linear_axis(range.low, range.high, axis_label(judged.quantity, judged.unit), 6, 0.14);
}

/// From `from` to `to` over the height of the panel, between its ends.
Rect zone(const Panel& panel, double from, double to) {
    const Axis& x = panel.x_axis();
    const double left = panel.place(std::clamp(from, x.low, x.high), 0.0).x;
    const double right = panel.place(std::clamp(to, x.low, x.high), 0.0).x;
    return {left, panel.frame().top, right - left, panel.frame().height};
}

void draw_guard(Canvas& canvas, const Panel& panel, std::optional<double> limit,
                std::optional<double> acceptance) {
    if (!limit || !acceptance || *limit == *acceptance) return;
    const Rect rect = zone(panel, std::min(*limit, *acceptance), std::max(*limit, *acceptance));
    canvas.fill(rect, palette::guard);
    canvas.hatch(rect, palette::accent);
}

void draw_limit(Canvas& canvas, const Panel& panel, std::optional<double> limit, const char* name) {
    if (!limit) return;
    const double x = panel.place(*limit, 0.0).x, size = canvas.font_size();
    canvas.line({x, panel.frame().top - 0.3 * size}, {x, panel.frame().bottom()},
                {palette::ink, 1.6, Dash::solid});
    canvas.text(name, {x, panel.frame().top - 0.95 * size}, {0.92 * size, palette::ink, Anchor::middle});
}

constexpr double verdict_block = 8.0;     // of the font size
constexpr double comparison_block = 7.6;  // of the font size

void draw_judged(Canvas& canvas, const JudgedValue& judged, double top) {
    const double size = canvas.font_size();
    const Rect frame{1.6 * size, top + 1.9 * size, canvas.width() - 12.6 * size, 2.6 * size};
    const Axis x = judged_axis(judged);
    Panel panel(canvas, frame, x, {0.0, 1.0, false, "", {}});
    const double low = judged.lower_limit.value_or(x.low), high = judged.upper_limit.value_or(x.high);
    canvas.fill(zone(panel, low, high), palette::accepted);
    draw_guard(canvas, panel, judged.lower_limit, judged.lower_acceptance);
    draw_guard(canvas, panel, judged.upper_limit, judged.upper_acceptance);
    panel.close();
    draw_limit(canvas, panel, judged.lower_limit, "lower limit");
    draw_limit(canvas, panel, judged.upper_limit, "upper limit");
    const bool bad = judged.decision == "does_not_conform";
    const double middle = frame.top + 0.5 * frame.height;
    draw_bar(canvas, panel, judged.value, middle, bad ? palette::alarm : palette::ink);
    canvas.text(decision_text(judged.decision), {frame.right() + 1.2 * size, middle},
                {1.1 * size, bad ? palette::alarm : palette::ink, Anchor::start, Weight::bold, 9.6 * size});
}

}  // namespace

void draw(Canvas& canvas, const VerdictFigure& figure) {
    double top = 0.0;
    bool guarded = false;
    for (const JudgedValue& judged : figure.values) {
        draw_judged(canvas, judged, top);
        top += verdict_block * canvas.font_size();
        guarded = guarded || judged.lower_acceptance || judged.upper_acceptance;
    }
    std::vector<KeyEntry> key{
        {"value with interval", {palette::ink, 2.0, Dash::solid}, false, false, Mark::disc},
        {"within the limits", {palette::accepted, 1.0, Dash::solid}, true, false, Mark::disc}};
    if (guarded)
        key.push_back(
            {"guard band", {palette::guard, 1.0, Dash::solid}, true, false, Mark::disc, palette::accent});
    draw_key(canvas, key, canvas.width() - 0.9 * canvas.font_size(), top + 0.9 * canvas.font_size());
}

namespace {

struct LevelName {
    double y = 0.0;
    const char* name = "";
};

std::vector<LevelName> level_names(const Panel& panel, const ChartFigure& figure) {
    std::vector<LevelName> names;
    const auto add = [&](const std::optional<double>& level, const char* name) {
        if (level) names.push_back({panel.place(panel.x_axis().low, *level).y, name});
    };
    add(figure.centre, "centre");
    add(figure.lower_control, "lower control");
    add(figure.upper_control, "upper control");
    add(figure.lower_limit, "lower limit");
    add(figure.upper_limit, "upper limit");
    std::ranges::sort(names, {}, &LevelName::y);
    return names;
}

/// The names of the levels at the right, moved apart where the levels lie close.
void draw_level_names(Canvas& canvas, const Panel& panel, const ChartFigure& figure) {
    const double size = 0.88 * canvas.font_size(), step = 1.15 * size;
    std::vector<LevelName> names = level_names(panel, figure);
    for (int pass = 0; pass < 20; ++pass)
        for (std::size_t i = 1; i < names.size(); ++i) {
            const double lacking = step - (names[i].y - names[i - 1].y);
            if (lacking <= 0.0) continue;
            names[i - 1].y -= 0.5 * lacking;
            names[i].y += 0.5 * lacking;
        }
    for (const LevelName& name : names)
        canvas.text(name.name, {panel.frame().right() + 0.4 * canvas.font_size(), name.y},
                    {size, palette::ink});
}

bool outside_limits(const ChartFigure& figure, double value) {
    return (figure.lower_limit && value < *figure.lower_limit) ||
           (figure.upper_limit && value > *figure.upper_limit);
}

Axis chart_values(const ChartFigure& figure) {
    Range range;
    for (const ChartPoint& point : figure.points)
        for (const double end : {point.value.value, point.value.low, point.value.high}) range.include(end);
    for (const auto& level :
         {figure.centre, figure.lower_control, figure.upper_control, figure.lower_limit, figure.upper_limit})
        if (level) range.include(*level);
    return linear_axis(range.low, range.high, axis_label(figure.quantity, figure.unit), 5, 0.08);
}

/// Names at 1, 2, … as far as they fit side by side: every second, third … where they do not.
Axis naming_axis(Canvas& canvas, const std::vector<std::string>& names, double width, std::string label) {
    const double count = std::max(1.0, static_cast<double>(names.size()));
    Axis axis{0.5, count + 0.5, false, std::move(label), {}};
    double widest = 1.0;
    for (const std::string& name : names)
        widest = std::max(widest, canvas.text_width(name, 0.92 * canvas.font_size()));
    const auto every = static_cast<std::size_t>(std::ceil(count * (widest + canvas.font_size()) / width));
    for (std::size_t i = 0; i < names.size(); i += std::max<std::size_t>(every, 1))
        axis.ticks.push_back({static_cast<double>(i) + 1.0, names[i]});
    return axis;
}

std::vector<std::string> labels_of(const ChartFigure& figure) {
    std::vector<std::string> labels;
    for (const ChartPoint& point : figure.points) labels.push_back(point.label);
    return labels;
}

void draw_chart_point(Canvas& canvas, const Panel& panel, double number, const ChartPoint& point,
                      bool outside) {
    const Colour colour = point.flagged || outside ? palette::alarm : palette::fitted;
    const Point at = panel.place(number, point.value.value);
    if (std::isfinite(point.value.low) && std::isfinite(point.value.high))
        canvas.line(panel.place(number, point.value.low), panel.place(number, point.value.high),
                    {colour, 1.0, Dash::solid});
    const Mark mark = outside ? Mark::triangle : point.flagged ? Mark::square : Mark::disc;
    canvas.mark(mark, at, point.flagged || outside ? 3.0 : 2.3, colour);
    if (point.flagged)
        canvas.outline({at.x - 5.0, at.y - 5.0, 10.0, 10.0}, {palette::alarm, 1.0, Dash::solid});
}

}  // namespace

void draw(Canvas& canvas, const ChartFigure& figure) {
    const double size = canvas.font_size();
    const Axis y = chart_values(figure);
    const double names = figure.centre || figure.lower_limit || figure.upper_limit ? 6.6 * size : 0.0;
    const Rect outer{0.0, 0.0, canvas.width() - names, canvas.height()};
    Rect frame = frame_within(canvas, outer, {0.0, 1.0, false, "", {{0.0, "1"}}}, y);
    Panel panel(canvas, frame, naming_axis(canvas, labels_of(figure), frame.width, ""), y);
    const Stroke control{palette::accent, 1.0, Dash::dashed}, limit{palette::ink, 1.4, Dash::solid};
    if (figure.centre) panel.level(*figure.centre, {palette::accent, 1.0, Dash::solid});
    if (figure.lower_control) panel.level(*figure.lower_control, control);
    if (figure.upper_control) panel.level(*figure.upper_control, control);
    if (figure.lower_limit) panel.level(*figure.lower_limit, limit);
    if (figure.upper_limit) panel.level(*figure.upper_limit, limit);
    std::vector<double> numbers, values;
    for (std::size_t i = 0; i < figure.points.size(); ++i) {
        numbers.push_back(static_cast<double>(i) + 1.0);
        values.push_back(figure.points[i].value.value);
    }
    panel.curve(numbers, values, {palette::observed, 0.8, Dash::solid});
    for (std::size_t i = 0; i < numbers.size(); ++i)
        draw_chart_point(canvas, panel, numbers[i], figure.points[i], outside_limits(figure, values[i]));
    panel.close();
    draw_level_names(canvas, panel, figure);
}

namespace {

std::string change_text(const ComparedValue& compared) {
    if (!compared.change) return compared.changed ? "changed" : "no change shown";
    const double percent = 100.0 * compared.change->value;
    const std::string size = fmt::format("{}{:.1f} %", percent < 0.0 ? "−" : "+", std::abs(percent));
    return compared.changed ? size : "no change shown";
}

void draw_compared(Canvas& canvas, const ComparedValue& compared, double top) {
    const double size = canvas.font_size();
    const Rect frame{5.0 * size, top + 0.6 * size, canvas.width() - 14.6 * size, 3.8 * size};
    Range range;
    for (const ShownValue& shown : {compared.before, compared.after})
        for (const double end : {shown.value, shown.low, shown.high}) range.include(end);
    Panel panel(canvas, frame,
                linear_axis(range.low, range.high, axis_label(compared.quantity, compared.unit), 6, 0.1),
                {0.0, 1.0, false, "", {}});
    panel.close();
    const double upper = frame.top + 0.28 * frame.height, lower = frame.top + 0.72 * frame.height;
    canvas.text("before", {frame.left - 0.7 * size, upper}, {size, palette::ink, Anchor::end});
    canvas.text("after", {frame.left - 0.7 * size, lower}, {size, palette::ink, Anchor::end});
    draw_bar(canvas, panel, compared.before, upper, palette::observed);
    draw_bar(canvas, panel, compared.after, lower, palette::fitted);
    canvas.text(change_text(compared), {frame.right() + 1.0 * size, frame.top + 0.5 * frame.height},
                {1.05 * size, palette::ink, Anchor::start, compared.changed ? Weight::bold : Weight::normal});
}

}  // namespace

void draw(Canvas& canvas, const ComparisonFigure& figure) {
    double top = 0.0;
    for (const ComparedValue& compared : figure.values) {
        draw_compared(canvas, compared, top);
        top += comparison_block * canvas.font_size();
    }
}

namespace {

constexpr double share_row = 1.7;  // of the font size

void draw_shares(Canvas& canvas, const GaugeFigure& figure, double top) {
    const double size = canvas.font_size();
    double names = 0.0;
    for (const GaugeShare& share : figure.shares)
        names = std::max(names, canvas.text_width(share.source, size));
    const double left = names + 0.8 * size, width = canvas.width() - left - 4.5 * size;
    for (const GaugeShare& share : figure.shares) {
        const double middle = top + 0.5 * share_row * size;
        const double length = width * std::clamp(share.share, 0.0, 1.0);
        canvas.text(share.source, {0.0, middle}, {size, palette::ink});
        canvas.fill({left, middle - 0.45 * size, width, 0.9 * size}, palette::shade);
        canvas.fill({left, middle - 0.45 * size, length, 0.9 * size}, palette::fitted);
        canvas.text(fmt::format("{:.1f} %", 100.0 * share.share), {left + width + 0.5 * size, middle},
                    {size, palette::ink});
        top += share_row * size;
    }
}

std::vector<std::string> in_order_of_first_use(const GaugeFigure& figure, std::string GaugeReading::*name) {
    std::vector<std::string> names;
    for (const GaugeReading& reading : figure.readings)
        if (std::ranges::find(names, reading.*name) == names.end()) names.push_back(reading.*name);
    return names;
}

std::size_t place_in(const std::vector<std::string>& names, const std::string& name) {
    return static_cast<std::size_t>(std::ranges::find(names, name) - names.begin());
}

constexpr Mark operator_marks[] = {Mark::disc, Mark::square, Mark::triangle,
                                   Mark::ring, Mark::cross,  Mark::diamond};
constexpr Colour operator_colours[] = {palette::fitted, palette::accent, palette::ink};

void draw_readings(Canvas& canvas, const GaugeFigure& figure, double height) {
    const auto articles = in_order_of_first_use(figure, &GaugeReading::article);
    const auto operators = in_order_of_first_use(figure, &GaugeReading::operator_name);
    Range range;
    for (const GaugeReading& reading : figure.readings) range.include(reading.values);
    const Axis y = linear_axis(range.low, range.high, axis_label(figure.quantity, figure.unit), 5, 0.08);
    const Axis x = naming_axis(canvas, articles, canvas.width() - 6.0 * canvas.font_size(), "article");
    Panel panel(canvas, frame_within(canvas, {0, 0, canvas.width(), height}, x, y), x, y);
    const double spread = 0.6 / static_cast<double>(std::max<std::size_t>(operators.size(), 1));
    for (const GaugeReading& reading : figure.readings) {
        const std::size_t who = place_in(operators, reading.operator_name);
        const double offset =
            (static_cast<double>(who) - 0.5 * static_cast<double>(operators.size() - 1)) * spread;
        const double at = static_cast<double>(place_in(articles, reading.article)) + 1.0 + offset;
        const std::vector<double> xs(reading.values.size(), at);
        panel.marks(xs, reading.values, operator_marks[who % std::size(operator_marks)], 2.1,
                    operator_colours[who % std::size(operator_colours)]);
    }
    panel.close();
    std::vector<KeyEntry> key;
    for (std::size_t i = 0; i < operators.size() && i < 6; ++i)
        key.push_back({operators[i],
                       {operator_colours[i % std::size(operator_colours)], 1.0, Dash::solid},
                       false,
                       true,
                       operator_marks[i % std::size(operator_marks)]});
    draw_key(canvas, key, panel);
}

}  // namespace

void draw(Canvas& canvas, const GaugeFigure& figure) {
    const double shares = (share_row * static_cast<double>(figure.shares.size()) + 1.0) * canvas.font_size();
    draw_readings(canvas, figure, canvas.height() - shares);
    draw_shares(canvas, figure, canvas.height() - shares + 0.8 * canvas.font_size());
}

void draw(Canvas& canvas, const Figure& figure) {
    std::visit([&](const auto& kind) { draw(canvas, kind); }, figure);
}

double height_of(const Figure& figure, const FigureSize& size) {
    const auto rows = [&](std::size_t count, double each, double rest) {
        return size.font * (each * static_cast<double>(std::max<std::size_t>(count, 1)) + rest);
    };
    if (const auto* methods = std::get_if<MethodsFigure>(&figure))
        return rows(methods->columns.empty() ? 0 : methods->columns.front().rows.size(), 1.55, 4.0);
    if (const auto* verdict = std::get_if<VerdictFigure>(&figure))
        return rows(verdict->values.size(), verdict_block, 2.0);
    if (const auto* comparison = std::get_if<ComparisonFigure>(&figure))
        return rows(comparison->values.size(), comparison_block, 0.0);
    if (const auto* gauge = std::get_if<GaugeFigure>(&figure))
        return 0.46 * size.width + rows(gauge->shares.size(), share_row, 1.0);
    if (std::holds_alternative<DecayFigure>(figure)) return 0.62 * size.width;
    if (std::holds_alternative<RecordingFigure>(figure)) return 0.36 * size.width;
    if (std::holds_alternative<AutocorrelationFigure>(figure)) return 0.36 * size.width;
    return 0.44 * size.width;
}

}  // namespace ringwright::drawing
