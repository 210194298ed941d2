#pragma once
// What a figure is drawn on: text by Pango, marks and dashed lines by Cairo, axes, curves and areas by PLplot
// on the same surface. Points (1/72 inch), y downward from the top left corner.

#include <cairo.h>

#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "drawing/palette.hpp"
#include "drawing/ticks.hpp"

namespace ringwright::drawing {

struct Point {
    double x = 0.0, y = 0.0;
};
struct Rect {
    double left = 0.0, top = 0.0, width = 0.0, height = 0.0;
    [[nodiscard]] double right() const { return left + width; }
    [[nodiscard]] double bottom() const { return top + height; }
};

enum class Anchor { start, middle, end };
enum class Weight { normal, bold };
enum class Mark { disc, ring, square, diamond, cross, triangle };
enum class Dash { solid, dashed, dotted };

struct TextStyle {
    double size = 9.0;
    Colour colour = palette::ink;
    Anchor anchor = Anchor::start;
    Weight weight = Weight::normal;
    double max_width = 0.0;  ///< > 0: longer text loses its middle to an ellipsis
};
struct Stroke {
    Colour colour = palette::ink;
    double width = 1.0;
    Dash dash = Dash::solid;
};

/// A line of text as SVG can hold it; `at` is the baseline.
struct WrittenText {
    std::string text;
    Point at;
    TextStyle style;
};

/// Drawing on `surface`, which stays the caller's. One canvas exists at a time in the process: PLplot keeps
/// global state, so the constructor waits for a lock that the destructor frees. Throws OutputError when the
/// external-Cairo device is missing.
class Canvas {
  public:
    Canvas(cairo_surface_t* surface, double width, double height, double font_size);
    /// From now on text is collected instead of drawn, for a format that holds text as such.
    void collect_text() { collecting_ = true; }
    [[nodiscard]] const std::vector<WrittenText>& collected() const { return collected_; }
    ~Canvas();
    Canvas(const Canvas&) = delete;
    Canvas& operator=(const Canvas&) = delete;

    [[nodiscard]] double width() const { return width_; }
    [[nodiscard]] double height() const { return height_; }
    [[nodiscard]] double font_size() const { return font_size_; }

    /// One line of text; `at` is on its vertical middle.
    void text(const std::string& text, Point at, const TextStyle& style);
    [[nodiscard]] double text_width(const std::string& text, double size, Weight weight = Weight::normal);
    void mark(Mark mark, Point at, double radius, Colour colour);
    void line(Point from, Point to, const Stroke& stroke);
    void fill(const Rect& rect, Colour colour);
    void outline(const Rect& rect, const Stroke& stroke);
    /// Slanted lines, so that an area is known without its colour.
    void hatch(const Rect& rect, Colour colour);
    void path(const std::vector<Point>& points, const Stroke& stroke, const Rect& clip);

  private:
    class Device;
    std::unique_ptr<Device> device_;
    cairo_t* pen_ = nullptr;
    double width_, height_, font_size_;
    bool collecting_ = false;
    std::vector<WrittenText> collected_;
};

/// A frame with two axes on a canvas. All it draws of curves is clipped to the frame.
class Panel {
  public:
    /// Draws grid lines and numbers; the name of the y axis stands above the frame at its left end, that of
    /// the x axis below the frame in the middle.
    Panel(Canvas& canvas, Rect frame, Axis x, Axis y);

    [[nodiscard]] Point place(double x, double y) const;
    [[nodiscard]] const Rect& frame() const { return frame_; }
    [[nodiscard]] const Axis& x_axis() const { return x_; }
    [[nodiscard]] const Axis& y_axis() const { return y_; }

    /// A line through the points, drawn as the envelope under each column where there are more of them.
    void curve(const std::vector<double>& x, const std::vector<double>& y, const Stroke& stroke);
    void area(const std::vector<double>& x, const std::vector<double>& low, const std::vector<double>& high,
              Colour colour);
    void block(double x_low, double x_high, double y_low, double y_high, Colour colour);
    void marks(const std::vector<double>& x, const std::vector<double>& y, Mark mark, double radius,
               Colour colour);
    void level(double y, const Stroke& stroke);
    void upright(double x, const Stroke& stroke);
    /// The frame itself, drawn last so that it lies above what it holds.
    void close();

  private:
    void select() const;
    Canvas& canvas_;
    Rect frame_;
    Axis x_, y_;
};

/// Width that the numbers of an axis take.
[[nodiscard]] double label_width(Canvas& canvas, const Axis& axis);
/// The frame that fits within `outer` when axis names and numbers have their place.
[[nodiscard]] Rect frame_within(Canvas& canvas, const Rect& outer, const Axis& x, const Axis& y);

/// Entry of a key: a stroke or a mark, and what it stands for.
struct KeyEntry {
    std::string text;
    Stroke stroke;
    bool is_area = false;
    bool is_mark = false;
    Mark mark = Mark::disc;
    std::optional<Colour> hatch = std::nullopt;  ///< of an area
};
/// A key in one row that ends at `right`, its middle at height `y`.
void draw_key(Canvas& canvas, const std::vector<KeyEntry>& entries, double right, double y);
/// The same above a panel, beside the name of its y axis; left out where that leaves no room.
void draw_key(Canvas& canvas, const std::vector<KeyEntry>& entries, const Panel& panel);

/// At most four points for each of `columns` equal stretches of x: the first, the lowest, the highest and the
/// last, in their order. Points that are few enough stay as they are; a y that is not finite breaks the line
/// and is kept.
struct Polyline {
    std::vector<double> x, y;
};
[[nodiscard]] Polyline under_columns(const std::vector<double>& x, const std::vector<double>& y, double low,
                                     double high, std::size_t columns);

}  // namespace ringwright::drawing
