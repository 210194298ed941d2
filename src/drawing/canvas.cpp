#include "drawing/canvas.hpp"

#include <plplot/plplot.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <mutex>
#include <numbers>
#include <string_view>

#include "drawing/fonts.hpp"
#include "ringwright/error.hpp"

namespace ringwright::drawing {
namespace {

std::mutex& plplot_mutex() {
    static std::mutex mutex;
    return mutex;
}

/// PLplot asks on the terminal when a device is missing, so it is looked for beforehand.
bool device_exists(std::string_view wanted) {
    constexpr int room = 128;
    std::array<const char*, room> menus{}, names{};
    const char** menu = menus.data();
    const char** name = names.data();
    int count = room;
    plgDevs(&menu, &name, &count);
    return std::any_of(name, name + count, [&](const char* device) { return device == wanted; });
}

void set_source(cairo_t* pen, Colour colour) {
    cairo_set_source_rgb(pen, colour.red / 255.0, colour.green / 255.0, colour.blue / 255.0);
}

void set_stroke(cairo_t* pen, const Stroke& stroke) {
    set_source(pen, stroke.colour);
    cairo_set_line_width(pen, stroke.width);
    cairo_set_line_join(pen, CAIRO_LINE_JOIN_ROUND);
    const std::array<double, 2> dashed{4.5, 2.5}, dotted{1.2, 2.2};
    if (stroke.dash == Dash::solid) cairo_set_dash(pen, nullptr, 0, 0.0);
    if (stroke.dash == Dash::dashed) cairo_set_dash(pen, dashed.data(), 2, 0.0);
    if (stroke.dash == Dash::dotted) cairo_set_dash(pen, dotted.data(), 2, 0.0);
}

Layout layout_of(cairo_t* pen, const std::string& text, const TextStyle& style) {
    return make_layout(pen, text, style.size, style.weight == Weight::bold);
}

/// The text without as much of its middle as makes it fit.
std::string shortened(cairo_t* pen, const std::string& text, const TextStyle& style, double max_width) {
    const std::u32string all = to_characters(clean_utf8(text));
    std::string shown = text;
    for (std::size_t kept = all.size(); kept > 2 && width_of(layout_of(pen, shown, style)) > max_width;) {
        kept -= std::max<std::size_t>(1, kept / 16);
        const std::size_t head = (kept + 1) / 2;
        shown = to_utf8(all.substr(0, head)) + "…" + to_utf8(all.substr(all.size() - (kept - head)));
    }
    return shown;
}

void polygon(cairo_t* pen, Point at, std::initializer_list<Point> corners) {
    for (const Point& corner : corners) cairo_line_to(pen, at.x + corner.x, at.y + corner.y);
    cairo_close_path(pen);
}

}  // namespace

class Canvas::Device {
  public:
    Device(cairo_surface_t* surface, double width, double height)
        : lock_(plplot_mutex()), cairo_(cairo_create(surface)) {
        if (!device_exists("extcairo"))
            throw OutputError({"", "", "figures cannot be drawn: PLplot's external-Cairo device is missing",
                               "Install PLplot's Cairo driver (Debian: plplot-driver-cairo)"});
        plsdev("extcairo");
        plspage(0.0, 0.0, static_cast<int>(std::lround(width)), static_cast<int>(std::lround(height)), 0, 0);
        plscolbga(255, 255, 255, 0.0);
        plinit();
        pl_cmd(PLESC_DEVINIT, cairo_.get());
        pladv(0);
        plpsty(0);
    }
    ~Device() { plend(); }
    Device(const Device&) = delete;
    Device& operator=(const Device&) = delete;

  private:
    struct Destroy {
        void operator()(cairo_t* cairo) const { cairo_destroy(cairo); }
    };
    std::lock_guard<std::mutex> lock_;
    std::unique_ptr<cairo_t, Destroy> cairo_;  // PLplot borrows it until plend()
};

Canvas::Canvas(cairo_surface_t* surface, double width, double height, double font_size)
    : device_(std::make_unique<Device>(surface, width, height)),
      pen_(cairo_create(surface)),
      width_(width),
      height_(height),
      font_size_(font_size) {}

Canvas::~Canvas() {
    cairo_destroy(pen_);
}

void Canvas::text(const std::string& text, Point at, const TextStyle& style) {
    if (text.empty()) return;
    const std::string shown = style.max_width > 0.0 ? shortened(pen_, text, style, style.max_width) : text;
    const Layout layout = layout_of(pen_, shown, style);
    const double shift = style.anchor == Anchor::start ? 0.0 : style.anchor == Anchor::middle ? 0.5 : 1.0;
    // The middle of a line is that of its capitals, whatever font stands in for a rare script.
    const double baseline = at.y + 0.36 * style.size;
    if (collecting_) {
        collected_.push_back({clean_utf8(shown), {at.x, baseline}, style});
        return;
    }
    set_source(pen_, style.colour);
    cairo_move_to(pen_, at.x - shift * width_of(layout), baseline - baseline_of(layout));
    pango_cairo_show_layout(pen_, layout.get());
}

double Canvas::text_width(const std::string& text, double size, Weight weight) {
    return width_of(make_layout(pen_, text, size, weight == Weight::bold));
}

void Canvas::mark(Mark mark, Point at, double radius, Colour colour) {
    const double r = radius, s = 0.9 * radius;
    set_stroke(pen_, {colour, std::max(0.35 * radius, 0.6), Dash::solid});
    cairo_new_path(pen_);
    switch (mark) {
        case Mark::disc:
        case Mark::ring:
            cairo_arc(pen_, at.x, at.y, r, 0.0, 2.0 * std::numbers::pi);
            break;
        case Mark::square:
            polygon(pen_, at, {{-s, -s}, {s, -s}, {s, s}, {-s, s}});
            break;
        case Mark::diamond:
            polygon(pen_, at, {{0, -1.25 * r}, {1.25 * r, 0}, {0, 1.25 * r}, {-1.25 * r, 0}});
            break;
        case Mark::triangle:
            polygon(pen_, at, {{0, -1.1 * r}, {r, 0.8 * r}, {-r, 0.8 * r}});
            break;
        case Mark::cross:
            cairo_move_to(pen_, at.x - s, at.y - s);
            cairo_line_to(pen_, at.x + s, at.y + s);
            cairo_move_to(pen_, at.x - s, at.y + s);
            cairo_line_to(pen_, at.x + s, at.y - s);
            break;
    }
    const bool hollow = mark == Mark::ring || mark == Mark::cross;
    if (hollow)
        cairo_stroke(pen_);
    else
        cairo_fill(pen_);
}

void Canvas::line(Point from, Point to, const Stroke& stroke) {
    set_stroke(pen_, stroke);
    cairo_move_to(pen_, from.x, from.y);
    cairo_line_to(pen_, to.x, to.y);
    cairo_stroke(pen_);
}

void Canvas::fill(const Rect& rect, Colour colour) {
    set_source(pen_, colour);
    cairo_rectangle(pen_, rect.left, rect.top, rect.width, rect.height);
    cairo_fill(pen_);
}

void Canvas::outline(const Rect& rect, const Stroke& stroke) {
    set_stroke(pen_, stroke);
    cairo_rectangle(pen_, rect.left, rect.top, rect.width, rect.height);
    cairo_stroke(pen_);
}

void Canvas::hatch(const Rect& rect, Colour colour) {
    // The lines are cut to the rectangle here, since a clip would cost a mask in every file.
    set_stroke(pen_, {colour, 0.5, Dash::solid});
    constexpr double step = 4.0;
    for (double sum = step; sum < rect.width + rect.height; sum += step) {
        const double x1 = std::min(sum, rect.width), x2 = std::max(0.0, sum - rect.height);
        cairo_move_to(pen_, rect.left + x1, rect.top + (sum - x1));
        cairo_line_to(pen_, rect.left + x2, rect.top + (sum - x2));
    }
    cairo_stroke(pen_);
}

void Canvas::path(const std::vector<Point>& points, const Stroke& stroke, const Rect& clip) {
    cairo_save(pen_);
    cairo_rectangle(pen_, clip.left, clip.top, clip.width, clip.height);
    cairo_clip(pen_);
    set_stroke(pen_, stroke);
    bool begun = false;
    for (const Point& point : points) {
        const bool finite = std::isfinite(point.x) && std::isfinite(point.y);
        if (finite && begun) cairo_line_to(pen_, point.x, point.y);
        if (finite && !begun) cairo_move_to(pen_, point.x, point.y);
        begun = finite;
    }
    cairo_stroke(pen_);
    cairo_restore(pen_);
}

}  // namespace ringwright::drawing
