#pragma once
// From the releases of all recordings to the one result.

#include <vector>

#include "ringwright/analysis.hpp"

namespace ringwright::analysis {

[[nodiscard]] PooledResult combine(const std::vector<RecordingIdentification>& recordings,
                                   const AnalysisOptions& options);

/// As the article's place was told, else the default of Gravity.
[[nodiscard]] Gravity gravity_of(const AnalysisOptions& options);

}  // namespace ringwright::analysis
