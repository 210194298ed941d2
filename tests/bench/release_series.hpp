#pragma once
// Several releases of one article, pooled by the whole of identify.

#include <cstdint>

#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

namespace simulated {

/// Each release has a frequency and a damping ratio of its own about the article's: standard deviations of
/// their logarithms.
struct ReleaseSeries {
    Truth article;
    int releases = 1;
    double frequency_spread = 0.0, damping_spread = 0.0;
};

/// What identify states for the article, through the search for each release; not applicable where it does
/// not take it from the curve fit.
[[nodiscard]] ringwright::MethodResult pooled_result(const ReleaseSeries& series, std::uint64_t seed,
                                                     const ringwright::IdentifyOptions& options);

}  // namespace simulated
