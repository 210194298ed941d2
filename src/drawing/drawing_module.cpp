#include "ringwright/drawing_module.hpp"

#include "ringwright/version.hpp"

extern "C" __attribute__((visibility("default"))) const ringwright::DrawingFunctions*
ringwright_drawing_functions() {
    static const ringwright::DrawingFunctions functions{
        ringwright::version(),    &ringwright::figures_of,  &ringwright::figures_of_result,
        &ringwright::draw_figure, &ringwright::report_html, &ringwright::report_pdf};
    return &functions;
}
