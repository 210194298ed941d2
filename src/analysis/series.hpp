#pragma once
// The releases of a series that one method answered, and what they say together.

#include <string>
#include <string_view>
#include <vector>

#include "ringwright/analysis.hpp"
#include "ringwright/pooling.hpp"

namespace ringwright::analysis {

/// The three methods in the order in which the result prefers them.
struct Method {
    std::string_view key;
    std::string_view name;
    MethodResult EventIdentification::*result;
};
[[nodiscard]] const std::vector<Method>& methods_in_order_of_preference();

/// One release that the chosen method answered.
struct Release {
    const RecordingIdentification* recording = nullptr;
    const EventIdentification* event = nullptr;
    const MethodResult* answer = nullptr;
    std::string label;  ///< "Release 3 (bench.csv at 12.31 s)"
};

/// The first method that answers at least half of the releases that any method answers; nullptr when none
/// does.
[[nodiscard]] const Method* choose_method(const std::vector<RecordingIdentification>& recordings);
[[nodiscard]] std::vector<Release> releases_of(const std::vector<RecordingIdentification>& recordings,
                                               const Method& method);

/// Which of an answer's quantities: those it states, or those over the moving mass.
using Part = Quantities MethodResult::*;
/// Pools one quantity over the releases that have it; empty estimate list when fewer than half do.
[[nodiscard]] std::vector<Estimate> estimates_of(const std::vector<Release>& releases, Quantity quantity,
                                                 Part part = &MethodResult::quantities);
[[nodiscard]] std::vector<Quantity> quantities_of(const std::vector<Release>& releases,
                                                  Part part = &MethodResult::quantities);
[[nodiscard]] PoolingScale scale_of(Quantity quantity);

/// Pooled values, and for each how its variance divides.
struct PooledSeries {
    std::map<Quantity, Pooled> pooled;
    std::map<Quantity, Pooled> per_mass;  ///< of a damping law, over the moving mass
    std::size_t release_count = 0;
};
[[nodiscard]] PooledSeries pool_series(const std::vector<Release>& releases, double confidence_level);

/// What the series shows of the article: one release only, scatter, drift, amplitude, outliers, releases
/// without answer.
[[nodiscard]] Findings findings_of_series(const std::vector<Release>& releases, double confidence_level);

}  // namespace ringwright::analysis
