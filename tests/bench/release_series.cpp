#include "bench/release_series.hpp"

#include <cmath>
#include <optional>
#include <utility>
#include <vector>

#include "ringwright/analysis.hpp"

namespace simulated {

using namespace ringwright;

MethodResult pooled_result(const ReleaseSeries& series, std::uint64_t seed, const IdentifyOptions& options) {
    Deviates deviates(seed);
    std::vector<RecordingInput> inputs;
    for (int k = 0; k < series.releases; ++k) {
        Truth release = series.article;
        release.frequency_hz *= std::exp(series.frequency_spread * deviates.normal());
        release.damping_ratio *= std::exp(series.damping_spread * deviates.normal());
        inputs.push_back({draw(release, deviates).recording, std::nullopt});
    }
    AnalysisOptions analysis;
    analysis.identify = options;
    analysis.jobs = 1;
    const Identification found = identify(std::move(inputs), analysis);
    MethodResult pooled;
    if (found.result.method == "curve_fit") pooled.status = MethodStatus::ok;
    pooled.quantities = found.result.quantities;
    return pooled;
}

}  // namespace simulated
