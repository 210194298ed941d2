#pragma once
// The parts of the report of an identification.

#include <string>
#include <vector>

#include "drawing/document.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {

/// The recordings and their releases with figures, methods and their agreement; `shown_already` names a
/// figure that stands on the first page.
void add_evidence(std::vector<Block>& blocks, const Json& result, const ReportInput& input,
                  const std::string& shown_already);

/// The findings of all places, the gravest first; `differences` are put before them as cautions.
[[nodiscard]] Notes findings_of(const Json& result, const std::vector<std::string>& differences);

void add_budget(std::vector<Block>& blocks, const Json& result);
/// Sensor, article, sheet, software, command, and each recording with its hash.
void add_traceability(std::vector<Block>& blocks, const Json& result);
/// What each method does; of the curve fit, the models that were fitted.
void add_methods_text(std::vector<Block>& blocks, const Json& result);

}  // namespace ringwright::drawing
