#pragma once
// The drawing room as a module that a program loads when it draws, so that a command that draws nothing does
// not wait for Pango, Cairo and PLplot to load (docs/decisions/drawing-module.md).

#include <string>
#include <string_view>
#include <vector>

#include "ringwright/figures.hpp"
#include "ringwright/report_document.hpp"

namespace ringwright {

/// The functions of the module under the names and with the meaning of figures.hpp and report_document.hpp.
struct DrawingFunctions {
    std::string_view version;  ///< of the library that the module was built from
    std::vector<NamedFigure> (*figures_of)(const Identification&);
    std::vector<NamedFigure> (*figures_of_result)(const std::string& result_json, const std::string& file);
    std::string (*draw_figure)(const Figure&, ImageFormat, const FigureSize&);
    std::string (*report_html)(const ReportInput&);
    std::string (*report_pdf)(const ReportInput&, PaperSize);
};

/// What a program looks up in the loaded module.
inline constexpr const char* drawing_module_symbol = "ringwright_drawing_functions";

}  // namespace ringwright

extern "C" const ringwright::DrawingFunctions* ringwright_drawing_functions();
