#pragma once
// Answers that are drawn: reports and figures, by the drawing module, which is loaded on first use.

#include <optional>
#include <string>
#include <vector>

#include "ringwright/figures.hpp"
#include "ringwright/report_document.hpp"

namespace CLI {
class App;
}

namespace ringwright::app {

/// What is to be drawn and how.
struct DrawingArguments {
    std::string figure, paper = "a4";
};
/// --figure, with help that names the figures that there are, and --paper.
void add_drawing_options(CLI::App& command, DrawingArguments& arguments, const std::string& names);
inline constexpr const char* identification_figures =
    "methods, verdict, recording-1, decay-1, decrement-1, spectrum-1, autocorrelation-1, course-1 (the "
    "number "
    "is the release's)";

/// The form of a drawn answer that a file name asks for by its ending.
enum class DrawnForm { html, pdf, svg, png };
/// Nothing when the ending asks for none of them.
[[nodiscard]] std::optional<DrawnForm> drawn_form_of(const std::string& output);

/// Throws UsageError when the ending of `output` says neither text (.txt, .csv, .json, .jsonl; written in the
/// form of --format) nor, where `draws`, a drawn answer. A name without an ending is text.
void require_known_ending(const std::string& output, bool draws);

/// True when `output` asks for a drawn answer. Throws UsageError for a figure named without one,
/// and for an ending that is not known.
bool require_drawable(const std::string& output, const DrawingArguments& arguments);

/// Throws UsageError when `output` asks for a drawn answer of a command that has none.
void refuse_drawn(const std::string& output);

/// The figures that need the samples, out of an identification made with pictures and kept samples.
[[nodiscard]] std::vector<NamedFigure> sample_figures(const Identification& identification);

/// Draws the whole report, or the one figure that is named, in the form that `output` asks for, and returns
/// its bytes. SVG and PNG hold one figure: the one named, else the first of the report. Throws UsageError
/// where the figure is not there (and names those that are) or the paper is not known, OutputError where the
/// drawing module is missing.
[[nodiscard]] std::string drawn_answer(const ReportInput& input, const DrawingArguments& arguments,
                                       DrawnForm form);

}  // namespace ringwright::app
