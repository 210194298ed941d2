#include "ringwright/report_document.hpp"

#include <algorithm>
#include <nlohmann/json.hpp>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/surface.hpp"

namespace ringwright {

std::string report_html(const ReportInput& input) {
    return drawing::to_html(
        drawing::document_of(drawing::parsed_result(input.result_json, input.file), input));
}

std::string report_pdf(const ReportInput& input, PaperSize paper) {
    return drawing::to_pdf(drawing::document_of(drawing::parsed_result(input.result_json, input.file), input),
                           paper);
}

namespace drawing {

Document document_of(const Json& result, const ReportInput& input) {
    const std::string schema = text_at(result, {"schema"});
    if (schema == schemas::comparison) return comparison_document(result);
    if (schema == schemas::chart) return chart_document(result);
    if (schema == schemas::gauge) return gauge_document(result);
    return identification_document(result, input);
}

bool set_beside(const Pictures& pictures) {
    const std::string& first = pictures.figures.front().name;
    return pictures.figures.size() > 1 || first.starts_with("decrement") || first.starts_with("spectrum") ||
           first.starts_with("autocorrelation") || first.starts_with("course");
}

FigureSize page_figure_size(const NamedFigure& figure, bool beside, double whole_width) {
    constexpr double gap = 14.0;
    FigureSize size;
    size.margin = 0.0;
    size.width = beside ? 0.5 * (whole_width - gap) : whole_width;
    size.font = beside ? 7.5 : 8.5;
    if (beside)
        size.height = 0.56 * size.width;
    else if (std::holds_alternative<DecayFigure>(figure.figure))
        size.height = 0.48 * size.width;
    else if (std::holds_alternative<RecordingFigure>(figure.figure))
        size.height = 0.3 * size.width;
    return with_height(figure.figure, size);
}

}  // namespace drawing
}  // namespace ringwright
