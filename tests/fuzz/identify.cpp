// The whole of identify in memory, from bytes to every form of the answer.

#include <algorithm>
#include <nlohmann/json.hpp>
#include <utility>

#include "fuzz/reading.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"

using namespace ringwright;

namespace {

/// JSON writes null for NaN and infinity.
bool has_null(const nlohmann::ordered_json& json) {
    if (json.is_null()) return true;
    return json.is_structured() && std::any_of(json.begin(), json.end(), has_null);
}

}  // namespace

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    if (size == 0) return 0;
    const std::string_view bytes = fuzz::text_of(data + 1, size - 1);
    fuzz::with_messages([&] {
        std::vector<RecordingInput> input;
        input.push_back({read_recording_from_memory(bytes, "fuzz", fuzz::options_from(*data)), std::nullopt});
        AnalysisOptions options;
        options.jobs = 1;
        const Identification identification = identify(std::move(input), options);
        fuzz::promise(!has_null(to_json(identification)));
        (void)to_text(identification);
        (void)to_csv(identification);
    });
    return 0;
}
