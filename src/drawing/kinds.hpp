#pragma once
// One drawing function for each kind of figure, and the height that each wants at a width and font size.

#include "drawing/canvas.hpp"
#include "ringwright/figures.hpp"

namespace ringwright::drawing {

void draw(Canvas& canvas, const RecordingFigure& figure);
void draw(Canvas& canvas, const DecayFigure& figure);
void draw(Canvas& canvas, const DecrementFigure& figure);
void draw(Canvas& canvas, const SpectrumFigure& figure);
void draw(Canvas& canvas, const MethodsFigure& figure);
void draw(Canvas& canvas, const AutocorrelationFigure& figure);
void draw(Canvas& canvas, const CourseFigure& figure);
void draw(Canvas& canvas, const VerdictFigure& figure);
void draw(Canvas& canvas, const ChartFigure& figure);
void draw(Canvas& canvas, const ComparisonFigure& figure);
void draw(Canvas& canvas, const GaugeFigure& figure);

/// Draws any figure.
void draw(Canvas& canvas, const Figure& figure);
/// Height that a figure wants, in points.
[[nodiscard]] double height_of(const Figure& figure, const FigureSize& size);

}  // namespace ringwright::drawing
