// Each kind of figure: well-formed, named, the same every time, and with its ink where it belongs.
#include <cairo.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <cstring>
#include <limits>
#include <set>
#include <thread>

#include "drawing/ink_grids.hpp"
#include "drawing/markup.hpp"
#include "drawing/sample_figures.hpp"

using namespace ringwright;

namespace {

struct PngReader {
    const std::string& bytes;
    std::size_t at = 0;
    static cairo_status_t read(void* closure, unsigned char* data, unsigned int length) {
        auto& self = *static_cast<PngReader*>(closure);
        if (self.at + length > self.bytes.size()) return CAIRO_STATUS_READ_ERROR;
        std::memcpy(data, self.bytes.data() + self.at, length);
        self.at += length;
        return CAIRO_STATUS_SUCCESS;
    }
};

constexpr int grid_columns = 32, grid_rows = 12;

/// Mean darkness of each cell of a grid over the picture, 0 … 255, row by row.
std::vector<double> ink_of(const std::string& png) {
    PngReader reader{png};
    cairo_surface_t* image = cairo_image_surface_create_from_png_stream(&PngReader::read, &reader);
    REQUIRE(cairo_surface_status(image) == CAIRO_STATUS_SUCCESS);
    const int width = cairo_image_surface_get_width(image), height = cairo_image_surface_get_height(image);
    const int stride = cairo_image_surface_get_stride(image);
    const unsigned char* data = cairo_image_surface_get_data(image);
    std::vector<double> sum(grid_columns * grid_rows), count(sum.size());
    for (int y = 0; y < height; ++y)
        for (int x = 0; x < width; ++x) {
            const auto cell =
                static_cast<std::size_t>(y * grid_rows / height * grid_columns + x * grid_columns / width);
            const unsigned char* pixel = data + y * stride + 4 * x;
            sum[cell] += 255.0 - (pixel[0] + pixel[1] + pixel[2]) / 3.0;
            count[cell] += 1.0;
        }
    cairo_surface_destroy(image);
    for (std::size_t i = 0; i < sum.size(); ++i) sum[i] /= count[i];
    return sum;
}

std::string grid_text(const std::vector<double>& ink) {
    // One letter a cell: a is white, each letter four of 255 darker.
    std::string text;
    for (std::size_t i = 0; i < ink.size(); ++i) {
        text += static_cast<char>('a' + std::min(25, static_cast<int>(std::lround(ink[i] / 4.0))));
        if (i % grid_columns == grid_columns - 1) text += '\n';
    }
    return text;
}

int largest_difference(const std::string& first, const std::string& second) {
    if (first.size() != second.size()) return 99;
    int largest = 0;
    for (std::size_t i = 0; i < first.size(); ++i)
        largest = std::max(largest, std::abs(first[i] - second[i]));
    return largest;
}

}  // namespace

TEST_CASE("every kind of figure is well-formed SVG without a number that is none") {
    for (const NamedFigure& named : samples::one_of_each()) {
        INFO(named.name);
        const std::string svg = draw_figure(named.figure, ImageFormat::svg);
        CHECK(markup::nesting_fault(svg, false).empty());
        CHECK(svg.find("nan") == std::string::npos);
        CHECK(svg.find("inf") == std::string::npos);
        CHECK(svg.size() < 100'000);
    }
}

TEST_CASE("axes name quantity and unit, as text that can be searched") {
    const auto figures = samples::one_of_each();
    const auto svg_of = [&](const char* name) {
        for (const NamedFigure& named : figures)
            if (named.name == name) return draw_figure(named.figure, ImageFormat::svg);
        FAIL("no figure " << name);
        return std::string();
    };
    CHECK_THAT(svg_of("decay-1"),
               Catch::Contains(">displacement in mm</text>") && Catch::Contains(">time in s</text>"));
    CHECK_THAT(svg_of("spectrum-1"), Catch::Contains(">frequency in Hz</text>"));
    CHECK_THAT(svg_of("verdict"),
               Catch::Contains(">does not conform</text>") && Catch::Contains(">upper limit</text>"));
    CHECK_THAT(svg_of("methods"),
               Catch::Contains(">does not apply</text>") && Catch::Contains(">half-power bandwidth</text>"));
}

TEST_CASE("the same figure gives the same bytes, also beside other threads") {
    const auto figures = samples::one_of_each();
    for (const ImageFormat format : {ImageFormat::svg, ImageFormat::pdf, ImageFormat::png}) {
        std::vector<std::string> first(figures.size()), second(figures.size());
        const auto draw_all = [&](std::vector<std::string>& into) {
            for (std::size_t i = 0; i < figures.size(); ++i) into[i] = draw_figure(figures[i].figure, format);
        };
        std::thread other([&] { draw_all(first); });
        draw_all(second);
        other.join();
        for (std::size_t i = 0; i < figures.size(); ++i) {
            INFO(figures[i].name);
            CHECK(first[i] == second[i]);
        }
    }
}

TEST_CASE("a figure asked to be larger is larger") {
    const Figure figure = samples::one_of_each().front().figure;
    FigureSize size;
    size.width = 300.0, size.height = 200.0, size.margin = 0.0;
    CHECK_THAT(draw_figure(figure, ImageFormat::svg, size), Catch::Contains("viewBox=\"0 0 300 200\""));
}

TEST_CASE("ink lies where it lay") {
    // Golden grids: mean darkness of 32 × 12 cells. Fonts may differ by a release of the library, so text may
    // move by a little: two letters are 8 of 255. A curve or a bar that is lost or moved is ten letters.
    for (const NamedFigure& named : samples::one_of_each()) {
        const auto golden = samples::ink_grids().find(named.name);
        INFO("no grid of " << named.name);
        REQUIRE(golden != samples::ink_grids().end());
        FigureSize size;
        size.pixels_per_point = 2.0;
        const std::string grid = grid_text(ink_of(draw_figure(named.figure, ImageFormat::png, size)));
        INFO(named.name << "\n" << grid);
        CHECK(largest_difference(grid, golden->second) <= 2);
    }
}

TEST_CASE("figures of nothing are drawn and do not fail") {
    constexpr double none = std::numeric_limits<double>::quiet_NaN();
    const std::vector<Figure> empty{RecordingFigure{},  DecayFigure{},   DecrementFigure{},
                                    SpectrumFigure{},   MethodsFigure{}, AutocorrelationFigure{},
                                    CourseFigure{},     VerdictFigure{}, ChartFigure{},
                                    ComparisonFigure{}, GaugeFigure{}};
    for (const Figure& figure : empty) CHECK_FALSE(draw_figure(figure, ImageFormat::svg).empty());
    const DecayFigure odd{"signal", "", {0.0, 1.0, 2.0}, {1.0, none, 3.0}, {none, none, none},
                          {},       {}, {0.0, none, 0.0}};
    CHECK_FALSE(draw_figure(odd, ImageFormat::png).empty());
}

TEST_CASE("names from outside are escaped in SVG") {
    ChartFigure figure{
        "<script>&\"'", "mm\x01\xff", {{"</text><x>", {1.0, 0.9, 1.1}, false}}, {}, {}, {}, {}, {}};
    const std::string svg = draw_figure(figure, ImageFormat::svg);
    CHECK(markup::nesting_fault(svg, false).empty());
    CHECK(svg.find("<script") == std::string::npos);
    CHECK(svg.find('\x01') == std::string::npos);
}

TEST_CASE("the ending of a name says the format") {
    CHECK(image_format_of("a.SVG") == ImageFormat::svg);
    CHECK(image_format_of("dir.x/a.png") == ImageFormat::png);
    CHECK(image_format_of("a.pdf") == ImageFormat::pdf);
    CHECK_FALSE(image_format_of("a.gif"));
    CHECK_FALSE(image_format_of("svg"));
}
