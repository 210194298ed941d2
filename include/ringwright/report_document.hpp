#pragma once
// The report of a result: one HTML page or one PDF, with the figures in it.

#include <string>
#include <vector>

#include "ringwright/figures.hpp"

namespace ringwright {

enum class PaperSize { a4, letter };

struct ReportInput {
    std::string result_json;  ///< ringwright.identification.v1 (with its "verdict" and "test_sheet" where
                              ///< there are), ringwright.comparison.v1, ringwright.chart.v1 or
                              ///< ringwright.gauge.v1
    std::string file;         ///< what the result is called in messages
    std::vector<NamedFigure> figures;           ///< those that need the samples: recording, decay …
    std::vector<std::string> missing_figures;   ///< a sentence for each that could not be drawn, and why
    std::vector<std::string> differences = {};  ///< a sentence for each number that did not come out again
};

/// Figures that need nothing but the result itself: "methods", "verdict"; "comparison"; "chart"; "gauge".
/// Throws InputError when the text is no result of a schema named above.
[[nodiscard]] std::vector<NamedFigure> figures_of_result(const std::string& result_json,
                                                         const std::string& file);

/// The report as one HTML file without script that fetches nothing, for light and dark pages and for paper.
/// Contents after ISO/IEC 17025:2017, 7.8; a field that the result does not hold is left out. The same input
/// gives the same bytes: dates come from the test sheet, the number of the report from the result. Throws
/// InputError as figures_of_result, OutputError where a figure cannot be drawn.
[[nodiscard]] std::string report_html(const ReportInput& input);
/// The same as PDF, text selectable, fonts embedded, pages numbered.
[[nodiscard]] std::string report_pdf(const ReportInput& input, PaperSize paper = PaperSize::a4);

}  // namespace ringwright
