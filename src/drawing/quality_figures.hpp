#pragma once
// Figures of what is said over several results: before and after, the ledger's chart, the gauge study.

#include <vector>

#include "drawing/result_reading.hpp"
#include "ringwright/figures.hpp"

namespace ringwright::drawing {

/// The keys of those quantities of a comparison that people ask for first, at most four.
[[nodiscard]] std::vector<std::string> main_quantities(const Json& comparison);

[[nodiscard]] NamedFigure comparison_figure(const Json& comparison);
/// The last `most_charted` values of a chart.
[[nodiscard]] NamedFigure chart_figure(const Json& chart);
inline constexpr std::size_t most_charted = 200;
[[nodiscard]] NamedFigure gauge_figure(const Json& study);

/// The parts of the variation of a gauge study with their share of the whole variance.
struct VariationPart {
    std::string source;
    double variance = 0.0, low = 0.0, high = 0.0, share = 0.0;
};
[[nodiscard]] std::vector<VariationPart> variation_parts(const Json& study);

}  // namespace ringwright::drawing
